"""`expose`: how long must I integrate, and what limits me?"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from coldglow.answers.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.scenes import (
    choose_use,
    conditions_words,
    information_rate,
    unseen_words,
)
from coldglow.describe.records import Instrument, Request, Use
from coldglow.detect.detail import Detail, expose_one
from coldglow.detect.exposure import NOISE_SOURCES, Moments, expose_moments
from coldglow.detect.integration import clock_time
from coldglow.detect.systematics import CAUSES, SystematicErrors, systematic_errors
from coldglow.errors import SaturationError
from coldglow.light.atmosphere import transmission_error
from coldglow.light.lines import load_lines
from coldglow.light.shell import line_of_sight_column_m2
from coldglow.plan.goal import (
    column_error,
    correlation,
    marginalise,
    required_snr,
    temperature_error,
    time_to_error,
    time_to_snr,
    with_floor,
)
from coldglow.plan.limits import Edge, against_time, coldest_temperature, smallest_column
from coldglow.report import words
from coldglow.report.results import Entry, Result, Table, column, table
from coldglow.scenario import (
    Air,
    Scenario,
    State,
    air_of,
    air_over,
    follow,
    moments_of,
    scenario,
    state_of,
    watch,
)
from coldglow.sky.clock import iso_from_tt, times_grid
from coldglow.sky.track import Track

EINSTEIN_A_ERROR = 0.03  # 2-3 % for the strong lines (data/h3p.md)
SHUTTER_S = tuple(
    60.0 * minutes for minutes in (1, 2, 5, 10, 20, 30, 60, 120, 180, 300, 480, 720, 1200, 3000)
)
TEMPERATURES_K = 1.0 / np.linspace(1.0 / 150.0, 1.0 / 1500.0, 40)
COLUMNS_M2 = np.geomspace(1e8, 1e19, 56)
LINES_PRINTED = 12


@dataclass(frozen=True, slots=True)
class Look:
    """One use of an instrument at one moment, in full."""

    request: Request
    use: Use
    track: Track  # of one instant
    state: State
    air: Air
    moment: Moments
    detail: Detail
    systematic: SystematicErrors

    @property
    def when(self) -> str:
        """The moment as ISO text, UTC."""
        return str(iso_from_tt(self.track.grid.tt_s, "m")[0])

    def rate(self, temperature_k: float, column_m2: float) -> float:
        """Return 1/sigma² of ln N per second of open shutter in another state of the ionosphere."""
        target, instrument = self.request.target, self.use.instrument
        exposure = expose_moments(
            self.moment,
            load_lines(),
            temperature_k,
            column_m2 * self.state.lte_fraction,
            target.continuum,
            air_over(instrument),
            instrument,
            self.use.setting,
            self.request.goal.lines,
        )
        return float(marginalise(exposure.matrix + exposure.prior)[0, 0, 0])


def median_moment(scene: Scenario) -> int:
    """Return the usable step whose information rate is the median of all usable ones."""
    index = np.flatnonzero(scene.usable)
    rate = information_rate(scene)[index]
    return int(index[np.argsort(rate, kind="stable")[(index.size - 1) // 2]])


def look(request: Request, use: Use, track: Track) -> Look:
    """Return a use of an instrument at the one instant of a track, in full."""
    target, instrument = request.target, use.instrument
    state, air = state_of(target), air_of(instrument.sky, request.conditions)
    moment = moments_of(target, instrument, use.setting, track, air)
    detail = expose_one(
        moment,
        load_lines(),
        state.temperature_k,
        state.shining_m2,
        target.continuum,
        air_over(instrument),
        instrument,
        use.setting,
        request.goal.lines,
    )
    systematic = systematic_errors(
        detail.lines.wavelength_m,
        np.where(detail.wanted, detail.line_information, 0.0),
        detail.temperature_slope,
        _telluric_error(detail, instrument, moment),
        instrument.operation,
        EINSTEIN_A_ERROR,
    )
    return Look(request, use, track, state, air, moment, detail, systematic)


def _telluric_error(detail: Detail, instrument: Instrument, moment: Moments) -> NDArray[np.float64]:
    """Return the relative error of each line's transmission, ndarray[line]; zero in space."""
    atmosphere = air_over(instrument)
    if atmosphere is None:
        return np.zeros(len(detail.lines))
    absolute = transmission_error(
        atmosphere,
        detail.lines.wavelength_m,
        float(moment.airmass[0]),
        float(moment.water_m[0]),
        float(moment.range_rate_m_s[0]),
    )
    relative: NDArray[np.float64] = absolute / np.maximum(detail.line_transmission, absolute)
    return relative


