"""The words of `fade`: what the forecast means, year by year and in all."""

from __future__ import annotations

from itertools import groupby

import numpy as np
from numpy.typing import NDArray
from scipy.constants import Julian_year as YEAR_S

from coldglow.answers.common.scenes import conditions_words
from coldglow.answers.fading.forecast import Fading
from coldglow.answers.fading.seasons import EVERY
from coldglow.describe.records import Cooling, Emission, Estimate
from coldglow.plan.fade import Spread
from coldglow.plan.limits import Edge
from coldglow.report import words
from coldglow.report.results import Entry

Array = NDArray[np.float64]


def header(found: Fading) -> dict[str, Entry]:
    """Return the headline numbers."""
    request, use, night = found.request, found.use, found.night[0]
    entries = {
        "request": Entry(request.name),
        "target": Entry(request.target.name),
        "instrument": Entry(use.instrument.name),
        "setting": Entry(use.setting.name),
        "law": Entry(law_words(request.target.emission, request.target.cooling)),
        "significance": Entry(found.rules.snr, label="SNR that counts as a detection", digits=3),
        "budget": Entry(found.budget.nights, text=found.budget.text),
        "coldest_one_night": _edge_entry(found.coldest_night, f"coldest detectable, one {found.budget.unit}"),
        "coldest_budget": _edge_entry(found.coldest_budget, "coldest detectable, whole budget"),
        "dropout_year": Entry(
            float(found.law.dropout_year.median),
            text=_year_words(found, found.law.dropout_year.median),
            label="year it drops out",
        ),
        "dropout_low": Entry(
            float(found.trials.dropout_year.low),
            text=_year_words(found, found.trials.dropout_year.low),
            label="at the earliest (1σ)",
        ),
        "dropout_high": Entry(
            float(found.trials.dropout_year.high),
            text=_year_words(found, found.trials.dropout_year.high),
            label="at the latest (1σ)",
        ),
        "trials": Entry(request.fade.trials),
        "seed": Entry(request.weather.seed),
    }
    if found.middle is not None and night is not None:
        fixed = found.middle.systematic(float(found.middle.visit.open_s(found.equal_s)))
        entries |= {
            "night": Entry(
                night.date, text=words.day(night.date), label="night of the first year, its evening"
            ),
            "moment": Entry(night.middle, text=words.moment(night.middle), label="middle of that night"),
            "clock_time": Entry(
                found.equal_s / 3600.0,
                "h",
                text=f"{words.duration(found.equal_s)} on the clock at that moment",
                label="one visit that detects as much",
            ),
            "conditions": Entry(conditions_words(use, night.seen.air)),
            "systematic_column": Entry(fixed.fixed_total, digits=2, label="systematic error of N at given T"),
            "systematic_temperature": Entry(
                fixed.temperature_total_k, "K", digits=2, label="systematic error of T"
            ),
        }
    return entries


def _edge_entry(edge: Edge, label: str) -> Entry:
    text = {
        "found": "",
        "below": f"{words.quantity(edge.low, 'K')} or colder (the line list ends there)",
        "none": f"none up to {words.quantity(edge.high, 'K')}",
    }[edge.kind]
    return Entry(edge.value, "K", text=text, label=label)


def _year_words(found: Fading, year: Array) -> str:
    """Return the year in which the target drops out; after the last one asked about where it is none."""
    value = float(year)
    return f"{value:.0f}" if np.isfinite(value) else f"after {found.year[-1]}"


def sentences(found: Fading) -> list[str]:
    """Return the answer in words."""
    law, trials, name = found.law, found.trials, found.request.target.name
    first, last = int(found.year[0]), int(found.year[-1])
    use = f"{found.use.instrument.name} ({found.use.setting.name})"
    said = []
    if found.night[0] is None and not any(found.night):
        return [f"{name} can never be observed with {use} in these years.", *_left_out(found)]
    noun = found.budget.unit.removeprefix("clear ")
    kept = float(law.relative_brightness.median[-1])
    fading = f", when {words.percent(kept)} of the light is left ({_between(trials.relative_brightness)})"
    said.append(
        f"{name} with {use}: SNR {words.number(float(law.snr_one_night.median[0]))} in the best {noun} of "
        f"{first}"
        + (
            f", {words.number(float(law.snr_one_night.median[-1]))} in {last}{fading if kept != 1.0 else ''}."
            if last > first
            else "."
        )
    )
    said += _since_epoch(found)
    said.append(dropout_sentence(found))
    said.append(
        f"Chance of a detection with the budget ({found.budget.text}): {_chance(found, 0)} in {first}"
        + (f", {_chance(found, -1)} in {last}." if last > first else ".")
    )
    said.append(_coldest_sentence(found))
    said += _left_out(found)
    said.append(
        f"Each year stands for its best {noun}, taken from every {EVERY}th, with that year's geometry."
    )
    return said


