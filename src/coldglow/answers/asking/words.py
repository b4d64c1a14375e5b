"""What `nights` says in words: the request, its weather, its nights, and what it cannot do."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coldglow.answers.asking.requesting import Plan
from coldglow.answers.common.offers import Offers
from coldglow.answers.common.scenes import conditions_words
from coldglow.answers.covering.choice import Choice
from coldglow.answers.covering.outofreach import missing_words
from coldglow.describe.records import Request
from coldglow.report import words
from coldglow.report.results import Entry

LISTED = 6


def climate_words(request: Request, given: Offers) -> str:
    """Return the weather assumed."""
    weather = request.weather
    if given.in_space:
        return "no clouds in space"
    climate = f"{words.percent(weather.clear_fraction)} of the nights clear"
    if weather.correlation:
        climate += f", correlation {words.short(weather.correlation, 2)} from one night to the next"
    sites = len({int(site) for site in given.site} - set(given.cloudless))
    if sites > 1:
        climate += f", each of {sites} sites with weather of its own"
    return climate


def goal_words(plan: Plan) -> str:
    """Return all goals in words."""
    return words.listing([goal.text for goal in plan.goals])


def header_of(plan: Plan) -> dict[str, Entry]:
    """Return the header values of the answer."""
    given, request = plan.offers, plan.request
    header = {
        "request": Entry(request.name),
        "goal": Entry(goal_words(plan)),
        "weather": Entry(climate_words(request, given)),
        "conditions": Entry(
            words.listing(
                list(dict.fromkeys(conditions_words(scene.use, scene.air) for scene in given.scenes))
            )
        ),
    }
    if plan.chosen is not None:
        header["nights"] = Entry(plan.nights_until(plan.chosen), text=asked_words(plan, plan.chosen))
        chance = float(plan.chances.probability[plan.chosen])
        error = float(plan.chances.probability_error[plan.chosen])
        header["probability"] = Entry(chance, text=_chance_words(chance, error))
    return header


def _chance_words(chance: float, error: float) -> str:
    text = words.probability(chance)
    return text if error < 5e-4 else f"{text} (± {words.percent(error, 1)} of its computation)"


def asked_words(plan: Plan, place: int) -> str:
    """Return the units up to a place of the order, as they are asked for."""
    nights = words.count(plan.nights_until(place), "night")
    if plan.offers.cost_unit == "night":
        return nights
    if plan.offers.in_space:
        nights = words.count(place + 1, "visit")
    return f"{plan.offers.price(float(plan.chances.cost[place]))} in {nights}"


def within_budget(plan: Plan) -> bool:
    """Return whether what is to be requested stays within the budget of nights and of hours."""
    if plan.chosen is None:
        return False
    budget, chosen = plan.request.budget, plan.order[: plan.chosen + 1]
    hours = float(plan.offers.observable_s[chosen].sum()) / 3600.0
    return budget.allows(plan.nights_until(plan.chosen), hours)


def sentences_of(plan: Plan, choice: Choice | None) -> list[str]:
    """Return the answer in sentences; `choice` is the cover, also where it covers nothing."""
    return [*_answer(plan), *_coverage(plan, choice), *_scatter(plan)]


def _answer(plan: Plan) -> Iterator[str]:
    request, chances, given = plan.request, plan.chances, plan.offers
    wanted, climate = words.probability(request.weather.probability), climate_words(request, given)
    if plan.chosen is None:
        last = int(chances.units.size) - 1
        yield (
            f"{'Even ' if last else ''}{asked_words(plan, last)} {'reach' if last else 'reaches'} "
            f"{goal_words(plan)} with a probability of only "
            f"{words.probability(float(chances.probability[-1]))}; {wanted} was wanted ({climate})."
        )
        if plan.needed:
            yield (
                f"With every night clear {asked_words(plan, plan.needed - 1)} would do: it is the weather "
                "that forbids it."
            )
        else:
            yield "Not even with every night clear: the goal is too deep for what is offered."
        return
    chance = words.probability(float(chances.probability[plan.chosen]))
    subject = asked_words(plan, plan.chosen)
    verb = "reaches" if subject == "1 night" else "reach"
    yield (
        f"Request {subject}: with {climate} this {'one' if verb == 'reaches' else 'request'} reaches "
        f"{goal_words(plan)} with probability {chance} (wanted {wanted})."
    )
    if plan.needed and plan.needed - 1 < plan.chosen:
        extra = float(chances.cost[plan.chosen] - chances.cost[plan.needed - 1])
        price = given.price(extra)
        yield (
            f"If every night were clear, {asked_words(plan, plan.needed - 1)} would do; {price} of it "
            f"{'insures' if price == '1 night' else 'insure'} against the weather."
        )
    if not within_budget(plan):
        budget = request.budget
        most = [] if budget.nights is None else [words.count(budget.nights, "night")]
        most += [] if budget.hours is None else [words.duration(3600.0 * budget.hours)]
        yield f"That is more than the budget of {words.listing(most)}: not feasible as it stands."
    names = [given.name(int(i)) for i in plan.order[: plan.chosen + 1]]
    tail = f"; {'; '.join(names[:LISTED])}" + (" and so on" if len(names) > LISTED else "")
    yield f"They are asked for in this order:{tail[1:]}."
    if request.goal.snr is not None and request.goal.probability == 0.5:
        yield "At an expected SNR equal to the goal the measured one reaches it about half of the time."


def _coverage(plan: Plan, choice: Choice | None) -> Iterator[str]:
    if not plan.request.coverage.asked or choice is None:
        return
    if plan.choice is None:
        yield "Coverage is not in these numbers, because no bin can be covered:"
        yield from missing_words(choice)
        return
    if not plan.choice.cover.covered.all():
        yield (
            f"Only the {words.count(int(plan.choice.cover.covered.sum()), 'bin')} that the cover reaches are "
            f"in these numbers, of {plan.choice.question.bins}."
        )
        yield from missing_words(choice)
    insured = plan.chosen is not None and plan.chosen >= plan.needed
    if plan.method and plan.request.coverage.block_nights > 1:
        yield "Nights come in blocks, for which no insurance is worked out: these are those of the cover."
    elif insured and plan.method == "all sets compared":
        yield "The insurance is the best there is at this cost: all sets were compared."
    elif insured and plan.method:
        yield (
            "The insurance was added one by one, what helps the coverage most first, and each exchanged "
            "while that helped: good, but not proven to be the best."
        )


def _scatter(plan: Plan) -> Iterator[str]:
    if plan.factors is None:
        return
    low, high = np.quantile(plan.factors, [0.16, 0.84])
    emission = plan.request.target.emission
    yield (
        f"The scatter from night to night is drawn too (column "
        f"{words.percent(emission.column_m2.scatter / emission.column_m2.value)}, temperature "
        f"{words.quantity(emission.temperature_k.scatter, 'K')}, seeing and water by the site's quartiles): "
        f"two thirds of the clear nights yield between {words.percent(float(low))} and "
        f"{words.percent(float(high))} of the information that was planned."
    )