def expose(request: NamePath | Request, at: str | None = None, instrument: str = "") -> Result:
    """Return SNR and errors against time for one use of an instrument at one moment.

    Args:
        request: path or record.
        at: the moment, ISO, UTC; default: the observable step of the median information rate.
        instrument: which of the request's instruments; default: the first.

    Returns:
        A result with tables ``time`` (``clock_time``, ``shutter_time``, ``snr``, errors, limits),
        ``lines``, ``noise``, ``systematics`` and ``spectrum``.

    """
    record = as_request(request)
    use = choose_use(record, instrument)
    with place_errors(*described(record)):
        if at is None:
            scene = scenario(record, use, watch(record, use))
            if not scene.usable.any():
                return _nothing(record, use, unseen_words(scene))
            track = scene.track.take([median_moment(scene)])
            chosen = "the median of the observable steps"
        else:
            track = follow(record, use, times_grid([at]))
            if not track.observable[0]:
                return _nothing(
                    record, use, f"{record.target.name} cannot be observed then: {track.why_not}."
                )
            chosen = "as asked"
        return expose_of(look(record, use, track), chosen)


def _nothing(request: Request, use: Use, sentence: str) -> Result:
    empty = table(column("clock_time", [], "h"), column("shutter_time", [], "h"), column("snr", []))
    header = {"request": Entry(request.name), "instrument": Entry(use.instrument.name)}
    return Result("expose", {"time": empty}, header, [sentence], feasible=False)


def expose_of(seen: Look, chosen: str = "") -> Result:
    """Return `expose` for a look that is at hand."""
    operation, detail = seen.use.instrument.operation, seen.detail
    matrix = marginalise(detail.matrix + detail.prior)
    share = float(detail.plan.shutter_share[0])
    goal = seen.request.goal
    shutter_s = np.array(SHUTTER_S)
    clock_s = clock_time(shutter_s, np.array(share), operation)
    snr = np.sqrt(
        with_floor(with_floor(shutter_s * matrix[0, 0], operation.visit_floor), operation.common_floor)
    )
    kelvin = temperature_error(matrix) / np.sqrt(shutter_s)
    fraction = column_error(matrix) / np.sqrt(shutter_s)
    coldest, smallest = _edges(seen, shutter_s)
    times = table(
        column("clock_time", clock_s / 3600.0, "h", digits=3),
        column("shutter_time", shutter_s / 3600.0, "h", digits=3),
        column("snr", snr, digits=3),
        column("temperature_error", kelvin, "K", digits=3, infinite="none"),
        column("column_error", fraction, digits=3, infinite="none", description="1 sigma, fraction"),
        column("coldest_temperature", [edge.value for edge in coldest], "K", digits=3),
        column("smallest_column", [edge.value for edge in smallest], "m-2", digits=3),
        caption=(
            "One visit against time (clock time with all overheads). Limits: the coldest temperature at the "
            "given column and the smallest vertical column at the given temperature with "
            f"SNR {words.number(seen.request.fade.significance)}"
        ),
    )
    needs = _needs(seen, matrix)
    header = _header(seen, chosen, matrix)
    for name, (open_s, text) in needs.items():
        need_s = (
            float(clock_time(np.array(open_s), np.array(share), operation)) if np.isfinite(open_s) else np.inf
        )
        header[name] = Entry(need_s / 3600.0, "h", text=text.format(words.duration(need_s)))
    sentences = [entry.text + "." for name, entry in header.items() if name in needs]
    strongest = int(np.argmax(detail.variance_share))
    sentences.append(
        f"Most of the noise ({words.percent(float(detail.variance_share[strongest]))}) comes from "
        f"{NOISE_SOURCES[strongest]}."
    )
    sentences.extend(_precision_sentences(seen, matrix))
    if goal.snr is not None and goal.probability == 0.5:
        sentences.append(
            "At an expected SNR equal to the goal the measured one reaches it about half of the time."
        )
    return Result(
        "expose",
        {
            "time": times,
            "lines": _lines_table(detail),
            "noise": table(column("source", NOISE_SOURCES), column("variance_share", detail.variance_share)),
            "systematics": _systematics_table(seen.systematic),
            "spectrum": _spectrum_table(detail),
        },
        header,
        sentences,
        feasible=all(np.isfinite(open_s) for open_s, _ in needs.values()),
    )