def _since_epoch(found: Fading) -> list[str]:
    """Return what the law has made of the description's state by the first year, where that matters."""
    emission, epoch = found.request.target.emission, found.request.target.cooling.epoch
    then, now = emission.temperature_k.value, float(found.law.temperature_k.median[0])
    if abs(then - now) < 1.0:
        return []
    return [
        f"By the law the {then:.0f} K of {words.day(epoch)} are {now:.0f} K on {words.day(found.date[0])}."
    ]


def _chance(found: Fading, year: int) -> str:
    """Return the probability of a detection, which so many trials cannot make certain."""
    chance, trials = float(found.trials.probability_detectable[year]), found.request.fade.trials
    if chance in (0.0, 1.0):
        return f"{words.probability(chance)} of {trials} trials"
    return words.probability(chance)


def _between(spread: Spread) -> str:
    return f"{words.percent(float(spread.low[-1]))} to {words.percent(float(spread.high[-1]))} at 1σ"


def dropout_sentence(found: Fading) -> str:
    """Return until when the target stays within the budget."""
    nights = found.law.nights_needed.median
    first, last = int(found.year[0]), int(found.year[-1])
    year, share = float(found.law.dropout_year.median), found.trials.dropout_probability
    years = found.trials.dropout_year
    spread = f"1σ: {_year_words(found, years.low)} to {_year_words(found, years.high)}"
    if nights[0] > found.budget.nights:
        return (
            f"It needs {_nights_words(found, nights[0])} in {first} already, more than the "
            f"budget ({found.budget.text}): not feasible as it stands ({spread})."
        )
    if np.isfinite(year):
        at = int(np.flatnonzero(found.year == int(year))[0])
        return (
            f"It drops out of the budget in {year:.0f}, when it needs {_nights_words(found, nights[at])} "
            f"({spread}; in {words.percent(share)} of the trials by {last})."
        )
    kept = f"It stays within the budget to {last} if the law holds; "
    if not share:
        return f"{kept}in none of the trials it drops out before."
    return f"{kept}in {words.percent(share)} of the trials it drops out before ({spread})."


def _nights_words(found: Fading, nights: float) -> str:
    if not np.isfinite(nights):
        return "more than any number of nights gives"
    return words.count(nights, found.budget.unit)


def _coldest_sentence(found: Fading) -> str:
    column = words.quantity(float(found.law.column_m2.median[0]), "m-2")
    one, many = found.coldest_night, found.coldest_budget
    unit, nights = found.budget.unit, words.count(found.budget.nights, found.budget.unit)
    text = (
        f"At a vertical column of {column} one {unit} detects {_reach(one)}"
        + (f", {nights} of the budget {_reach(many)}" if found.budget.nights > 1.0 else "")
        + f" (SNR {words.short(found.rules.snr)} expected)."
    )
    if many.kind == "found":
        text += (
            f" Not to detect it would then mean colder than {many.value:.0f} K at this column, or fewer "
            "ions: one cannot be told from the other."
        )
    return text


def _reach(edge: Edge) -> str:
    if edge.kind == "none":
        return f"nothing up to {edge.high:.0f} K"
    if edge.kind == "below":
        return f"every temperature from {edge.low:.0f} K on"
    return f"temperatures down to {edge.value:.0f} K"


def _left_out(found: Fading) -> list[str]:
    """Return one sentence for each run of years that share a reason."""
    said = []
    for _, group in groupby(found.left_out, key=lambda each: (type(each[1]), each[1].key)):
        members = list(group)
        span = f"{members[0][0]}" if len(members) == 1 else f"{members[0][0]} to {members[-1][0]}"
        said.append(f"No answer for {span}: {str(members[0][1]).rstrip('.')}.")
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
        text += f" with a time scale of {_estimate(cooling.time_scale_s, 1.0 / YEAR_S)} years"
    else:
        text = f"constant, {start}"
    until = f"; said to hold until {words.day(cooling.valid_until)}" if cooling.valid_until else ""
    return text + tail + until


def _estimate(estimate: Estimate, scale: float = 1.0) -> str:
    text = words.number(scale * estimate.value, 3)
    return f"{text} ± {words.number(scale * estimate.uncertainty, 2)}" if estimate.uncertainty else text
