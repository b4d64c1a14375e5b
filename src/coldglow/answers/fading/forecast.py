"""What becomes of a cooling target: each year's night, the law, possible planets, limits, the budget."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from coldglow.answers.common.jobs import progress
from coldglow.answers.common.moment import Look, look
from coldglow.answers.exposing.edges import refined
from coldglow.answers.fading.seasons import COLUMNS, TEMPERATURES, Night, best_night, information_grid
from coldglow.describe.records import Orbit, Request, Use
from coldglow.errors import RangeError
from coldglow.light.cooling import sample_states, state_at
from coldglow.light.emission import COLDEST_K, HOTTEST_K, total_radiance_w_m2_sr
from coldglow.light.lines import load_lines
from coldglow.plan.fade import InformationGrid, Outlook, Rules, grid_axes, night_information, outlook
from coldglow.plan.goal import demanded_information, without_floor
from coldglow.plan.limits import Edge, coldest_temperature
from coldglow.plan.weather import count_distribution
from coldglow.report import words
from coldglow.scenario import follow
from coldglow.sky.clock import times_grid

Array = NDArray[np.float64]

STREAM = 3  # of the request's seed
MAP_SPAN = 10.0  # the grid reaches at least from a tenth to ten times the column of the law
GLOW_NODES = 100


@dataclass(frozen=True, slots=True)
class Budget:
    """What can be spent, in clear nights (in space: days), and how that came about in words."""

    nights: float
    clear_nights: Array | None  # probability of 0, 1, ... clear ones; None = all are
    text: str
    unit: str  # "clear night" or "day"


@dataclass(frozen=True, slots=True)
class Fading:
    """All that `fade` found out; arrays are ndarray[year], of the years that could be answered."""

    request: Request
    use: Use
    year: NDArray[np.int64]
    night: tuple[Night | None, ...]
    date: tuple[str, ...]
    grid: InformationGrid
    rules: Rules
    budget: Budget
    law: Outlook  # of the law as it stands, without uncertainty
    trials: Outlook
    coldest_night: Edge
    coldest_budget: Edge
    middle: Look | None  # of the first year's night
    equal_s: float  # clock time of one visit at that moment that detects as much as the night; nan if none
    left_out: tuple[tuple[int, RangeError], ...]  # years without an answer, and why


def fading(request: Request, use: Use) -> Fading:
    """Return what becomes of the request's target in one use of an instrument."""
    emission, cooling = request.target.emission, request.target.cooling
    found: list[tuple[int, Night | None, str]] = []
    left_out: list[tuple[int, RangeError]] = []
    asked = range(request.fade.first_year, request.fade.last_year + 1)
    for year in progress(asked, len(asked), "years"):
        try:
            night = best_night(request, use, year)
            date = night.date if night else f"{year}-07-01"
            state_at(emission, cooling, date)
        except RangeError as error:
            left_out.append((year, error))
        else:
            found.append((year, night, date))
    if not found:
        raise left_out[0][1]
    years = np.array([each[0] for each in found], dtype=np.int64)
    nights, dates = [each[1] for each in found], [each[2] for each in found]
    kelvin, column_m2 = state_at(emission, cooling, dates)
    rng = np.random.default_rng([request.weather.seed, STREAM])
    kelvins, columns_m2 = sample_states(emission, cooling, dates, request.fade.trials, rng)
    budget = budget_of(request, use, nights)
    operation = use.instrument.operation
    rules = Rules(
        request.fade.significance,
        budget.nights,
        operation.visit_floor,
        operation.common_floor,
        budget.clear_nights,
        whole=not isinstance(use.instrument.place, Orbit),
    )
    grid = _grid(nights, kelvin, column_m2, kelvins, columns_m2)
    coldest = _coldest(grid, nights, float(column_m2[0]), rules, 1.0)
    first = nights[0]
    middle = look(request, use, follow(request, use, times_grid([first.middle]))) if first else None
    return Fading(
        request,
        use,
        years,
        tuple(nights),
        tuple(dates),
        grid,
        rules,
        budget,
        outlook(years, grid, kelvin[None], column_m2[None], (column_m2 * glow_of(kelvin))[None], rules),
        outlook(years, grid, kelvins, columns_m2, columns_m2 * tabulated_glow(kelvins), rules),
        coldest,
        _coldest(grid, nights, float(column_m2[0]), rules, budget.nights),
        middle,
        _equal_visit(middle, coldest, float(column_m2[0]), rules.snr),
        tuple(left_out),
    )


