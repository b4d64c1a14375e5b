"""`fade`: is a colder planet still detectable, and until when?"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import groupby

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from coldglow.answers.edges import refined
from coldglow.answers.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.scenes import choose_use, conditions_words
from coldglow.answers.seasons import (
    COLUMNS,
    EVERY,
    TEMPERATURES,
    Night,
    best_night,
    information_grid,
)
from coldglow.describe.records import Cooling, Emission, Estimate, Orbit, Request, Use
from coldglow.errors import RangeError
from coldglow.light.cooling import sample_states, state_at
from coldglow.light.emission import COLDEST_K, HOTTEST_K, total_radiance_w_m2_sr, validity_warnings
from coldglow.light.lines import load_lines
from coldglow.plan.fade import (
    InformationGrid,
    Outlook,
    Rules,
    Spread,
    grid_axes,
    night_information,
    nights_map,
    outlook,
)
from coldglow.plan.goal import demanded_information, without_floor
from coldglow.plan.limits import Edge, coldest_temperature
from coldglow.plan.weather import count_distribution
from coldglow.report import words
from coldglow.report.results import Column, Entry, Result, Table, column, table

Array = NDArray[np.float64]

STREAM = 3  # of the request's seed
MAP_TEMPERATURES, MAP_COLUMNS = 40, 25
MAP_SPAN = 10.0  # the map reaches from a tenth to ten times the column of the law
YEAR_S = 365.25 * 86400.0
GLOW_NODES = 100


@dataclass(frozen=True, slots=True)
class Budget:
    """What can be spent, in whole nights of clear sky, and how that came about in words."""

    nights: float
    clear_nights: Array | None  # probability of 0, 1, ... clear ones
    text: str
    given: bool


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
    left_out: tuple[tuple[int, str], ...]  # years without an answer, and why


def fade(request: NamePath | Request, years: tuple[int, int] | None = None, instrument: str = "") -> Result:
    """Return brightness, SNR of a night, nights needed and probability of detection, year by year.

    Each year is judged by its best night (see `seasons`), with the geometry of that night.

    Args:
        request: path or record.
        years: first and last year, both included; default: those of the request.
        instrument: which of the request's instruments; default: the first.

    Returns:
        A result with tables ``fade``, one row a year, and ``map``, the clear nights needed over temperature
        and vertical column with the geometry of the first year.

    Raises:
        RangeError: none of the years can be answered; the sentence says why.

    """
    record = as_request(request)
    if years is not None:
        first, last = years
        if not 0 <= last - first <= 100:
            raise RangeError(f"the years {first} to {last}: write the earlier first, 100 years at most")
        record = replace(record, fade=replace(record.fade, first_year=first, last_year=last))
    use = choose_use(record, instrument)
    with place_errors(*described(record)):
        return fade_of(fading(record, use))


def fading(request: Request, use: Use) -> Fading:
    """Return what becomes of the request's target in one use of an instrument."""
    emission, cooling = request.target.emission, request.target.cooling
    found: list[tuple[int, Night | None, str]] = []
    left_out: list[tuple[int, str]] = []
    problem: RangeError | None = None
    for year in range(request.fade.first_year, request.fade.last_year + 1):
        try:
            night = best_night(request, use, year)
            date = night.date if night else f"{year}-07-01"
            state_at(emission, cooling, date)
        except RangeError as error:
            left_out.append((year, str(error)))
            problem = problem or error
        else:
            found.append((year, night, date))
    if not found:
        assert problem is not None
        raise problem
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
    )
    grid = _grid(nights, kelvin, column_m2, kelvins, columns_m2)
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
        _coldest(grid, nights, float(column_m2[0]), rules, 1.0),
        _coldest(grid, nights, float(column_m2[0]), rules, budget.nights),
        tuple(left_out),
    )


def glow_of(kelvin: Array) -> Array:
    """Return the radiance of all lines of the list per unit column, W sr-1, of the shape of `kelvin`."""
    return total_radiance_w_m2_sr(load_lines(), kelvin, np.ones_like(kelvin))


