"""`fade`: is a colder planet still detectable, and until when?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from coldglow.answers.common.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.common.scenes import choose_use
from coldglow.answers.fading.forecast import MAP_SPAN, Fading, fading
from coldglow.answers.fading.words import header, sentences
from coldglow.describe.records import Request
from coldglow.errors import RangeError
from coldglow.light.emission import COLDEST_K, validity_warnings
from coldglow.plan.fade import Spread, nights_map
from coldglow.report import words
from coldglow.report.results import Column, Result, Table, column, table

MAP_TEMPERATURES, MAP_COLUMNS = 40, 25


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

    >>> result = fade("examples/uranus-season.yaml", years=(2027, 2029))
    >>> result["year"].tolist()
    [2027, 2028, 2029]
    >>> bool(result["relative_brightness"][-1] < 1.0)
    True

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


def fade_of(found: Fading) -> Result:
    """Return `fade` for a forecast that is at hand."""
    kelvin = found.law.temperature_k.median
    return Result(
        "fade",
        {"fade": _years_table(found), "map": _map_table(found)},
        header(found),
        sentences(found),
        sorted({note for each in (kelvin.min(), kelvin.max()) for note in validity_warnings(float(each))}),
        feasible=bool(found.law.nights_needed.median[0] <= found.budget.nights),
    )


def _years_table(found: Fading) -> Table:
    law, trials = found.law, found.trials

    def three(name: str, law_says: Spread, spread: Spread, unit: str = "", **how: object) -> list[Column]:
        shown = name == "nights_needed"
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