def glow_of(kelvin: Array) -> Array:
    """Return the radiance of all lines of the list per unit column, W sr-1, of the shape of `kelvin`."""
    return total_radiance_w_m2_sr(load_lines(), kelvin, np.ones_like(kelvin))


def tabulated_glow(kelvin: Array) -> Array:
    """Return the same for many temperatures from a spline, within 1e-6 (tests/answers/test_fade.py)."""
    nodes = np.geomspace(COLDEST_K, HOTTEST_K, GLOW_NODES)
    return np.asarray(np.exp(CubicSpline(np.log(nodes), np.log(glow_of(nodes)))(np.log(kelvin))))


def _grid(
    nights: list[Night | None], kelvin: Array, column_m2: Array, kelvins: Array, columns_m2: Array
) -> InformationGrid:
    """Return the information over all states that occur, from the coldest of the line list on."""
    hottest = min(max(1.25 * float(kelvin.max()), float(kelvins.max())), HOTTEST_K)
    reach = np.concatenate([columns_m2.ravel(), column_m2 / MAP_SPAN, column_m2 * MAP_SPAN])
    axes = grid_axes(np.array([COLDEST_K, hottest, kelvin.min()]), reach, TEMPERATURES, COLUMNS)
    low, high = np.quantile(kelvins, [0.1, 0.9], axis=0)
    stand = [
        np.unique([a, b, c])
        for a, b, c in zip(np.minimum(low, kelvin), kelvin, np.maximum(high, kelvin), strict=True)
    ]
    return information_grid(nights, *axes, stand, column_m2)


def budget_of(request: Request, use: Use, nights: list[Night | None]) -> Budget:
    """Return the budget in clear nights that can be relied upon.

    These are the most that the weather gives with the probability that the request wants, counted over
    consecutive nights. Without a budget one clear night is all there is. In space nothing is lost to weather.
    """
    weather, budget = request.weather, request.budget
    in_space = isinstance(use.instrument.place, Orbit)
    noun, unit = ("day", "day") if in_space else ("night", "clear night")
    longest_s = max((night.duration_s for night in nights if night), default=np.inf)
    if budget.nights is not None:
        asked, text = budget.nights, words.count(budget.nights, noun)
    elif budget.hours is not None:
        asked = 3600.0 * budget.hours / longest_s
        text = f"{words.duration(3600.0 * budget.hours)}, that is {words.count(asked, noun)}"
    else:
        return Budget(1.0, None, f"one {unit}, as the request states none", unit)
    if in_space:
        return Budget(asked, None, text, unit)
    chance = count_distribution(np.arange(int(asked)), weather.clear_fraction, weather.correlation)
    at_least = np.cumsum(chance[::-1])[::-1]
    sure = int(np.flatnonzero(at_least >= weather.probability - 1e-12)[-1])
    wanted = words.probability(weather.probability)
    if not sure:
        text += f", taken as clear: the weather gives none of them with {wanted}"
        return Budget(float(int(asked)), chance, text, unit)
    return Budget(float(sure), chance, f"{text}, of which {sure} clear with probability {wanted}", unit)


def _coldest(
    grid: InformationGrid, nights: list[Night | None], column_m2: float, rules: Rules, count: float
) -> Edge:
    """Return the coldest temperature that `count` nights like the first year's best detect.

    Found on the grid, then solved again with the night itself.
    """
    night = nights[0]
    low_k, high_k = float(grid.temperature_k[0]), float(grid.temperature_k[-1])
    per_night = demanded_information(rules.snr, rules.common_floor) / max(count, 1e-9)
    needed = float(without_floor(per_night, rules.visit_floor))
    if night is None or not np.isfinite(needed):
        return Edge(np.nan, "none", low_k, high_k)

    def tabulated(kelvin: Array) -> Array:
        return night_information(grid, 0, kelvin, column_m2)

    near = coldest_temperature(tabulated, needed, max(low_k, COLDEST_K), high_k)
    if near.kind != "found":
        return near

    return refined(near, lambda kelvin: night.information(kelvin, column_m2), needed)


def _equal_visit(seen: Look | None, edge: Edge, column_m2: float, snr: float) -> float:
    """Return the clock time of one visit at that moment that detects the same coldest temperature; or nan."""
    if seen is None or edge.kind != "found":
        return np.nan
    visit = seen.visit_in(edge.value, column_m2)
    return float(visit.clock_s(visit.time_to(lambda matrix: matrix[..., 0, 0], visit.demanded(snr))))