def tabulated_glow(kelvin: Array) -> Array:
    """Return the same for many temperatures from a spline, within 1e-6 (tests/answers/test_fade.py)."""
    nodes = np.linspace(1.0 / HOTTEST_K, 1.0 / COLDEST_K, GLOW_NODES)
    return np.asarray(np.exp(CubicSpline(nodes, np.log(glow_of(1.0 / nodes)))(1.0 / kelvin)))


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
    """Return the budget in whole clear nights that can be relied upon.

    These are the most that the weather gives with the probability that the request wants, counted over
    consecutive nights. Without a budget one clear night is all there is.
    """
    weather, budget = request.weather, request.budget
    longest_s = max((night.duration_s for night in nights if night), default=np.inf)
    if budget.nights is not None:
        asked, text = budget.nights, words.count(budget.nights, "night")
    elif budget.hours is not None:
        asked = 3600.0 * budget.hours / longest_s
        text = f"{words.duration(3600.0 * budget.hours)}, that is {words.count(asked, 'night')}"
    else:
        return Budget(1.0, None, "one clear night (the request states no budget)", False)
    if isinstance(use.instrument.place, Orbit):
        return Budget(asked, None, text, True)
    chance = count_distribution(np.arange(int(asked)), weather.clear_fraction, weather.correlation)
    at_least = np.cumsum(chance[::-1])[::-1]
    sure = int(np.flatnonzero(at_least >= weather.probability - 1e-12)[-1])
    wanted = words.probability(weather.probability)
    if not sure:
        text += f", taken as clear: the weather alone keeps them from giving one clear night with {wanted}"
        return Budget(float(int(asked)), chance, text, True)
    return Budget(float(sure), chance, f"{text}, of which {sure} clear with probability {wanted}", True)


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


def fade_of(found: Fading) -> Result:
    """Return `fade` for a forecast that is at hand."""
    kelvin = found.law.temperature_k.median
    return Result(
        "fade",
        {"fade": _years_table(found), "map": _map_table(found)},
        _header(found),
        list(_sentences(found)),
        sorted({note for each in (kelvin.min(), kelvin.max()) for note in validity_warnings(float(each))}),
        feasible=bool(found.law.nights_needed.median[0] <= found.budget.nights),
    )


def _years_table(found: Fading) -> Table:
    law, trials = found.law, found.trials

    def three(name: str, law_says: Spread, spread: Spread, unit: str = "", **how: object) -> list[Column]:
        shown = name in ("nights_needed", "temperature")
        return [
            column(name, law_says.median, unit, **how),
            column(f"{name}_low", spread.low, unit, shown=shown, **how),
            column(f"{name}_high", spread.high, unit, shown=shown, **how),
        ]

    return table(
        column("year", found.year, shown=False),
        column("date", found.date, description="evening of the night that stands for the year"),
        *three("temperature", law.temperature_k, trials.temperature_k, "K", decimals=0),
        *three("column", law.column_m2, trials.column_m2, "m-2", digits=3),
        *three("relative_brightness", law.relative_brightness, trials.relative_brightness, digits=3),
        *three("snr_one_night", law.snr_one_night, trials.snr_one_night, digits=3),
        *three("nights_needed", law.nights_needed, trials.nights_needed, decimals=0, infinite="never"),
        column("probability_detectable", trials.probability_detectable, decimals=3),
        column("probability_error", trials.probability_error, digits=2, shown=False),
        caption=(
            f"The law year by year, with the central 68 % of {found.request.fade.trials} possible planets "
            f"(low, high). Nights are clear ones; column is vertical; detected means SNR "
            f"{words.short(found.rules.snr)} expected"
        ),
    )


def _map_table(found: Fading) -> Table:
    law, trials, grid = found.law, found.trials, found.grid
    low_k = max(COLDEST_K, 0.85 * float(min(trials.temperature_k.low.min(), law.temperature_k.median.min())))
    high_k = min(1.1 * float(trials.temperature_k.high.max()), float(grid.temperature_k[-1]))
    kelvin = np.linspace(low_k, max(high_k, low_k + 1.0), MAP_TEMPERATURES)
    middle_m2 = float(law.column_m2.median[0])
    columns_m2 = np.geomspace(middle_m2 / MAP_SPAN, middle_m2 * MAP_SPAN, MAP_COLUMNS)
    nights = nights_map(grid, 0, kelvin, columns_m2, found.rules)
    return table(
        column("temperature", np.repeat(kelvin, MAP_COLUMNS), "K", decimals=0),
        column("column", np.tile(columns_m2, MAP_TEMPERATURES), "m-2", digits=3),
        column("nights_needed", nights.ravel(), digits=3, infinite="never"),
        caption="Clear nights needed over temperature and vertical column, geometry of the first year",
        rows=(),
    )


