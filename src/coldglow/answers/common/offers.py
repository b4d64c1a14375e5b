"""What a request can ask for: nights, half-nights or stretches, and what each would bring."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.constants import day

from coldglow.describe.records import Orbit, Request
from coldglow.plan.goal import with_floor
from coldglow.plan.multicover import Candidates
from coldglow.plan.stretches import Stretches, runs, table
from coldglow.plan.weather import chain_day
from coldglow.report import words
from coldglow.scenario import Scenario, second_half
from coldglow.sky.clock import iso_from_tt

Index = NDArray[np.int64]
PARTS = ("whole night", "first half", "second half", "stretch")
WHOLE, FIRST, SECOND, STRETCH = range(4)


@dataclass(frozen=True, slots=True)
class Pieces:
    """How the usable time of a scene is cut: visits (steps `first` ... `end`-1) and the offers they make."""

    first: Index  # ndarray[visit]
    end: Index
    owner: Index  # ndarray[visit], offer that the visit belongs to
    night: Index  # ndarray[offer], index into the track's nights
    part: Index  # ndarray[offer], into PARTS


@dataclass(frozen=True, slots=True)
class Offers:
    """What can be asked for, in order of instrument and time; arrays are ndarray[offer].

    `visits` are the stretches of each scene, one visit each, with their overheads charged; `owner`
    ndarray[visit] says for each scene which offer a visit belongs to.
    """

    scenes: tuple[Scenario, ...]
    scene: Index
    telescope: Index  # uses of one instrument exclude each other at one time
    site: Index  # uses at one place share their weather
    date: NDArray[np.str_]  # evening date
    day: Index  # of that date, days from 1970
    part: Index  # into PARTS
    start_tt_s: NDArray[np.float64]  # first and last instant at which it can observe
    end_tt_s: NDArray[np.float64]
    observable_s: NDArray[np.float64]
    shutter_s: NDArray[np.float64]  # open shutter in it
    calibration_s: NDArray[np.float64]
    cost: NDArray[np.float64]  # in nights; of stretches in hours
    matrix: NDArray[np.float64]  # ndarray[offer, 2, 2], sum of the visits' marginalised matrices
    information: NDArray[np.float64]  # on ln N, with the floor of each visit
    owner: tuple[Index, ...]
    visits: tuple[Stretches, ...]

    @property
    def size(self) -> int:
        """Number of offers."""
        return int(self.scene.size)

    @property
    def cost_unit(self) -> str:
        """``h`` where stretches are offered, else the noun ``night``."""
        return "h" if (self.part == STRETCH).any() else "night"

    @property
    def cloudless(self) -> tuple[int, ...]:
        """Sites in space, where no cloud comes."""
        orbits = [isinstance(scene.use.instrument.place, Orbit) for scene in self.scenes]
        return tuple(sorted({int(s) for s, k in zip(self.site, self.scene, strict=True) if orbits[k]}))

    @property
    def in_space(self) -> bool:
        """Whether all of them are in space."""
        return set(self.site.tolist()) <= set(self.cloudless)

    def nights_along(self, order: Index) -> NDArray[np.float64]:
        """Nights used by offers one after another, ndarray[place in the order].

        Their cost, or the different nights of stretches; in space the days that the time adds up to.
        """
        if self.in_space:
            return np.asarray(np.cumsum(self.observable_s[order]) / day)
        if self.cost_unit == "night":
            return np.cumsum(self.cost[order])
        days = self.day[order]
        return np.array([np.unique(days[: n + 1]).size for n in range(days.size)], dtype=np.float64)

    @property
    def weather_day(self) -> NDArray[np.float64]:
        """Days for the planner's weather: each site has its own, space has none."""
        return chain_day(self.day, self.site, self.cloudless)

    def candidates(self) -> Candidates:
        """Return the offers as candidates of a cover."""
        return Candidates(self.day, self.start_tt_s, self.end_tt_s, self.cost, self.telescope)

    def price(self, cost: float) -> str:
        """Return a cost in words: ``3.5 nights``, or hours for stretches."""
        return words.duration(3600.0 * cost) if self.cost_unit == "h" else words.count(cost, "night")

    def name(self, i: int) -> str:
        """Return an offer in words: ``25 Nov 2027, first half, echelle-8m``."""
        parts = [words.day(str(self.date[i]))]
        if self.part[i] == STRETCH:
            begin = iso_from_tt(self.start_tt_s[i : i + 1], "m")[0]
            parts = [
                f"{words.moment(str(begin))} for {words.duration(self.end_tt_s[i] - self.start_tt_s[i])}"
            ]
        elif self.part[i]:
            parts.append(PARTS[self.part[i]])
        if len(self.scenes) > 1:
            parts.append(self.use_name(i))
        return ", ".join(parts)

    def use_name(self, i: int) -> str:
        """Return the instrument of an offer, with the setting where two uses share the instrument."""
        use = self.scenes[self.scene[i]].use
        same = [scene.use.instrument.name for scene in self.scenes].count(use.instrument.name) > 1
        return f"{use.instrument.name} ({use.setting.name})" if same else use.instrument.name


def offers(request: Request, found: tuple[Scenario, ...], unit: str = "", wholes: bool = False) -> Offers:
    """Return what can be asked for.

    Args:
        request: dates, costs and the length of a stretch.
        found: scenarios of the request.
        unit: ``night``, ``half-night`` or ``stretch``; default: the unit of the request's dates.
        wholes: with half-nights, whole nights besides: they cost no more than two halves, and a visit that
            goes through midnight pays its overheads once.

    """
    kind = unit or request.dates.unit
    return join_offers(
        request, found, [pieces(scene, kind, request.coverage.stretch_s, wholes) for scene in found]
    )