def _needs(seen: Look, matrix: NDArray[np.float64]) -> dict[str, tuple[float, str]]:
    """Return for each goal the open-shutter time that reaches it and the words around it."""
    goal, operation, systematic = seen.request.goal, seen.use.instrument.operation, seen.systematic
    needs = {}
    if goal.snr is not None:
        wanted = required_snr(goal.snr, goal.probability)
        open_s = float(time_to_snr(wanted, matrix[0, 0], operation.visit_floor, operation.common_floor))
        text = f"SNR {words.number(goal.snr)} is reached in {{}}"
        if goal.probability != 0.5:
            text += f" with probability {words.probability(goal.probability)}"
            text += f" (expected SNR {words.number(wanted)})"
        if not np.isfinite(open_s):
            text = f"SNR {words.number(goal.snr)} is never reached: the floors end at {_asymptote(seen)}"
        needs["time_to_goal"] = (open_s, text)
    for name, wanted_error, one_second, fixed, unit in (
        (
            "temperature",
            goal.temperature_error_k,
            temperature_error(matrix),
            systematic.temperature_total_k,
            "K",
        ),
        ("column", goal.column_error, column_error(matrix), systematic.column_total, ""),
    ):
        if wanted_error is None:
            continue
        scale, symbol = (1.0, " K") if unit else (100.0, " %")
        shown = f"{words.number(scale * wanted_error)}{symbol}"
        open_s = float(time_to_error(wanted_error, one_second))
        text = f"A {name} to ± {shown} (random) is reached in {{}}"
        if not np.isfinite(open_s):
            text = f"A {name} to ± {shown} is never reached: these lines alone do not give it"
        elif wanted_error < fixed:
            text += (
                f", but the systematic error of ± {words.number(scale * fixed, 2)}{symbol} is larger than "
                "that and no time lowers it"
            )
        needs[f"time_to_{name}_error"] = (open_s, text)
    return needs


def _asymptote(seen: Look) -> str:
    operation = seen.use.instrument.operation
    floor = float(np.hypot(operation.visit_floor, operation.common_floor))
    return f"SNR {words.number(1.0 / floor)}" if floor > 0.0 else "nothing, as no line's light arrives"


def _edges(seen: Look, shutter_s: NDArray[np.float64]) -> tuple[tuple[Edge, ...], tuple[Edge, ...]]:
    """Return coldest temperature and smallest column against time, at the significance of the request."""
    operation = seen.use.instrument.operation
    floor2 = operation.visit_floor**2 + operation.common_floor**2
    wanted = seen.request.fade.significance**2
    rest = 1.0 - wanted * floor2
    information = wanted / rest if rest > 0.0 else np.inf
    kelvin, by_temperature = _until_saturation(lambda t: seen.rate(t, seen.state.column_m2), TEMPERATURES_K)
    column_m2, by_column = _until_saturation(lambda n: seen.rate(seen.state.temperature_k, n), COLUMNS_M2)
    in_temperature = CubicSpline(1.0 / kelvin[::-1], np.log(by_temperature[::-1]))
    in_column = CubicSpline(np.log(column_m2), np.log(by_column))
    return (
        against_time(
            lambda measure, needed: coldest_temperature(measure, needed, high_k=float(kelvin[-1])),
            lambda t: np.exp(in_temperature(1.0 / t)),
            information,
            shutter_s,
        ),
        against_time(
            lambda measure, needed: smallest_column(
                measure, needed, float(column_m2[0]), float(column_m2[-1])
            ),
            lambda n: np.exp(in_column(np.log(n))),
            information,
            shutter_s,
        ),
    )