def _header(found: Fading) -> dict[str, Entry]:
    request, use, night = found.request, found.use, found.night[0]
    header = {
        "request": Entry(request.name),
        "target": Entry(request.target.name),
        "instrument": Entry(use.instrument.name),
        "setting": Entry(use.setting.name),
        "law": Entry(law_words(request.target.emission, request.target.cooling)),
        "significance": Entry(found.rules.snr, label="SNR that counts as a detection", digits=3),
        "budget": Entry(found.budget.nights, text=found.budget.text),
        "coldest_one_night": _edge_entry(found.coldest_night, "coldest detectable, one clear night"),
        "coldest_budget": _edge_entry(found.coldest_budget, "coldest detectable, whole budget"),
        "dropout_year": Entry(
            float(found.law.dropout_year.median), text=_dropout_words(found), label="year it drops out"
        ),
        "dropout_low": Entry(
            float(found.trials.dropout_year.low), text=_year(found, "low"), label="at the earliest (1σ)"
        ),
        "dropout_high": Entry(
            float(found.trials.dropout_year.high), text=_year(found, "high"), label="at the latest (1σ)"
        ),
        "trials": Entry(request.fade.trials),
        "seed": Entry(request.weather.seed),
    }
    if night is not None:
        header["night"] = Entry(
            night.date, text=f"evening of {words.day(night.date)}", label="night of the first year"
        )
        header["conditions"] = Entry(conditions_words(use, night.seen.air))
    return header


def _edge_entry(edge: Edge, label: str) -> Entry:
    text = {
        "found": "",
        "below": f"{words.quantity(edge.low, 'K')} or colder (the line list ends there)",
        "none": f"none up to {words.quantity(edge.high, 'K')}",
    }[edge.kind]
    return Entry(edge.value, "K", text=text, label=label)


def _year(found: Fading, side: str) -> str:
    value = float(getattr(found.trials.dropout_year, side))
    return f"{value:.0f}" if np.isfinite(value) else f"after {found.year[-1]}"


def _dropout_words(found: Fading) -> str:
    value = float(found.law.dropout_year.median)
    return f"{value:.0f}" if np.isfinite(value) else f"after {found.year[-1]}"


def _sentences(found: Fading) -> list[str]:
    law, trials, name = found.law, found.trials, found.request.target.name
    first, last = int(found.year[0]), int(found.year[-1])
    use = f"{found.use.instrument.name} ({found.use.setting.name})"
    said = []
    if found.night[0] is None and not any(found.night):
        return [f"{name} can never be observed with {use} in these years.", *_left_out(found)]
    nights = law.nights_needed.median
    said.append(
        f"{name} with {use}: SNR {words.number(float(law.snr_one_night.median[0]))} in the best night of "
        f"{first}"
        + (
            f", {words.number(float(law.snr_one_night.median[-1]))} in {last}, when "
            f"{words.percent(float(law.relative_brightness.median[-1]))} of the light is left "
            f"({_between(trials.relative_brightness)})."
            if last > first
            else "."
        )
    )
    said.append(_dropout_sentence(found, nights))
    said.append(
        f"Chance of a detection with the budget ({found.budget.text}): "
        f"{words.probability(float(trials.probability_detectable[0]))} in {first}"
        + (
            f", {words.probability(float(trials.probability_detectable[-1]))} in {last}."
            if last > first
            else "."
        )
    )
    said.append(_coldest_sentence(found))
    said += _left_out(found)
    said.append(
        f"Each year stands for its best night, taken from every {EVERY}th with that year's geometry; "
        "a non-detection is no proof of a colder planet until the nights needed for the state it should "
        "have had are observed."
    )
    return said