def join_offers(request: Request, found: tuple[Scenario, ...], cut: list[Pieces]) -> Offers:
    """Return the offers that stated pieces of each scene make."""
    names = [scene.use.instrument.name for scene in found]
    places = [scene.use.instrument.place for scene in found]
    parts = [
        _of_scene(request, scene, piece, names.index(scene.use.instrument.name), places.index(place))
        for scene, piece, place in zip(found, cut, places, strict=True)
    ]
    count = np.cumsum([0, *(part.size for part in parts)])[:-1]

    def join(name: str) -> NDArray[Any]:
        return np.concatenate([getattr(part, name) for part in parts])

    arrays = [f.name for f in fields(Offers) if f.name not in ("scenes", "scene", "owner", "visits")]
    return Offers(
        scenes=found,
        scene=np.repeat(np.arange(len(found)), [part.size for part in parts]),
        owner=tuple(part.owner[0] + begin for part, begin in zip(parts, count, strict=True)),
        visits=tuple(part.visits[0] for part in parts),
        **{name: join(name) for name in arrays},
    )


def pieces(scene: Scenario, unit: str, stretch_s: float, wholes: bool = False) -> Pieces:
    """Cut the usable time of a scene into nights, half-nights or stretches.

    Halves part at local mean midnight; in space there are only whole days. Stretches are equal parts of
    a night's run, at least `stretch_s` long, beginning every half of their length.
    """
    steps = scene.steps
    longest_s = scene.use.instrument.limits.longest_visit_s
    if unit == "stretch":
        first, end = _windows(scene, stretch_s, longest_s)
        kind = np.full(first.size, STRETCH)
        return Pieces(first, end, np.arange(first.size), steps.night[first], kind)
    on_ground = not isinstance(scene.use.instrument.place, Orbit)
    half = np.where(second_half(scene.track), SECOND, FIRST)
    families = []
    if unit == "half-night" and on_ground:
        families.append(half)
    if not families or wholes:
        families.append(np.zeros_like(half))
    found: list[Pieces] = []
    for family in families:
        label = np.where(scene.usable, len(PARTS) * steps.night + family, -1)
        first, end = runs(steps.time_s, steps.step_s, scene.usable, label, longest_s)
        used, owner = np.unique(label[first], return_inverse=True)
        owner = owner + sum(piece.night.size for piece in found)
        found.append(Pieces(first, end, owner, used // len(PARTS), used % len(PARTS)))
    return Pieces(*(np.concatenate([getattr(piece, f.name) for piece in found]) for f in fields(Pieces)))


def _windows(scene: Scenario, stretch_s: float, longest_s: float) -> tuple[Index, Index]:
    steps = scene.steps
    size = max(int(np.ceil(stretch_s / steps.step_s - 1e-9)), 1)
    most = max(int(longest_s / steps.step_s), 1) if np.isfinite(longest_s) else None
    first: list[int] = []
    end: list[int] = []
    for begin, stop in zip(*runs(steps.time_s, steps.step_s, scene.usable, steps.night), strict=True):
        count = (stop - begin) // size
        if most is not None:
            count = max(count, -(-(stop - begin) // most)) if count else 0
        if count:
            edges = np.round(np.linspace(begin, stop, 2 * count + 1)).astype(int)
            first += edges[:-2].tolist()
            end += edges[2:].tolist()
    return np.array(first, dtype=np.int64), np.array(end, dtype=np.int64)


def _of_scene(request: Request, scene: Scenario, cut: Pieces, telescope: int, site: int) -> Offers:
    steps, track, use = scene.steps, scene.track, scene.use
    operation, size, owner = use.instrument.operation, cut.night.size, cut.owner
    rows = table(steps, cut.first, cut.end, scene.overhead_s, operation.visit_floor, scene.prior)
    dates = np.array(track.night_dates, dtype=str)[cut.night] if size else np.empty(0, dtype="U10")
    matrix, information = np.zeros((size, 2, 2)), np.zeros(size)
    np.add.at(matrix, owner, rows.matrix)
    np.add.at(information, owner, with_floor(rows.matrix[:, 0, 0], operation.visit_floor))
    seconds = np.bincount(owner, rows.duration_s, size).astype(np.float64)
    whole = np.append(0.0, np.cumsum(steps.shutter_share))
    share = (whole[cut.end] - whole[cut.first]) / np.maximum(cut.end - cut.first, 1)
    left_s = np.maximum(rows.duration_s - scene.overhead_s, 0.0)
    origin = track.grid.tt_s[0] - steps.time_s[0]
    begin, stop = np.full(size, np.inf), np.full(size, -np.inf)
    np.minimum.at(begin, owner, rows.start_s)
    np.maximum.at(stop, owner, rows.end_s)
    half = np.isin(cut.part, (FIRST, SECOND))
    price = np.where(half, request.coverage.half_night_cost, 1.0)
    price = use.cost_per_night * np.where(cut.part == STRETCH, seconds / 3600.0, price)
    return Offers(
        scenes=(scene,),
        scene=np.zeros(size, dtype=np.int64),
        telescope=np.full(size, telescope),
        site=np.full(size, site),
        date=dates,
        day=dates.astype("datetime64[D]").astype(np.int64),
        part=cut.part,
        start_tt_s=origin + begin,
        end_tt_s=origin + stop,
        observable_s=seconds,
        shutter_s=np.bincount(owner, share * left_s, size).astype(np.float64),
        calibration_s=np.bincount(owner, operation.calibration_share * left_s, size).astype(np.float64),
        cost=price,
        matrix=matrix,
        information=information,
        owner=(owner,),
        visits=(rows,),
    )
