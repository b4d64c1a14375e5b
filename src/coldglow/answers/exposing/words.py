"""The words of `expose`: conditions, what a time yields, and its limits."""

from __future__ import annotations

import numpy as np

from coldglow.answers.common.moment import Look
from coldglow.answers.common.scenes import conditions_words
from coldglow.describe.column import mean_path_factor
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.plan.goal import column_error, correlation, temperature_error
from coldglow.plan.limits import Edge
from coldglow.report import words
from coldglow.report.results import Entry

NO_TEMPERATURE = "none: this setting gives no temperature"


def header_of(seen: Look, chosen: str) -> dict[str, Entry]:
    """Return moment, conditions and set-up as header values; `chosen` says how the moment came about."""
    track, plan, operation = seen.track, seen.detail.plan, seen.use.instrument.operation
    beam, figure = seen.moment.beam, seen.request.target.figure
    on_source = float(plan.shutter_share[0]) * (operation.on_fraction if operation.nod == "off-slit" else 1.0)
    vertical = words.quantity(seen.state.column_m2, "m-2")
    along = words.quantity(seen.state.column_m2 * mean_path_factor(figure), "m-2")
    noise = words.listing(
        [
            f"{name} {words.percent(float(part))}"
            for name, part in zip(NOISE_SOURCES, seen.detail.variance_share, strict=True)
            if part >= 0.005
        ]
    )
    in_space = not np.isfinite(track.airmass[0])
    return {
        "request": Entry(seen.request.name),
        "instrument": Entry(seen.use.instrument.name),
        "setting": Entry(seen.use.setting.name),
        "moment": Entry(seen.when, text=f"{words.moment(seen.when)} ({chosen})"),
        "conditions": Entry(conditions_words(seen.use, seen.air)),
        "airmass": Entry(float(track.airmass[0]), text="in space" if in_space else ""),
        "temperature": Entry(seen.state.temperature_k, "K"),
        "column": Entry(
            seen.state.column_m2, "m-2", text=f"{vertical} vertical, {along} along the line of sight"
        ),
        "range_rate": Entry(1e-3 * float(track.range_rate_m_s[0]), "km s-1"),
        "light_share": Entry(float(beam.light_share[0]), label="share of the planet's light in the aperture"),
        "integration": Entry(float(plan.integration_s[0]), "s"),
        "coadds": Entry(int(plan.coadds[0]), label="co-adds at one position"),
        "well_fill": Entry(float(plan.well_fill[0]), digits=2),
        "on_source_fraction": Entry(on_source, digits=3, label="on-source share of the clock"),
        "variance": Entry(noise, label="share of the variance"),
    }


def yields_of(seen: Look, open_s: float, occasion: str, coldest: Edge, smallest: Edge) -> dict[str, Entry]:
    """Return the headline numbers of one time, with their systematic errors."""
    visit, figure = seen.visit, seen.request.target.figure
    matrix, snr = visit.yields(open_s), words.short(seen.request.fade.significance)
    kelvin, percent = _errors(seen, open_s)
    fixed = seen.systematic(open_s)
    faintest = edge_words(smallest, "m-2", 3)
    if smallest.kind != "none":
        along = smallest.value * mean_path_factor(figure)
        faintest += f" vertical, {words.quantity(along, 'm-2')} along the line of sight"
    return {
        "shutter_time": Entry(open_s / 3600.0, "h", label=f"open shutter {occasion}", digits=3),
        "snr": Entry(float(visit.snr(open_s)), label=f"SNR {occasion}", digits=3),
        "temperature_error": Entry(float(temperature_error(matrix)), "K", text=kelvin, label="error of T"),
        "column_error": Entry(float(column_error(matrix)), text=percent, label="error of N, T free"),
        "systematic_column": Entry(fixed.fixed_total, label="systematic error of N at this T", digits=2),
        "systematic_temperature": Entry(
            fixed.temperature_total_k,
            "K",
            text="" if np.isfinite(fixed.temperature_total_k) else NO_TEMPERATURE,
            digits=2,
            label="systematic error of T",
        ),
        "correlation": Entry(
            float(correlation(matrix)),
            text="" if np.isfinite(temperature_error(matrix)) else NO_TEMPERATURE,
            label="correlation of ln N and T",
        ),
        "coldest_temperature": Entry(
            coldest.value, "K", label=f"coldest T at this N, SNR {snr}", text=edge_words(coldest, "K", 4)
        ),
        "smallest_column": Entry(
            smallest.value, "m-2", label=f"smallest N at this T, SNR {snr}", text=faintest
        ),
    }


def edge_words(edge: Edge, unit: str, digits: int = 3) -> str:
    """Return the edge of detection in words."""
    if edge.kind == "none":
        return f"none up to {words.quantity(edge.high, unit, digits)}"
    text = words.quantity(edge.value, unit, digits)
    return f"{text} or less" if edge.kind == "below" else text


def _errors(seen: Look, open_s: float) -> tuple[str, str]:
    """Return the errors of temperature and column (T free) in words, random and systematic."""
    matrix, fixed = seen.visit.yields(open_s), seen.systematic(open_s)

    def both(random: float, systematic: float, unit: str) -> str:
        if not np.isfinite(random):
            return f"not measured: {_no_temperature(seen)}"
        first, second = words.quantity(random, unit, 2), words.quantity(systematic, unit, 2)
        return f"± {first} (random), ± {second} (systematic)"

    return (
        both(float(temperature_error(matrix)), fixed.temperature_total_k, "K"),
        both(100.0 * float(column_error(matrix)), 100.0 * fixed.column_total, "%"),
    )


def _no_temperature(seen: Look) -> str:
    """Return why the temperature is not measured."""
    if seen.use.instrument.opening.kind == "imager":
        return "a filter adds all of them up"
    return "they rise from one upper energy only"


def limit_sentence(seen: Look, header: dict[str, Entry], occasion: str) -> str:
    """Return the faintest states that are detected, as a sentence."""
    snr, state = words.short(seen.request.fade.significance), seen.state
    given, kelvin = words.quantity(state.column_m2, "m-2"), words.quantity(state.temperature_k, "K")
    return (
        f"Detection limits {occasion} (SNR {snr} expected): at a vertical column of {given} the coldest "
        f"temperature is {header['coldest_temperature']}; at {kelvin} the smallest column is "
        f"{header['smallest_column']}."
    )


def precision_sentence(seen: Look, open_s: float, occasion: str) -> str:
    """Return how well temperature and column are known, as a sentence."""
    known = (
        f"at a given temperature the column has a random error of "
        f"{words.percent(1.0 / float(seen.visit.snr(open_s)))} and a systematic one of "
        f"{words.percent(seen.systematic(open_s).fixed_total)}"
    )
    if not np.isfinite(temperature_error(seen.visit.yields(open_s))):
        return f"These lines give no temperature: {_no_temperature(seen)}; {known} {occasion}."
    kelvin, percent = _errors(seen, open_s)
    return f"Known {occasion}: the temperature to {kelvin}, the column to {percent}; {known}."