def _between(spread: Spread) -> str:
    return f"{words.percent(float(spread.low[-1]))} to {words.percent(float(spread.high[-1]))} at 1σ"


def _dropout_sentence(found: Fading, nights: Array) -> str:
    first, last = int(found.year[0]), int(found.year[-1])
    year, share = float(found.law.dropout_year.median), found.trials.dropout_probability
    spread = f"1σ: {_year(found, 'low')} to {_year(found, 'high')}"
    if nights[0] > found.budget.nights:
        return (
            f"It needs {_nights_words(nights[0])} in {first} already, more than the "
            f"budget ({found.budget.text}): not feasible as it stands ({spread})."
        )
    if np.isfinite(year):
        at = int(np.flatnonzero(found.year == int(year))[0])
        return (
            f"It drops out of the budget in {year:.0f}, when it needs {_nights_words(nights[at])} "
            f"({spread}; in {words.percent(share)} of the trials by {last})."
        )
    return (
        f"It stays within the budget to {last} if the law holds; in {words.percent(share)} of the trials it "
        f"drops out before ({spread})."
    )


def _nights_words(nights: float) -> str:
    return (
        f"{words.count(nights, 'clear night')}"
        if np.isfinite(nights)
        else "more nights than any number gives"
    )


def _coldest_sentence(found: Fading) -> str:
    column = words.quantity(float(found.law.column_m2.median[0]), "m-2")
    one, many = found.coldest_night, found.coldest_budget
    if one.kind == many.kind == "none":
        return f"No temperature up to {one.high:.0f} K would be detected with a column of {column}."
    return (
        f"At a vertical column of {column} one clear night detects temperatures down to {_kelvin(one)}, the "
        f"clear nights of the budget ({words.short(found.budget.nights)}) down to {_kelvin(many)}, at SNR "
        f"{words.short(found.rules.snr)}."
    )


def _kelvin(edge: Edge) -> str:
    if edge.kind == "none":
        return "none"
    return f"{edge.value:.0f} K" + (" and below" if edge.kind == "below" else "")


def _left_out(found: Fading) -> list[str]:
    """Return one sentence for each run of years that share a reason."""
    said = []
    for _, group in groupby(found.left_out, key=lambda each: each[1][:40]):
        members = list(group)
        span = f"{members[0][0]}" if len(members) == 1 else f"{members[0][0]} to {members[-1][0]}"
        said.append(f"No answer for {span}: {members[0][1]}")
    unseen = [str(y) for y, night in zip(found.year, found.night, strict=True) if night is None]
    if unseen and len(unseen) < len(found.year):
        said.append(f"The target cannot be observed from this place in {words.listing(unseen)}.")
    return said


def law_words(emission: Emission, cooling: Cooling) -> str:
    """Return the cooling law in words."""
    start = f"{_estimate(emission.temperature_k)} K on {words.day(cooling.epoch)}"
    column_rate = 100.0 * YEAR_S * cooling.column_rate_s.value
    tail = f"; column {words.number(column_rate, 2)} % a year" if column_rate else ""
    if cooling.law == "table":
        text = f"table from {words.day(cooling.table_dates[0])} to {words.day(cooling.table_dates[-1])}"
    elif cooling.law == "linear":
        text = f"linear from {start}, {_estimate(cooling.rate_k_s, YEAR_S)} K a year"
        text += f", ending at {_estimate(cooling.floor_k)} K" if cooling.floor_k else ""
    elif cooling.law == "exponential" and cooling.floor_k and cooling.time_scale_s:
        text = f"exponential from {start} to {_estimate(cooling.floor_k)} K"
        text += f" within {_estimate(cooling.time_scale_s, 1.0 / YEAR_S)} years"
    else:
        text = f"constant, {start}"
    until = f"; said to hold until {words.day(cooling.valid_until)}" if cooling.valid_until else ""
    return text + tail + until


def _estimate(estimate: Estimate, scale: float = 1.0) -> str:
    text = words.number(scale * estimate.value, 3)
    return f"{text} ± {words.number(scale * estimate.uncertainty, 2)}" if estimate.uncertainty else text
