"""What a request can ask for: nights or half-nights of its instruments, with what each would bring."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coldglow.describe.records import Orbit, Request
from coldglow.plan.goal import with_floor
from coldglow.plan.multicover import Candidates
from coldglow.plan.stretches import Stretches, runs, table
from coldglow.report import words
from coldglow.scenario import Scenario

Index = NDArray[np.int64]
HALVES = ("whole night", "first half", "second half")


@dataclass(frozen=True, slots=True)
class Offers:
    """Nights or half-nights in order of instrument and time; arrays are ndarray[offer].

    `label` ndarray[scene][time] says for each scene which offer a step belongs to (-1: none); `visits` are
    the stretches of each scene, one visit each, with their overheads charged.
    """

    scenes: tuple[Scenario, ...]
    scene: Index
    date: NDArray[np.str_]  # evening date
    day: Index  # of that date, days from 1970
    half: Index  # 0 whole night, 1 first half, 2 second half
    start_tt_s: NDArray[np.float64]  # first and last instant at which it can observe
    end_tt_s: NDArray[np.float64]
    observable_s: NDArray[np.float64]
    cost: NDArray[np.float64]
    matrix: NDArray[np.float64]  # ndarray[offer, 2, 2], sum of the visits' marginalised matrices
    information: NDArray[np.float64]  # on ln N, with the floor of each visit
    label: tuple[Index, ...]
    visits: tuple[Stretches, ...]

    @property
    def size(self) -> int:
        """Number of offers."""
        return int(self.scene.size)

    def candidates(self) -> Candidates:
        """Return the offers as candidates of a cover."""
        return Candidates(self.day, self.start_tt_s, self.end_tt_s, self.cost, self.scene)

    def name(self, i: int) -> str:
        """Return an offer in words: ``25 Nov 2027, first half, echelle-8m``."""
        parts = [words.day(str(self.date[i]))]
        if self.half[i]:
            parts.append(HALVES[self.half[i]])
        if len(self.scenes) > 1:
            parts.append(self.scenes[self.scene[i]].use.instrument.name)
        return ", ".join(parts)


def offers(request: Request, found: tuple[Scenario, ...], unit: str = "") -> Offers:
    """Return what can be asked for, in nights or half-nights (default: the unit of the request's dates).

    Halves part at local mean midnight; in space there are only whole days.
    """
    parts = [_of_scene(request, scene, unit or request.dates.unit) for scene in found]
    count = np.cumsum([0, *(part.size for part in parts)])[:-1]

    def join(name: str) -> NDArray[Any]:
        return np.concatenate([getattr(part, name) for part in parts])

    arrays = [f.name for f in fields(Offers) if f.name not in ("scenes", "scene", "label", "visits")]
    return Offers(
        scenes=found,
        scene=np.repeat(np.arange(len(found)), [part.size for part in parts]),
        label=tuple(
            np.where(part.label[0] >= 0, part.label[0] + begin, -1)
            for part, begin in zip(parts, count, strict=True)
        ),
        visits=tuple(part.visits[0] for part in parts),
        **{name: join(name) for name in arrays},
    )


def _of_scene(request: Request, scene: Scenario, unit: str) -> Offers:
    steps, track, use = scene.steps, scene.track, scene.use
    operation, limits = use.instrument.operation, use.instrument.limits
    halved = unit == "half-night" and not isinstance(use.instrument.place, Orbit)
    # a grid begins at the first whole step after local mean noon; noon of a night lies within a step of it
    hour = np.mod(steps.time_s, 86400.0) / 3600.0
    part = 2 * steps.night + np.where(hour >= 12.0, 1, 0) if halved else steps.night
    part = np.where(scene.usable, part, -1)
    first, end = runs(steps.time_s, steps.step_s, scene.usable, part, limits.longest_visit_s)
    rows = table(replace(steps, night=part), first, end, scene.overhead_s, operation.visit_floor, scene.prior)
    used, member = np.unique(rows.night, return_inverse=True)
    night = used // 2 if halved else used
    dates = np.array(track.night_dates, dtype=str)[night] if used.size else np.empty(0, dtype="U10")
    matrix, information = np.zeros((used.size, 2, 2)), np.zeros(used.size)
    np.add.at(matrix, member, rows.matrix)
    np.add.at(information, member, with_floor(rows.matrix[:, 0, 0], operation.visit_floor))
    seconds = np.bincount(member, rows.duration_s, used.size).astype(np.float64)
    origin = track.grid.tt_s[0] - steps.time_s[0]
    begin, stop = np.full(used.size, np.inf), np.full(used.size, -np.inf)
    np.minimum.at(begin, member, rows.start_s)
    np.maximum.at(stop, member, rows.end_s)
    price = use.cost_per_night * (request.coverage.half_night_cost if halved else 1.0)
    return Offers(
        scenes=(scene,),
        scene=np.zeros(used.size, dtype=np.int64),
        date=dates,
        day=dates.astype("datetime64[D]").astype(np.int64),
        half=1 + used % 2 if halved else np.zeros(used.size, dtype=np.int64),
        start_tt_s=origin + begin,
        end_tt_s=origin + stop,
        observable_s=seconds,
        cost=np.full(used.size, price),
        matrix=matrix,
        information=information,
        label=(np.where(part >= 0, np.searchsorted(used, part), -1),),
        visits=(rows,),
    )
