"""`hours`: which hours of which nights are best?"""

from __future__ import annotations

import numpy as np

from coldglow.answers.common.inputs import NamePath, Quantity, as_request, in_si
from coldglow.answers.common.scenes import (
    Also,
    conditions_words,
    dates_words,
    longitude_words,
    scenes,
    unseen_words,
    visits,
)
from coldglow.describe.records import Request
from coldglow.errors import RangeError
from coldglow.plan.stretches import Stretches, best_windows
from coldglow.report import words
from coldglow.report.results import Entry, Result, column, table
from coldglow.scenario import Scenario
from coldglow.sky.clock import iso_from_tt, tdb_from_tt

PRINTED = 20


def hours(request: NamePath | Request, length: Quantity | None = None, also: Also = None) -> Result:
    """Return the observable stretches of the request's nights, best first.

    Args:
        request: path or record.
        length: best stretch of this length in each night (text without a unit: hours); default: every
            observable stretch, whole.
        also: a further constraint: a mask ndarray[time] over the steps of the request's nights, or a function
            that takes a `Track` and returns one (`coldglow.bridges.astroplan.constraint_mask` does).

    Returns:
        A result with table ``hours``, one row a stretch, ranked by the SNR of the goal's lines; each row
        is one visit with its overheads charged.

    >>> result = hours("examples/uranus-season.yaml", length="3 h")
    >>> best = result.qtable()[0]  # of astropy, with units
    >>> print(best["night"], best["duration"])
    2027-12-13 3.0 h
    >>> late = hours("examples/uranus-season.yaml", also=lambda track: track.moon_separation_rad > 1.0)
    >>> len(late["snr"]) < len(hours("examples/uranus-season.yaml")["snr"])
    True

    """
    record = as_request(request)
    wanted_s = None if length is None else in_si(length, "hours", "length")
    if wanted_s is not None and not wanted_s > 0.0:
        raise RangeError(f"a stretch of {wanted_s:g} s; its length must be positive")
    return hours_of(record, scenes(record, also=also), wanted_s)


def hours_of(request: Request, found: tuple[Scenario, ...], wanted_s: float | None = None) -> Result:
    """Return `hours` for scenarios that are at hand."""
    rows = [_stretches(scene, wanted_s) for scene in found]
    sizes = [part.snr.size for part in rows]

    def join(name: str) -> np.ndarray:
        return np.concatenate([getattr(part, name) for part in rows])

    def names(pick: str) -> np.ndarray:
        return np.repeat([getattr(scene.use, pick).name for scene in found], sizes)

    night = np.concatenate([_dates(s, part) for s, part in zip(found, rows, strict=True)])
    start = np.concatenate([_times(s, part.start_s) for s, part in zip(found, rows, strict=True)])
    end = np.concatenate([_times(s, part.end_s) for s, part in zip(found, rows, strict=True)])
    snr, begins = join("snr"), join("start_s")
    order = np.lexsort((begins, -np.round(snr, 9)))
    several = len(found) > 1
    in_air = bool(np.isfinite(join("airmass_min")).any()) or not snr.size
    columns = [
        column("night", night[order], description="evening date"),
        column("start", start[order], description="UTC"),
        column("end", end[order], description="UTC"),
        column("duration", join("duration_s")[order] / 3600.0, "h", decimals=2),
        column("airmass_min", join("airmass_min")[order], decimals=2, shown=in_air),
        column("airmass_max", join("airmass_max")[order], decimals=2, shown=in_air),
        column(
            "longitude_start",
            np.degrees(join("longitude_start_rad"))[order],
            "deg",
            decimals=1,
            description="where the stretch begins, acquisition included",
        ),
        column("longitude_end", np.degrees(join("longitude_end_rad"))[order], "deg", decimals=1),
        column("range_rate", 1e-3 * join("range_rate_m_s")[order], "km s-1", decimals=2),
        column("line_transmission", join("line_transmission")[order], decimals=3, shown=in_air),
        column("snr", snr[order], digits=3),
        column("rank", np.arange(1, snr.size + 1)),
        column("instrument", names("instrument")[order], shown=several),
        column("setting", names("setting")[order], shown=several),
    ]
    printed = range(min(PRINTED, snr.size))
    sentences = [_sentence(s, part, wanted_s) for s, part in zip(found, rows, strict=True)]
    if snr.size:
        track = found[0].track
        sentences.append(longitude_words(track.system, tdb_from_tt(track.grid.tt_s[[0, -1]])))
    return Result(
        "hours",
        {"hours": table(*columns, caption="Stretches of the season, the best first", rows=list(printed))},
        _header(request, found, rows),
        sentences,
        sorted({warning for scene in found for warning in scene.warnings}),
        feasible=bool(snr.size),
    )


def _stretches(scene: Scenario, wanted_s: float | None) -> Stretches:
    if wanted_s is None:
        return visits(scene)
    instrument = scene.use.instrument
    longest_s = instrument.limits.longest_visit_s
    floor = instrument.operation.visit_floor
    return best_windows(scene.steps, wanted_s, scene.overhead_s, floor, longest_s, scene.prior)


def _dates(scene: Scenario, rows: Stretches) -> np.ndarray:
    return np.array(scene.track.night_dates, dtype=str)[rows.night]


def _times(scene: Scenario, time_s: np.ndarray) -> np.ndarray:
    return iso_from_tt(scene.track.grid.tt_s[0] - scene.track.grid.time_s[0] + time_s, "m")


def _sentence(scene: Scenario, rows: Stretches, wanted_s: float | None) -> str:
    name = f"{scene.use.instrument.name} ({scene.use.setting.name})"
    if not rows.snr.size:
        if wanted_s is not None and scene.usable.any():
            return f"{name}: no night holds an observable stretch of {words.duration(wanted_s)}."
        return unseen_words(scene)
    best = int(np.argmin(rows.rank))
    when = words.moment(str(_times(scene, rows.start_s[best : best + 1])[0]))
    return (
        f"{name}: best from {when} for {words.duration(float(rows.duration_s[best]))}, "
        f"SNR {words.number(float(rows.snr[best]))}; {words.count(np.unique(rows.night).size, 'night')} with "
        f"observable time, {words.duration(float(scene.usable.sum() * scene.steps.step_s))} in all "
        f"({conditions_words(scene.use, scene.air)})."
    )


def _header(request: Request, found: tuple[Scenario, ...], rows: list[Stretches]) -> dict[str, Entry]:
    dates = request.dates
    seen_h = sum(float(scene.usable.sum() * scene.steps.step_s) for scene in found) / 3600.0
    return {
        "request": Entry(request.name),
        "target": Entry(request.target.name),
        "nights": Entry(f"{dates.first} to {dates.last}", text=dates_words(request)),
        "goal": Entry(_goal_words(request)),
        "longitudes": Entry(request.longitudes),
        "observable_time": Entry(seen_h, "h"),
        "nights_with_time": Entry(int(sum(np.unique(part.night).size for part in rows))),
    }


def _goal_words(request: Request) -> str:
    goal, parts = request.goal, []
    lines = words.listing(list(goal.lines)) if goal.lines else "all lines of the setting"
    if goal.snr is not None:
        parts.append(f"SNR {words.number(goal.snr)} in {lines}")
    if goal.temperature_error_k is not None:
        parts.append(f"temperature to ± {words.number(goal.temperature_error_k)} K")
    if goal.column_error is not None:
        parts.append(f"column to ± {words.percent(goal.column_error)}")
    return words.listing(parts) or "none stated"
