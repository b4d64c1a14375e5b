"""`nights`: how many nights must I request?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.offers import Offers, offers
from coldglow.answers.scenes import conditions_words, scenes, unseen_words
from coldglow.describe.records import Request
from coldglow.plan.demand import Amount, Demand, TemperatureError
from coldglow.plan.goal import demanded_information, required_snr
from coldglow.plan.nights import Curve, Weather, curve
from coldglow.report import words
from coldglow.report.results import Entry, Result, column, table
from coldglow.scenario import Scenario

MOST = 60  # units of a curve
CERTAIN = 0.999


@dataclass(frozen=True, slots=True)
class Wanted:
    """One goal as the planner sees it: what each offer yields, how much is needed, in words."""

    gain: NDArray[np.float64]
    demand: Demand
    text: str


def goals_of(request: Request, given: Offers) -> list[Wanted]:
    """Return the request's goals; an error goal is on the random error alone."""
    goal, found = request.goal, []
    common = max(scene.use.instrument.operation.common_floor for scene in given.scenes)
    if goal.snr is not None:
        needed = required_snr(goal.snr, goal.probability)
        text = f"SNR {words.number(goal.snr)}"
        found.append(
            Wanted(
                given.information[:, None], Amount(np.atleast_1d(demanded_information(needed, common))), text
            )
        )
    if goal.temperature_error_k is not None:
        text = f"temperature to ± {words.number(goal.temperature_error_k)} K"
        found.append(
            Wanted(given.matrix[:, None], TemperatureError(np.array([goal.temperature_error_k])), text)
        )
    if goal.column_error is not None:
        swapped = given.matrix[:, None, ::-1, ::-1]  # the same demand with the roles of N and T exchanged
        text = f"column to ± {words.percent(goal.column_error)}"
        found.append(Wanted(swapped, TemperatureError(np.array([goal.column_error])), text))
    return found


def preference(given: Offers) -> NDArray[np.int64]:
    """Return the offers in order of information per cost, most first; equal ones by date."""
    worth = given.information / np.maximum(given.cost, 1e-9)
    return np.lexsort((given.start_tt_s, -np.round(worth / max(float(worth.max(initial=0.0)), 1e-300), 9)))


def weather_of(request: Request) -> Weather:
    """Return the weather of the request for the planner."""
    weather = request.weather
    return Weather(weather.clear_fraction, weather.correlation, weather.trials, weather.seed)


def nights(request: NamePath | Request) -> Result:
    """Return the probability of success against the number of nights requested.

    Nights are requested best first; all goals of the request must be reached by the clear ones together.

    Returns:
        A result with table ``nights``: ``nights`` (their cost), ``probability``, ``probability_error``,
        ``observable_time``.

    """
    record = as_request(request)
    with place_errors(*described(record)):
        return nights_of(record, scenes(record))


def nights_of(request: Request, found: tuple[Scenario, ...]) -> Result:
    """Return `nights` for scenarios that are at hand."""
    given = offers(request, found)
    if not given.size:
        empty = table(column("nights", []), column("probability", []), column("probability_error", []))
        sentences = [unseen_words(scene) for scene in found]
        return Result(
            "nights", {"nights": empty}, {"request": Entry(request.name)}, sentences, feasible=False
        )
    order = preference(given)[:MOST]
    weather = weather_of(request)
    curves = [
        curve(wanted.gain, wanted.demand, given.day, given.cost, order, weather)
        for wanted in goals_of(request, given)
    ]
    joint = _weakest(curves)
    chosen = joint.smallest(request.weather.probability)
    shown = _interesting(joint, chosen)
    hours = np.cumsum(given.observable_s[order]) / 3600.0
    header, sentences = _words(request, given, order, joint, chosen)
    return Result(
        "nights",
        {
            "nights": table(
                column("nights", joint.cost[:shown], digits=3, description="requested, best first"),
                column("probability", joint.probability[:shown], decimals=3),
                column("probability_error", joint.probability_error[:shown], digits=2),
                column("observable_time", hours[:shown], "h", decimals=1),
                column("added", [given.name(int(i)) for i in order[:shown]]),
                caption="Probability that the clear ones among the nights requested reach every goal",
            )
        },
        header,
        sentences,
        sorted({warning for scene in found for warning in scene.warnings}),
        feasible=chosen is not None and _within(request, float(joint.cost[chosen])),
    )


def _weakest(curves: list[Curve]) -> Curve:
    """Return the curve of reaching all goals.

    The goals share their weather, so that the rarest success implies the others nearly always: the smallest
    of the probabilities is taken.
    """
    probability = np.min([each.probability for each in curves], axis=0)
    error = np.max([each.probability_error for each in curves], axis=0)
    return Curve(curves[0].units, curves[0].cost, probability, error)


def _interesting(joint: Curve, chosen: int | None) -> int:
    """Return how many rows are worth showing: to near certainty, or some beyond the answer."""
    certain = (
        int(np.argmax(joint.probability >= CERTAIN))
        if (joint.probability >= CERTAIN).any()
        else joint.units.size
    )
    return min(max(certain + 1, (chosen or 0) + 3, 5), joint.units.size)


def _within(request: Request, cost: float) -> bool:
    return request.budget.nights is None or cost <= request.budget.nights + 1e-9


def _words(
    request: Request, given: Offers, order: NDArray[np.int64], joint: Curve, chosen: int | None
) -> tuple[dict[str, Entry], list[str]]:
    weather = request.weather
    wanted = words.probability(weather.probability)
    goal_text = words.listing([each.text for each in goals_of(request, given)])
    climate = f"{words.percent(weather.clear_fraction)} of the nights clear"
    if weather.correlation:
        climate += f", correlation {words.number(weather.correlation, 2)} from one night to the next"
    header = {
        "request": Entry(request.name),
        "goal": Entry(goal_text),
        "weather": Entry(climate),
        "conditions": Entry(conditions_words(given.scenes[0].use, given.scenes[0].air)),
    }
    if chosen is None:
        most = joint.cost[-1]
        return header, [
            f"Even {words.count(float(most), 'night')} reach {goal_text} with a probability of only "
            f"{words.probability(float(joint.probability[-1]))}; {wanted} was wanted ({climate})."
        ]
    cost, chance = float(joint.cost[chosen]), float(joint.probability[chosen])
    header["nights"] = Entry(cost, text=words.count(cost, "night"))
    header["probability"] = Entry(chance, text=words.probability(chance))
    sentences = [
        f"Request {words.count(cost, 'night')}: with {climate} they reach {goal_text} with probability "
        f"{words.probability(chance)} (wanted {wanted})."
    ]
    if not _within(request, cost):
        budget = words.count(float(request.budget.nights or 0.0), "night")
        sentences.append(f"That is more than the budget of {budget}: not feasible as it stands.")
    sentences.append(
        f"Best first these are {words.listing([given.name(int(i)) for i in order[: chosen + 1]][:6])}"
        + (" and so on." if chosen >= 6 else ".")
    )
    return header, sentences
