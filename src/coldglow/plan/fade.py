"""Until when a cooling planet stays detectable: information over (temperature, column), states, nights.

Numbers only. Trials are possible planets, years the seasons asked about, each with its own geometry.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import RectBivariateSpline

from coldglow.errors import RangeError
from coldglow.plan.goal import demanded_information, with_floor

Floats = NDArray[np.float64]

NEGLIGIBLE = 1e-20  # keeps the logarithm finite; an SNR of 1e-10 in a night counts as none
INTERVAL = (0.15865525393145707, 0.5, 0.8413447460685429)  # -1 sigma, median, +1 sigma of a normal


@dataclass(frozen=True, slots=True)
class InformationGrid:
    """Information (SNR^2 before floors) of one night in each year, over temperature and column.

    `temperature_k` ndarray[temperature] and `column_m2` ndarray[column] ascend; `information` is
    ndarray[year, temperature, column], marginalised over the nuisances of the visit, of the night that
    would be used in that year. A year without an observable night holds zeros.
    """

    temperature_k: Floats
    column_m2: Floats
    information: Floats


@dataclass(frozen=True, slots=True)
class Rules:
    """What counts as detected, and what can be spent.

    1/SNR^2 of n equal nights = (1/I + visit_floor^2)/n + common_floor^2. `budget_nights` is inf without a
    budget; `clear_nights` is the probability of 0, 1, ... budget clear nights among them, None = all are
    clear. Nights are used as `whole` ones, or by the hour, as in space.
    """

    snr: float
    budget_nights: float
    visit_floor: float = 0.0
    common_floor: float = 0.0
    clear_nights: Floats | None = None
    whole: bool = True


@dataclass(frozen=True, slots=True)
class Spread:
    """Median and central 68 % interval; every value is one that occurred in a trial, so inf stays inf."""

    median: Floats
    low: Floats
    high: Floats


@dataclass(frozen=True, slots=True)
class Outlook:
    """What becomes of the target: every array is ndarray[year].

    `probability_detectable` is that of the budget's clear nights reaching the expected SNR of the rules,
    over all trials, and `probability_error` the error of that mean by the number of trials.
    `dropout_year` is the first year that needs more than the budget, inf where that is none of the years
    asked about; `dropout_probability` the share of the trials in which it is one of them.
    """

    year: Floats
    temperature_k: Spread
    column_m2: Spread
    relative_brightness: Spread
    snr_one_night: Spread
    nights_needed: Spread
    probability_detectable: Floats
    probability_error: Floats
    dropout_year: Spread
    dropout_probability: float


def grid_axes(
    temperature_k: Floats, column_m2: Floats, temperatures: int = 32, columns: int = 12
) -> tuple[Floats, Floats]:
    """Return axes for an `InformationGrid` that cover all these states: even in 1/sqrt(T) and in ln N.

    With these numbers the information is interpolated to 2e-3 over all of 150-1500 K and four decades of
    column, and to 1e-5 over 300-700 K and a factor of ten (measured in ``tests/plan/test_fade.py``).
    """
    least, most = _widened(np.log(np.min(column_m2)), np.log(np.max(column_m2)), 0.1)
    ends = _abscissa((np.min(temperature_k), np.max(temperature_k)))
    cold, hot = _widened(float(ends[0]), float(ends[1]), 1e-4)
    return np.linspace(cold, hot, temperatures) ** -2.0, np.exp(np.linspace(least, most, columns))


def night_information(
    grid: InformationGrid, year: int, temperature_k: ArrayLike, column_m2: ArrayLike
) -> Floats:
    """Return the information of one night in the year of that index, for states of any (broadcast) shape.

    ln(information) is interpolated by a bicubic spline in ln N, in which it is nearly straight (N^2 or N by
    what makes the noise), and in 1/sqrt(T): it is straight in 1/T where it is cold and turns over where it
    is hot, and of 1/T, ln T and 1/sqrt(T) the last did best over the whole span with the line list.

    Raises: RangeError for a state outside the grid.
    """
    kelvin, column = np.broadcast_arrays(np.asarray(temperature_k, float), np.asarray(column_m2, float))
    slack = 1e-9
    for name, unit, values, axis in (
        ("temperature", "K", kelvin, grid.temperature_k),
        ("column", "m-2", column, grid.column_m2),
    ):
        wrong = (values < axis[0] * (1 - slack)) | (values > axis[-1] * (1 + slack)) | np.isnan(values)
        if wrong.any():
            raise RangeError(
                f"A {name} of {values[wrong].flat[0]:.4g} {unit} lies outside the tabulated span of "
                f"{axis[0]:.4g} to {axis[-1]:.4g} {unit}."
            )
    spline = RectBivariateSpline(
        _abscissa(grid.temperature_k),
        np.log(grid.column_m2),
        np.log(np.maximum(grid.information[year], NEGLIGIBLE)),
        kx=min(3, grid.temperature_k.size - 1),
        ky=min(3, grid.column_m2.size - 1),
    )
    found = np.exp(spline.ev(_abscissa(kelvin), np.log(column)))
    return np.where(found > 2.0 * NEGLIGIBLE, found, 0.0)


def nights_for(information: ArrayLike, rules: Rules) -> Floats:
    """Return the clear nights that reach the goal, inf where nothing does; shape as `information`."""
    per_night = with_floor(information, rules.visit_floor)
    demand = demanded_information(rules.snr, rules.common_floor)
    with np.errstate(divide="ignore", over="ignore"):
        exact = demand / per_night
    if not rules.whole:
        return np.asarray(exact)
    return np.maximum(1.0, np.ceil(exact * (1.0 - 1e-12)))  # exactly reached is reached, despite rounding


def snr_of(information: ArrayLike, rules: Rules, nights: float = 1.0) -> Floats:
    """Return the SNR of a number of equal nights under the floors; shape as `information`."""
    visits = nights * with_floor(information, rules.visit_floor)
    return np.asarray(np.sqrt(with_floor(visits, rules.common_floor)))


def outlook(
    year: ArrayLike,
    grid: InformationGrid,
    temperature_k: Floats,
    column_m2: Floats,
    brightness: Floats,
    rules: Rules,
) -> Outlook:
    """Return what becomes of the target in each year.

    `temperature_k`, `column_m2` and `brightness` (any unit, all lines asked for) are ndarray[trial, year];
    brightness is told relative to the first year of the same trial, so that what is uncertain about today
    cancels. A single trial without uncertainty is the
    deterministic answer.

    Raises: RangeError for a state outside the grid.
    """
    years = np.asarray(year, dtype=float)
    information = np.stack(
        [night_information(grid, i, temperature_k[:, i], column_m2[:, i]) for i in range(years.size)], axis=1
    )
    needed = nights_for(information, rules)
    chance = _chance(needed, rules)
    out = needed > rules.budget_nights
    dropout = np.where(out.any(axis=1), years[np.argmax(out, axis=1)], np.inf)
    return Outlook(
        year=years,
        temperature_k=spread(temperature_k),
        column_m2=spread(column_m2),
        relative_brightness=spread(brightness / brightness[:, :1]),
        snr_one_night=spread(snr_of(information, rules)),
        nights_needed=spread(needed),
        probability_detectable=chance.mean(axis=0),
        probability_error=chance.std(axis=0) / np.sqrt(chance.shape[0]),
        dropout_year=spread(dropout),
        dropout_probability=float(np.isfinite(dropout).mean()),
    )


def nights_map(
    grid: InformationGrid, year: int, temperature_k: Floats, column_m2: Floats, rules: Rules
) -> Floats:
    """Return the nights needed over ndarray[temperature, column] with the geometry of one year."""
    return nights_for(night_information(grid, year, temperature_k[:, None], column_m2[None, :]), rules)


def spread(values: Floats) -> Spread:
    """Return median and 68 % interval over the trials, the first axis."""
    low, median, high = np.quantile(values, INTERVAL, axis=0, method="inverted_cdf")
    return Spread(median=np.asarray(median), low=np.asarray(low), high=np.asarray(high))


def _chance(needed: Floats, rules: Rules) -> Floats:
    """Return the probability that the budget has enough clear nights, of the shape of `needed`."""
    if rules.clear_nights is None:
        return (needed <= rules.budget_nights).astype(float)
    at_least = np.append(np.cumsum(np.asarray(rules.clear_nights, dtype=float)[::-1])[::-1], 0.0)
    index = np.where(needed < at_least.size, needed, at_least.size - 1).astype(int)
    return np.asarray(at_least[index])


def _abscissa(temperature_k: ArrayLike) -> Floats:
    """Return the variable of interpolation, ascending with temperature."""
    return np.asarray(-1.0 / np.sqrt(temperature_k))


def _widened(low: float, high: float, least: float) -> tuple[float, float]:
    margin = max(0.01 * (high - low), least)
    return low - margin, high + margin
