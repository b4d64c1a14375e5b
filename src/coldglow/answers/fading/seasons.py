"""The best night of each year: with that year's declination, distance, diameter and motion of the target."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coldglow.describe.records import Request, Use
from coldglow.detect.integration import visit_overhead_s
from coldglow.errors import SaturationError
from coldglow.plan.fade import InformationGrid, night_information
from coldglow.plan.goal import marginalise
from coldglow.plan.stretches import runs, table
from coldglow.scenario import (
    Sight,
    State,
    expose_sight,
    follow,
    sight,
    state_of,
    steps_of,
)
from coldglow.sky.clock import DAY_S, iso_from_tt, season_grid

Array = NDArray[np.float64]

STEP_S = 900.0
EVERY = 10  # nights: the best of every tenth brings within 3 % of what the best of all does
TEMPERATURES, COLUMNS = 16, 6  # of the grid; with them the SNR is right to 0.1 % (tests/answers/test_fade.py)


@dataclass(frozen=True, slots=True)
class Night:
    """One whole night of a use of an instrument, ready for any state of the ionosphere."""

    date: str  # evening
    seen: Sight
    lte_fraction: float
    duration_s: float  # that can be observed, in all
    middle: str  # ISO, UTC: the middle one of its observable steps

    def information(self, temperature_k: float, column_m2: float) -> float:
        """Return 1/sigma² of ln N of the night before floors, its visits marginalised one by one."""
        seen, instrument = self.seen, self.seen.use.instrument
        exposure = expose_sight(seen, State(temperature_k, column_m2, self.lte_fraction))
        assert exposure is not None
        steps = steps_of(seen, exposure)
        longest_s = instrument.limits.longest_visit_s
        first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night, longest_s)
        overhead_s = visit_overhead_s(instrument.operation)
        return float(table(steps, first, end, overhead_s, 0.0, exposure.prior).matrix[:, 0, 0].sum())


def whole_year(request: Request) -> Request:
    """Return the request with every night on offer, in the coarse steps of this module."""
    dates = replace(request.dates, offered=(), forbidden=(), fixed=(), step_s=STEP_S)
    return replace(request, dates=dates)


def best_night(request: Request, use: Use, year: int, every: int = EVERY) -> Night | None:
    """Return the best night of a calendar year, None where the target is never observable.

    Best is what brings most information: the rate at the least airmass of a night times the time it offers,
    compared over every tenth night.

    Raises:
        RangeError: the year lies outside the ephemeris, or the instrument cannot do it.

    """
    wide = whole_year(request)
    grid = season_grid(f"{year}-01-01", f"{year}-12-31", STEP_S, use.instrument.place)
    track = follow(wide, use, grid.take((grid.time_s // DAY_S).astype(np.int64) % every == 0))
    index = np.flatnonzero(track.observable & (track.night >= 0))
    if not index.size:
        return None
    nights, count = np.unique(track.night[index], return_counts=True)
    by_airmass = index[np.lexsort((np.nan_to_num(track.airmass[index]), track.night[index]))]
    highest = by_airmass[np.cumsum(count) - count]
    state = state_of(request)
    exposure = expose_sight(sight(wide, use, track.take(highest)), state)
    assert exposure is not None  # these steps can be observed
    open_s = np.maximum(count * STEP_S - visit_overhead_s(use.instrument.operation), 0.0)
    worth = marginalise(exposure.matrix + exposure.prior)[:, 0, 0] * exposure.shutter_share * open_s
    best = int(np.argmax(worth))
    chosen = track.take(track.night == nights[best])
    seen = sight(wide, use, chosen)
    inside = np.flatnonzero(seen.usable)
    middle = float(chosen.grid.tt_s[inside[(inside.size - 1) // 2]])
    return Night(
        chosen.night_dates[int(nights[best])],
        seen,
        state.lte_fraction,
        float(inside.size * STEP_S),
        str(iso_from_tt(middle, "m")),
    )


def information_grid(
    nights: list[Night | None],
    temperature_k: Array,
    column_m2: Array,
    track_k: list[Array],
    track_m2: Array,
) -> InformationGrid:
    """Return the information of each year's night over temperature and column.

    The whole grid is worked out for the first night alone. What another year's night brings more or less
    is worked out at some temperatures of that year and runs straight between them (held beyond them). States
    so bright that the detector saturates count as the brightest one at which it does not.

    Args:
        nights: of each year; None brings nothing.
        temperature_k: axis of the grid, ascending.
        column_m2: axis of the grid, ascending.
        track_k: for each year the temperatures, ascending, at which its night is worked out.
        track_m2: ndarray[year], the column there.

    """
    information = np.zeros((len(nights), temperature_k.size, column_m2.size))
    reference = next((night for night in nights if night is not None), None)
    if reference is None:
        return InformationGrid(temperature_k, column_m2, information)
    whole = np.array([[_unless_saturated(reference, t, n) for n in column_m2] for t in temperature_k])
    if np.isnan(whole).all():
        reference.information(float(temperature_k[0]), float(column_m2[0]))  # even the faintest: says so
    whole[np.isnan(whole)] = np.nanmax(whole)
    grid = InformationGrid(temperature_k, column_m2, whole[None])
    for i, night in enumerate(nights):
        if night is None:
            continue
        exact = np.array([_unless_saturated(night, t, track_m2[i]) for t in track_k[i]])
        ratio = exact / night_information(grid, 0, track_k[i], track_m2[i])
        ratio = np.where(np.isnan(ratio), 1.0, ratio)
        factor = np.exp(np.interp(1.0 / -temperature_k, 1.0 / -track_k[i], np.log(ratio)))
        information[i] = whole * factor[:, None]
    return InformationGrid(temperature_k, column_m2, information)


def _unless_saturated(night: Night, temperature_k: float, column_m2: float) -> float:
    try:
        return night.information(float(temperature_k), float(column_m2))
    except SaturationError:
        return np.nan
