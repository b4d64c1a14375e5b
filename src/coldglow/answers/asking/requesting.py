"""What to request, best first, and with what chance: goals, order, insurance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.scatter import factors_of
from coldglow.answers.common.offers import Offers, offers
from coldglow.answers.covering.choice import Choice
from coldglow.describe.records import Request
from coldglow.plan.demand import Amount, Demand, TemperatureError
from coldglow.plan.goal import demanded_information, required_snr
from coldglow.plan.insurance import robust_set
from coldglow.plan.multicover import Rules
from coldglow.plan.nights import REACHED, Curve, Weather, curve, joint_curve
from coldglow.report import words
from coldglow.scenario import Scenario

Array = NDArray[np.float64]
Index = NDArray[np.int64]
MOST = 60  # units of a curve
CERTAIN = 0.999
SPARE = 0.05  # insurance is looked for until so much above the wanted probability


@dataclass(frozen=True, slots=True)
class Wanted:
    """One goal as the planner sees it: what each offer yields, how much is needed, in words."""

    gain: Array
    demand: Demand
    text: str


@dataclass(frozen=True, slots=True)
class Plan:
    """Offers in the order in which they are requested, and what the first few of them reach."""

    request: Request
    offers: Offers
    order: Index  # offers, most wanted first
    goals: tuple[Wanted, ...]
    chances: Curve
    chosen: int | None  # place in the order of the last one requested
    needed: int  # so many of the order reach every goal when all is clear; 0 if all are too few
    choice: Choice | None  # the cover that the request begins with
    method: str  # how the insurance was found
    factors: Array | None  # ndarray[trial, offer]

    def nights_until(self, place: int) -> float:
        """Return the nights of the order up to a place, as `nights` counts them."""
        return float(self.nights[place])

    @property
    def nights(self) -> Array:
        """Nights requested, ndarray[place in the order]."""
        return self.offers.nights_along(self.order)


def goals_of(request: Request, given: Offers) -> list[Wanted]:
    """Return the goals on the whole disk; an error goal is on the random error alone."""
    goal, found = request.goal, []
    common = max(scene.use.instrument.operation.common_floor for scene in given.scenes)
    if goal.snr is not None:
        needed = demanded_information(required_snr(goal.snr, goal.probability), common)
        gain, text = given.information[:, None], f"SNR {words.short(goal.snr)}"
        found.append(Wanted(gain, Amount(np.atleast_1d(needed)), text))
    if goal.temperature_error_k is not None:
        text = f"temperature to ± {words.short(goal.temperature_error_k)} K"
        found.append(
            Wanted(given.matrix[:, None], TemperatureError(np.array([goal.temperature_error_k])), text)
        )
    if goal.column_error is not None:
        swapped = given.matrix[:, None, ::-1, ::-1]  # the same demand with the roles of N and T exchanged
        text = f"column to ± {words.short(100.0 * goal.column_error)} %"
        found.append(Wanted(swapped, TemperatureError(np.array([goal.column_error])), text))
    return found


def coverage_goal(choice: Choice) -> Wanted:
    """Return the goal of covering every bin that the choice covers."""
    question, bins = choice.question, choice.cover.covered
    demand = question.demand
    if isinstance(demand, Amount):
        demand = replace(demand, demand=demand.demand[bins])
    else:
        demand = TemperatureError(demand.goal_k[bins])
    where = (
        "" if question.request.coverage.spot else f" in {words.count(int(bins.sum()), 'bin')} of longitude"
    )
    return Wanted(question.gain[:, bins], demand, question.goal + where)


def preference(given: Offers, first: Index | None = None) -> Index:
    """Return offers in order of information per cost, most first; equal ones by date.

    Those in `first` come first; none overlaps another one of the same telescope.
    """
    worth = given.information / np.maximum(given.cost, 1e-9)
    worth = np.round(worth / max(float(worth.max(initial=0.0)), 1e-300), 9)
    ranked = np.lexsort((given.start_tt_s, -worth))
    if first is not None:
        ranked = np.concatenate((first, ranked[~np.isin(ranked, first)]))
    kept: list[int] = []
    for i in ranked:
        same = [k for k in kept if given.telescope[k] == given.telescope[i]]
        apart = (given.end_tt_s[i] <= given.start_tt_s[same]) | (given.end_tt_s[same] <= given.start_tt_s[i])
        if np.all(apart):
            kept.append(int(i))
        if len(kept) == MOST:
            break
    return np.array(kept, dtype=np.int64)


def weather_of(request: Request) -> Weather:
    """Return the weather of the request for the planner."""
    weather = request.weather
    return Weather(weather.clear_fraction, weather.correlation, weather.trials, weather.seed)


def planned(request: Request, found: tuple[Scenario, ...], choice: Choice | None) -> Plan | None:
    """Return what to request, best first, for a cover that is at hand; None where nothing can be observed."""
    covered = choice is not None and request.coverage.asked and bool(choice.cover.covered.any())
    given = choice.question.offers if covered and choice is not None else offers(request, found)
    return plan_of(request, given, choice if covered else None) if given.size else None


def plan_of(request: Request, given: Offers, choice: Choice | None) -> Plan:
    """Return the order of requesting, its chances, and how much of it is needed."""
    weather = weather_of(request)
    goals = goals_of(request, given)
    factors = factors_of(request, given) if request.weather.scatter else None
    method, fixed = "", np.flatnonzero(np.isin(given.date, [text[:10] for text in request.dates.fixed]))
    if choice is None:
        order = preference(given, fixed)
    else:
        goals = [coverage_goal(choice), *goals]
        base = _clear(choice, goals)
        order, method = _with_insurance(choice, base, goals[0], weather, factors)
        order = preference(given, order) if choice.question.rules == Rules() else order[:MOST]
    chances = chances_of(goals, given, order, weather, factors)
    chosen = chances.smallest(request.weather.probability)
    if choice is not None and chosen is not None and chosen >= base.size:
        better, how = _with_insurance(choice, base, goals[0], weather, factors, float(chances.cost[chosen]))
        again = np.concatenate((better, order[~np.isin(order, better)]))
        again = preference(given, again) if choice.question.rules == Rules() else better
        other = chances_of(goals, given, again, weather, factors)
        place = other.smallest(request.weather.probability)
        if place is not None and other.cost[place] <= chances.cost[chosen]:
            order, chances, chosen, method = again, other, place, how
    if choice is None and chosen is not None and weather.correlation > 0.0:
        again = _apart(given, goals, order, weather, factors, max(_needed(goals, order), fixed.size), chosen)
        other = chances_of(goals, given, again, weather, factors)
        place = other.smallest(request.weather.probability)
        if place is not None and other.cost[place] < chances.cost[chosen]:
            order, chances, chosen = again, other, place
    return Plan(
        request,
        given,
        order,
        tuple(goals),
        chances,
        chosen,
        _needed(goals, order),
        choice,
        method,
        factors,
    )


def _clear(choice: Choice, goals: list[Wanted]) -> Index:
    """Return the cover and the brightest nights beyond it that reach every goal when all is clear."""
    cover = choice.cover.chosen
    if choice.stare or choice.question.rules != Rules():
        return cover
    order = preference(choice.question.offers, cover)
    return order[: max(_needed(goals, order), cover.size)]


def _with_insurance(
    choice: Choice,
    base: Index,
    goal: Wanted,
    weather: Weather,
    factors: Array | None,
    cost_max: float | None = None,
) -> tuple[Index, str]:
    """Return the base and what helps most against the weather, in the order of asking, and the method."""
    question, cover, request = choice.question, choice.cover, choice.question.request
    given, rules = question.offers, question.rules
    if choice.stare:
        return np.arange(given.size), ""
    cost = float(given.cost[base].sum())
    most = min(rules.cost_max, cost + 2.0 * cover.cost + 3.0 * float(given.cost.max()))
    found = robust_set(
        given.candidates(),
        goal.gain,
        goal.demand,
        replace(rules, cost_max=most if cost_max is None else cost_max),
        weather,
        base,
        given.weather_day,
        factors,
        enough=min(request.weather.probability + SPARE, CERTAIN) if cost_max is None else np.inf,
    )
    return np.concatenate((base, found.added)), found.method


def _apart(
    given: Offers,
    goals: Sequence[Wanted],
    order: Index,
    weather: Weather,
    factors: Array | None,
    size: int,
    chosen: int,
) -> Index:
    """Return an order that begins with so many of the first and goes on with the best against the weather.

    The best nights often follow one another and share their clouds; a slightly worse one some days away may
    be the better insurance.
    """
    base = order[:size]
    found = robust_set(
        given.candidates(),
        goals[0].gain,
        goals[0].demand,
        Rules(cost_max=float(given.cost[order[: chosen + 1]].sum())),
        weather,
        base,
        given.weather_day,
        factors,
    )
    return preference(given, np.concatenate((base, found.added)))


def chances_of(
    goals: Sequence[Wanted], given: Offers, order: Index, weather: Weather, factors: Array | None
) -> Curve:
    """Return the probability of reaching every goal; exact where there is one, on one amount."""
    day = given.weather_day
    if len(goals) == 1:
        return curve(goals[0].gain, goals[0].demand, day, given.cost, order, weather, factors)
    pairs = [(goal.gain, goal.demand) for goal in goals]
    return joint_curve(pairs, day, given.cost, order, weather, factors)


def _needed(goals: list[Wanted], order: Index) -> int:
    """Return how many of the order reach every goal when all is clear; 0 if all are too few."""
    reached = np.ones(order.size, dtype=bool)
    for goal in goals:
        share = goal.demand.share(np.cumsum(goal.gain[order], axis=0))
        reached &= np.all(share >= REACHED, axis=1)
    return int(np.argmax(reached)) + 1 if reached.any() else 0
