"""Everything that is found out for one request: the answers of all commands, each worked out once."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.chosen import Stretch, asked_for
from coldglow.answers.asking.requesting import Plan, Wanted, chances_of, planned, weather_of
from coldglow.answers.common.moment import Look, look
from coldglow.answers.common.scenes import Also, median_moment, scenes
from coldglow.answers.common.visit import Need, Visit, needs
from coldglow.answers.compare import compare_of, judge, rivals
from coldglow.answers.cover import cover_of
from coldglow.answers.covering.choice import Choice, choose
from coldglow.answers.expose import expose_of
from coldglow.answers.fade import fade_of
from coldglow.answers.fading.forecast import Fading, fading
from coldglow.answers.hours import hours_of
from coldglow.answers.nights import told
from coldglow.answers.planning.standards import Standard, standards_for
from coldglow.describe.records import Request
from coldglow.detect.systematics import CAUSES
from coldglow.light.lines import EINSTEIN_A_ERROR
from coldglow.plan.demand import Amount
from coldglow.report.results import Result
from coldglow.scenario import Scenario, emission_of
from coldglow.sky.stars import Stars

Tell = Callable[[str], None]


@dataclass(frozen=True, slots=True)
class Exposed:
    """One use of an instrument at its median observable moment."""

    seen: Look
    result: Result
    needs: tuple[Need, ...]
    brightness: Brightness


@dataclass(frozen=True, slots=True)
class Brightness:
    """Relative 1-sigma uncertainty of the light of the goal's lines, and what it does to times and gains.

    `random` comes from the uncertain temperature and column of the description, `systematic` from the scale
    of the Einstein coefficients and the table of the air's transmission. The pairs hold the clock
    times of each of the `needs`, in seconds, for a planet brighter and fainter by that much; `gain` the
    information it brings over that of the planet as described.
    """

    random: float
    systematic: float
    random_s: tuple[tuple[float, float], ...]
    systematic_s: tuple[tuple[float, float], ...]
    gain: tuple[float, float]


@dataclass(frozen=True, slots=True)
class Range:
    """What a planet 1 sigma brighter and 1 sigma fainter makes of a plan."""

    place: tuple[int | None, int | None]  # in the order of the plan, of the last night to request
    probability: tuple[float, float]  # of the nights that the plan requests


@dataclass(frozen=True, slots=True)
class Findings:
    """The answers; `choice`, `cover` and the like are None where they were not asked for or make no sense."""

    request: Request
    scenes: tuple[Scenario, ...]
    exposed: tuple[Exposed, ...]  # of the uses that can observe
    hours: Result
    choice: Choice | None
    cover: Result | None
    plan: Plan | None
    nights: Result
    range: Range | None
    stretches: tuple[Stretch, ...]
    standards: tuple[tuple[Standard, ...], ...]  # of each stretch
    fading: Fading | None
    fade: Result | None
    comparison: Result

    @property
    def visible(self) -> bool:
        """Whether anything can be observed at all."""
        return bool(self.exposed)

    @property
    def feasible(self) -> bool:
        """Whether some instrument reaches the goal, and the request stays within its budget."""
        return self.visible and self.nights.feasible and any(each.result.feasible for each in self.exposed)


def find_out(request: Request, stars: Stars, tell: Tell, also: Also = None) -> Findings:
    """Answer everything; `tell` is called with a few words at the beginning of each step.

    A further constraint `also` (see `hours`) holds for hours, cover and nights, not for the outlook and the
    comparison.
    """
    tell("sky, light and counts over the season")
    found = scenes(request, also=also)
    tell("exposure")
    exposed = tuple(_expose(request, scene) for scene in found if scene.usable.any())
    tell("cover")
    choice = choose(request, found) if request.coverage.asked else None
    tell("nights")
    plan = planned(request, found, choice)
    nights = told(request, found, plan, choice)
    stretches = asked_for(request, plan)
    spread = None if plan is None or plan.chosen is None else range_of(plan, exposed)
    forecast = None
    if exposed and _changes(request):
        tell("outlook")
        forecast = fading(request, quickest(exposed).seen.use)
    tell("comparison of settings")
    return Findings(
        request,
        found,
        exposed,
        hours_of(request, found),
        choice,
        cover_of(request, found, choice) if request.coverage.asked else None,
        plan,
        nights,
        spread,
        stretches,
        tuple(standards_for(stretch, stars) for stretch in stretches),
        forecast,
        None if forecast is None else fade_of(forecast),
        _compare(request),
    )


def _expose(request: Request, scene: Scenario) -> Exposed:
    seen = look(request, scene.use, scene.track.take([median_moment(scene)]))
    result = expose_of(seen, "the median of the observable steps")
    return Exposed(seen, result, needs(request.goal, seen.visit, seen.systematic), brightness_of(seen))


def brightness_of(seen: Look) -> Brightness:
    """Return how uncertain the light is and what follows for the times to the goals."""
    emission, detail = emission_of(seen.request), seen.detail
    weight = np.where(detail.wanted, detail.line_information, 0.0)
    slope = float(weight @ detail.temperature_slope / max(float(weight.sum()), 1e-300))
    random = float(
        np.hypot(
            emission.column_m2.uncertainty / emission.column_m2.value,
            slope * emission.temperature_k.uncertainty,
        )
    )

    def visits(error: float) -> list[Visit]:
        columns = [factor * seen.state.column_m2 for factor in (np.exp(error), np.exp(-error))]
        return [seen.visit_in(seen.state.temperature_k, column) for column in columns]

    def times(pair: list[Visit]) -> tuple[tuple[float, float], ...]:
        bright, faint = (needs(seen.request.goal, visit, seen.systematic) for visit in pair)
        return tuple((one.clock_s, other.clock_s) for one, other in zip(bright, faint, strict=True))

    air = seen.systematic().fixed[CAUSES.index("telluric table")]
    fixed = float(np.hypot(air, EINSTEIN_A_ERROR))
    pair, planned_rate = visits(random), float(seen.visit.yields(3600.0)[0, 0])
    bright, faint = (float(visit.yields(3600.0)[0, 0]) / planned_rate for visit in pair)
    return Brightness(random, fixed, times(pair), times(visits(fixed)), (bright, faint))


def range_of(plan: Plan, exposed: Sequence[Exposed]) -> Range:
    """Return what the uncertain light makes of a plan, its order of requesting kept."""
    weather = weather_of(plan.request)
    gains = {each.seen.use: each.brightness.gain for each in exposed}
    found = []
    for side in (0, 1):
        factor = np.array(
            [gains[scene.use][side] if scene.use in gains else 1.0 for scene in plan.offers.scenes]
        )
        goals = [scaled(goal, factor[plan.offers.scene]) for goal in plan.goals]
        chances = chances_of(goals, plan.offers, plan.order, weather, plan.factors)
        at = 0.0 if plan.chosen is None else float(chances.probability[plan.chosen])
        found.append((chances.smallest(plan.request.weather.probability), at))
    return Range((found[0][0], found[1][0]), (found[0][1], found[1][1]))


def quickest(exposed: Sequence[Exposed]) -> Exposed:
    """Return the use that reaches its goals soonest; the first of equal ones."""
    return min(exposed, key=lambda each: max(need.clock_s for need in each.needs))


def scaled(goal: Wanted, factor: NDArray[np.float64]) -> Wanted:
    """Return a goal whose offers bring so many times the information, ndarray[offer]; time stays time."""
    if isinstance(goal.demand, Amount) and goal.demand.by_clock:
        return goal
    return replace(goal, gain=goal.gain * factor.reshape(-1, *[1] * (goal.gain.ndim - 1)))


def _changes(request: Request) -> bool:
    """Return whether the target changes over the years."""
    cooling = request.target.cooling
    return cooling.law != "constant" or cooling.column_rate_s.value != 0.0


def _compare(request: Request) -> Result:
    """Return the settings of the request's instruments for the goal on the whole disk."""
    plain = replace(request, coverage=replace(request.coverage, asked=False))
    names = list(dict.fromkeys(use.instrument.name for use in request.uses))
    verdicts = [verdict for uses in rivals(plain, names) for verdict in judge(plain, uses)]
    return compare_of(plain, verdicts)