def _until_saturation(
    rate: Callable[[float], float], nodes: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the nodes (ascending, ever brighter) at which the detector does not saturate, and the rates."""
    rates = []
    for node in nodes:
        try:
            rates.append(rate(float(node)))
        except SaturationError:
            break
    return nodes[: len(rates)], np.maximum(rates, np.finfo(float).tiny)


def _precision_sentences(seen: Look, matrix: NDArray[np.float64]) -> list[str]:
    if not np.isfinite(temperature_error(matrix)):
        return [
            "These lines give no temperature: they rise from one upper energy only, so its error is infinite."
        ]
    return [
        f"The errors of temperature and column are correlated by "
        f"{words.number(float(correlation(matrix)), 2)}; the systematic errors beside the random ones are ± "
        f"{words.number(seen.systematic.temperature_total_k, 2)} K and ± "
        f"{words.percent(seen.systematic.column_total)} (column, temperature free)."
    ]


def _header(seen: Look, chosen: str, matrix: NDArray[np.float64]) -> dict[str, Entry]:
    track, plan, operation = seen.track, seen.detail.plan, seen.use.instrument.operation
    beam, figure = seen.moment.beam, seen.request.target.figure
    on_source = float(plan.shutter_share[0]) * (operation.on_fraction if operation.nod == "off-slit" else 1.0)
    vertical = words.quantity(seen.state.column_m2, "m-2")
    along = words.quantity(float(line_of_sight_column_m2(figure, seen.state.column_m2)), "m-2")
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
        "information_rate": Entry(float(matrix[0, 0]), "s-1", label="1/σ² of ln N per open second"),
        "systematic_column": Entry(
            seen.systematic.fixed_total, label="systematic error of N at this T", digits=2
        ),
        "systematic_temperature": Entry(seen.systematic.temperature_total_k, "K", digits=2),
    }


def _lines_table(detail: Detail) -> Table:
    lines = detail.lines
    hour = np.sqrt(3600.0 * detail.line_information)
    best = np.sort(np.argsort(-hour, kind="stable")[:LINES_PRINTED])
    return table(
        column("wavelength", 1e6 * lines.wavelength_m, "um", decimals=5),
        column("label", lines.label),
        column("band", lines.band, shown=False),
        column("wanted", detail.wanted, shown=False),
        column("transmission", detail.line_transmission, decimals=3),
        column("signal", detail.line_signal_e_s, "electron s-1", digits=3),
        column("snr_one_hour", hour, digits=3, description="in one hour of open shutter"),
        column(
            "temperature_share", detail.temperature_share, digits=2, description="of the information on T"
        ),
        caption=f"The {best.size} lines of {len(lines)} that count most, one hour of open shutter",
        rows=best.tolist(),
    )


def _systematics_table(errors: SystematicErrors) -> Table:
    return table(
        column("cause", CAUSES),
        column("column_at_this_temperature", errors.fixed, digits=2, infinite="none"),
        column("column", errors.column, digits=2, infinite="none"),
        column("temperature", errors.temperature_k, "K", digits=2, infinite="none"),
        caption="Errors that no exposure time lowers, 1 sigma",
    )


def _spectrum_table(detail: Detail) -> Table:
    names = ("line", "continuum", "sky", "telescope")
    rates = (detail.line_e_s, detail.continuum_e_s, detail.sky_e_s, detail.telescope_e_s)
    return table(
        column("wavelength", 1e6 * detail.wavelength_m, "um", decimals=6),
        *(column(name, rate, "electron s-1") for name, rate in zip(names, rates, strict=True)),
        column(
            "efficiency", detail.efficiency, description="transmission of the air times electrons per photon"
        ),
        column("variance", detail.variance, "electron2 s-1"),
        caption="What one second of open shutter brings, per spectral pixel of the whole aperture",
        rows=(),
    )
