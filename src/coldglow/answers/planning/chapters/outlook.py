"""Chapter: the outlook. Until when the cooling planet can be detected, and how cold it may be."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.fade import MAP_COLUMNS
from coldglow.answers.fading.forecast import Fading
from coldglow.report import words
from coldglow.report.figures.fade import Interval, fade
from coldglow.report.figures.state import nights_map
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result, Table


def outlook_chapter(found: Fading, result: Result) -> Section:
    """Return the chapter of a forecast and its result."""
    pictures = [*_years(found, result.table("fade")), _map(found, result.table("map"))]
    title = f"Is a colder {found.request.target.name} still detectable: {found.use.instrument.name}"
    return Section(
        title, result.sentences, pictures, {"fade": result.table("fade"), "map": result.table("map")}
    )


def _interval(table: Table, name: str) -> Interval:
    return table[f"{name}_low"], table[name], table[f"{name}_high"]


def _years(found: Fading, table: Table) -> list[Picture]:
    if len(table) < 2:
        return []
    drops = float(found.law.dropout_year.median)
    figure = fade(
        np.asarray(table["year"], dtype=float),
        _interval(table, "temperature"),
        _interval(table, "relative_brightness"),
        _interval(table, "nights_needed"),
        found.budget.nights,
        drops - 1.0 if np.isfinite(drops) and drops > table["year"][0] else None,
        found.budget.unit,
    )
    needed = f"{found.budget.unit}s needed"
    first, last = int(table["year"][0]), int(table["year"][-1])
    left = words.percent(float(table["relative_brightness"][-1]))
    return [
        Picture(
            "fade",
            figure,
            f"Temperature, brightness and {needed} from {first} to {last}; {left} of the light "
            f"of {first} is left at the end.",
            f"Temperature, brightness over that of {first}, and {needed} for a detection, year by "
            "year with that year's geometry. The bands hold the central 68 % of the possible planets.",
        )
    ]


def _map(found: Fading, table: Table) -> Picture:
    def grid(name: str) -> NDArray[np.float64]:
        return np.asarray(table[name], dtype=float).reshape(-1, MAP_COLUMNS)

    law, trials = found.law, found.trials
    kelvin, column_m2 = law.temperature_k.median, law.column_m2.median
    spread_k = 0.5 * float(trials.temperature_k.high[0] - trials.temperature_k.low[0])
    spread_m2 = 0.5 * float(trials.column_m2.high[0] - trials.column_m2.low[0])
    years = [str(year) for year in found.year]
    moves = bool(np.ptp(kelvin) > 1.0 or np.ptp(column_m2) > 0.01 * column_m2[0])
    figure = nights_map(
        grid("temperature")[:, 0],
        grid("column")[0],
        grid("nights_needed").T,
        (float(kelvin[0]), float(column_m2[0])),
        (spread_k, spread_m2),
        years[0],
        years if moves else (),
        kelvin if moves else None,
        column_m2 if moves else None,
        found.budget.nights,
        found.budget.unit,
    )
    needed = f"{words.sentence_case(found.budget.unit)}s needed"
    way = ", with the way that the cooling law takes through them" if moves else ""
    return Picture(
        "nights-map",
        figure,
        f"{needed} over temperature and vertical column; {found.request.target.name} stands at "
        f"{kelvin[0]:.0f} K in {years[0]}.",
        f"{needed} for SNR {words.short(found.rules.snr)} over temperature and vertical column in "
        f"the geometry of {years[0]}{way}. The star shows the state of that year and its uncertainty.",
    )
