"""Everything that is found out for one request: the answers of all commands, each worked out once."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from coldglow.answers.choice import Choice, choose
from coldglow.answers.chosen import Stretch, asked_for
from coldglow.answers.compare import compare_of, judge, rivals
from coldglow.answers.cover import cover_of
from coldglow.answers.expose import Look, expose_of, look, median_moment
from coldglow.answers.fade import fade_of
from coldglow.answers.fading import Fading, fading
from coldglow.answers.hours import hours_of
from coldglow.answers.nights import Plan, planned, told
from coldglow.answers.scenes import scenes
from coldglow.answers.standards import Standard, standards_for
from coldglow.answers.visit import Need, needs
from coldglow.describe.records import Request
from coldglow.report.results import Result
from coldglow.scenario import Scenario
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
    """Relative 1-sigma uncertainty of the light of the goal's lines, and what it does to the times.

    `random` comes from the uncertain temperature and column of the description, `systematic` from the
    systematic errors of a measurement. The times are those of `needs`, in clock seconds, for a planet that
    is 1 sigma brighter (`short_s`) and 1 sigma fainter (`long_s`).
    """

    random: float
    systematic: float
    short_s: tuple[float, ...]
    long_s: tuple[float, ...]


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


def find_out(request: Request, stars: Stars, tell: Tell) -> Findings:
    """Answer everything; `tell` is called with a few words at the beginning of each step."""
    tell("sky, light and counts over the season")
    found = scenes(request)
    tell("exposure")
    exposed = tuple(_expose(request, scene) for scene in found if scene.usable.any())
    tell("cover")
    choice = choose(request, found) if request.coverage.asked else None
    tell("nights")
    plan = planned(request, found, choice)
    nights = told(request, found, plan, choice)
    stretches = asked_for(request, plan)
    forecast = None
    if exposed and _changes(request):
        tell("outlook")
        forecast = fading(request, exposed[0].seen.use)
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
    emission, detail = seen.request.target.emission, seen.detail
    weight = np.where(detail.wanted, detail.line_information, 0.0)
    slope = float(weight @ detail.temperature_slope / max(float(weight.sum()), 1e-300))
    random = float(
        np.hypot(
            emission.column_m2.uncertainty / emission.column_m2.value,
            slope * emission.temperature_k.uncertainty,
        )
    )

    def times(factor: float) -> tuple[float, ...]:
        visit = seen.visit_in(seen.state.temperature_k, factor * seen.state.column_m2)
        return tuple(need.clock_s for need in needs(seen.request.goal, visit, seen.systematic))

    return Brightness(random, seen.systematic.fixed_total, times(np.exp(random)), times(np.exp(-random)))


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
