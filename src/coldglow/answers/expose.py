"""`expose`: how long must I integrate, and what limits me?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.edges import coldest_temperatures, refined, smallest_columns
from coldglow.answers.inputs import NamePath, Quantity, as_request, described, in_si, place_errors
from coldglow.answers.scenes import (
    choose_use,
    conditions_words,
    information_rate,
    unseen_words,
)
from coldglow.answers.visit import Need, Visit, needs
from coldglow.describe.records import Instrument, Request, Use
from coldglow.detect.detail import Detail, expose_one
from coldglow.detect.exposure import NOISE_SOURCES, Exposure, Moments, expose_moments
from coldglow.detect.integration import Integrations
from coldglow.detect.systematics import CAUSES, SystematicErrors, systematic_errors
from coldglow.errors import RangeError
from coldglow.light.atmosphere import transmission_error
from coldglow.light.lines import load_lines
from coldglow.light.shell import line_of_sight_column_m2
from coldglow.plan.goal import (
    column_error,
    correlation,
    temperature_error,
)
from coldglow.plan.limits import Edge
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

SHUTTER_S = tuple(
    60.0 * minutes for minutes in (1, 2, 5, 10, 20, 30, 60, 120, 180, 300, 480, 720, 1200, 3000)
)
LINES_PRINTED = 12
_SPOKEN = {
    "lines": "the lines themselves",
    "planet continuum": "the planet's continuum",
    "sky": "the sky",
    "telescope": "the telescope",
    "dark": "the dark current",
    "read-out": "the read-out",
}


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

    @property
    def visit(self) -> Visit:
        """The visit in the state of the description."""
        detail = self.detail
        share = float(detail.plan.shutter_share[0])
        operation = self.use.instrument.operation
        return Visit(detail.matrix, detail.prior, share, operation, self._cycle_s(detail.plan))

    def _cycle_s(self, plan: Integrations | Exposure) -> float:
        """Return the open shutter of one cycle: each nod position, of an imager in each of its filters."""
        positions = 1 if self.use.instrument.operation.nod == "stare" else 2
        filters = 1 if self.use.setting.off_band_m is None else 2
        return positions * filters * float(plan.coadds[0] * plan.integration_s[0])

    def visit_in(self, temperature_k: float, column_m2: float) -> Visit:
        """Return the visit in another state of the ionosphere."""
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
        share = float(exposure.shutter_share[0])
        return Visit(exposure.matrix[0], exposure.prior, share, instrument.operation, self._cycle_s(exposure))


def median_moment(scene: Scenario) -> int:
    """Return the usable step whose information rate is the median of all usable ones."""
    index = np.flatnonzero(scene.usable)
    rate = information_rate(scene)[index]
    return int(index[np.argsort(rate, kind="stable")[(index.size - 1) // 2]])


def look(request: Request, use: Use, track: Track) -> Look:
    """Return a use of an instrument at the one instant of a track, in full."""
    target, instrument = request.target, use.instrument
    state, air = state_of(request), air_of(instrument.sky, request.conditions)
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


def expose(
    request: NamePath | Request,
    at: str | None = None,
    instrument: str = "",
    clock: Quantity | None = None,
) -> Result:
    """Return SNR and errors against time for one use of an instrument at one moment.

    Args:
        request: path or record.
        at: the moment, ISO, UTC; default: the observable step of the median information rate.
        instrument: which of the request's instruments; default: the first.
        clock: time on the clock at which errors and limits are told (text without a unit: hours); default:
            when all goals are reached, or one hour of open shutter.

    Returns:
        A result with tables ``time`` (``clock_time``, ``shutter_time``, ``snr``, errors, limits),
        ``lines``, ``noise``, ``systematics`` and ``spectrum``.

    >>> result = expose("examples/uranus-season.yaml", at="2027-12-20T02:00")
    >>> str(result.header["integration"])
    '120.0 s'
    >>> bool((result["snr"][1:] > result["snr"][:-1]).all())
    True

    """
    record = as_request(request)
    use = choose_use(record, instrument)
    clock_s = None if clock is None else in_si(clock, "hours", "time")
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
        return expose_of(look(record, use, track), chosen, clock_s)


def _nothing(request: Request, use: Use, sentence: str) -> Result:
    empty = table(column("clock_time", [], "h"), column("shutter_time", [], "h"), column("snr", []))
    header = {"request": Entry(request.name), "instrument": Entry(use.instrument.name)}
    return Result("expose", {"time": empty}, header, [sentence], feasible=False)


def expose_of(seen: Look, chosen: str = "", clock_s: float | None = None) -> Result:
    """Return `expose` for a look that is at hand."""
    detail, visit, goal = seen.detail, seen.visit, seen.request.goal
    wanted = needs(goal, visit, seen.systematic)
    open_s, occasion = _occasion(visit, wanted, clock_s)
    times_s = np.array(SHUTTER_S)
    edges = _edges(seen, np.append(times_s, open_s))
    header = _header(seen, chosen)
    for need in wanted:
        header[need.name] = Entry(need.clock_s / 3600.0, "h", text=need.text)
    header |= _yields(seen, open_s, occasion, *(_exact(seen, edges, open_s)))
    strongest = int(np.argmax(detail.variance_share))
    sentences = [f"{need.text}." for need in wanted]
    sentences.append(_precision_sentence(seen, open_s, occasion))
    sentences.append(_limit_sentence(seen, header, occasion))
    sentences.append(
        f"Most of the noise ({words.percent(float(detail.variance_share[strongest]))}) comes from "
        f"{_SPOKEN[NOISE_SOURCES[strongest]]}."
    )
    if goal.snr is not None and goal.probability == 0.5:
        sentences.append(
            "At an expected SNR equal to the goal the measured one reaches it about half of the time."
        )
    return Result(
        "expose",
        {
            "time": _times_table(seen, times_s, edges),
            "lines": _lines_table(detail),
            "noise": table(
                column("source", NOISE_SOURCES),
                column("variance_share", detail.variance_share, digits=2),
                caption="Where the noise comes from",
            ),
            "systematics": _systematics_table(seen.systematic),
            "spectrum": _spectrum_table(detail),
        },
        header,
        sentences,
        feasible=all(np.isfinite(need.open_s) for need in wanted),
    )


def _occasion(visit: Visit, wanted: tuple[Need, ...], clock_s: float | None) -> tuple[float, str]:
    """Return the open shutter at which errors and limits are told, and its words."""
    if clock_s is not None:
        open_s = float(visit.open_s(clock_s))
        if not open_s > 0.0:
            raise RangeError(
                f"{words.duration(clock_s)} on the clock leave no open shutter: acquisition and standard "
                f"stars alone take {words.duration(float(visit.clock_s(0.0)))}"
            )
        return open_s, f"in {words.duration(clock_s)}"
    finite = [need.open_s for need in wanted if np.isfinite(need.open_s)]
    if finite:
        return max(finite), f"in {words.duration(float(visit.clock_s(max(finite))))}"
    return 3600.0, "in one hour of open shutter"


def _edges(seen: Look, open_s: NDArray[np.float64]) -> tuple[list[Edge], list[Edge]]:
    """Return coldest temperature and smallest column against time, at the significance of the request."""
    state, snr = seen.state, seen.request.fade.significance
    return (
        coldest_temperatures(lambda kelvin: seen.visit_in(kelvin, state.column_m2), snr, open_s),
        smallest_columns(lambda column_m2: seen.visit_in(state.temperature_k, column_m2), snr, open_s),
    )


def _exact(seen: Look, edges: tuple[list[Edge], list[Edge]], open_s: float) -> tuple[Edge, Edge]:
    """Return the last edges solved again without interpolation, so that they give the SNR exactly."""
    state, needed = seen.state, seen.visit.demanded(seen.request.fade.significance)

    def at_temperature(kelvin: float) -> float:
        return float(seen.visit_in(kelvin, state.column_m2).yields(open_s)[0, 0])

    def at_column(column_m2: float) -> float:
        return float(seen.visit_in(state.temperature_k, column_m2).yields(open_s)[0, 0])

    coldest, smallest = edges
    return refined(coldest[-1], at_temperature, needed), refined(smallest[-1], at_column, needed)


def _times_table(seen: Look, open_s: NDArray[np.float64], edges: tuple[list[Edge], list[Edge]]) -> Table:
    visit, (coldest, smallest) = seen.visit, edges
    matrix, count = visit.yields(open_s), open_s.size
    return table(
        column("clock_time", visit.clock_s(open_s) / 3600.0, "h", digits=3),
        column("shutter_time", open_s / 3600.0, "h", digits=3),
        column("snr", visit.snr(open_s), digits=3),
        column("temperature_error", temperature_error(matrix), "K", digits=3, infinite="none"),
        column(
            "column_error", column_error(matrix), digits=3, infinite="none", description="1 sigma, fraction"
        ),
        column("coldest_temperature", [edge.value for edge in coldest[:count]], "K", digits=3),
        column("smallest_column", [edge.value for edge in smallest[:count]], "m-2", digits=3),
        caption=(
            "One visit against time (clock time with all overheads). Limits: the coldest temperature at the "
            "given column and the smallest vertical column at the given temperature that are expected with "
            f"SNR {words.short(seen.request.fade.significance)}"
        ),
    )


def _yields(seen: Look, open_s: float, occasion: str, coldest: Edge, smallest: Edge) -> dict[str, Entry]:
    """Return the headline numbers of one time, with their systematic errors."""
    visit, figure = seen.visit, seen.request.target.figure
    matrix, snr = visit.yields(open_s), words.short(seen.request.fade.significance)
    kelvin, percent = _errors(seen, open_s)
    faintest = edge_words(smallest, "m-2", 3)
    if smallest.kind != "none":
        along = float(line_of_sight_column_m2(figure, smallest.value))
        faintest += f" vertical, {words.quantity(along, 'm-2')} along the line of sight"
    return {
        "shutter_time": Entry(open_s / 3600.0, "h", label=f"open shutter {occasion}", digits=3),
        "snr": Entry(float(visit.snr(open_s)), label=f"SNR {occasion}", digits=3),
        "temperature_error": Entry(float(temperature_error(matrix)), "K", text=kelvin, label="error of T"),
        "column_error": Entry(float(column_error(matrix)), text=percent, label="error of N, T free"),
        "correlation": Entry(float(correlation(matrix)), label="correlation of ln N and T"),
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
    matrix, fixed = seen.visit.yields(open_s), seen.systematic

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


def _limit_sentence(seen: Look, header: dict[str, Entry], occasion: str) -> str:
    snr, state = words.short(seen.request.fade.significance), seen.state
    given, kelvin = words.quantity(state.column_m2, "m-2"), words.quantity(state.temperature_k, "K")
    return (
        f"Detection limits {occasion} (SNR {snr} expected): at a vertical column of {given} the coldest "
        f"temperature is {header['coldest_temperature']}; at {kelvin} the smallest column is "
        f"{header['smallest_column']}."
    )


def _precision_sentence(seen: Look, open_s: float, occasion: str) -> str:
    known = (
        f"at a given temperature the column has a random error of "
        f"{words.percent(1.0 / float(seen.visit.snr(open_s)))} and a systematic one of "
        f"{words.percent(seen.systematic.fixed_total)}"
    )
    if not np.isfinite(temperature_error(seen.visit.yields(open_s))):
        return f"These lines give no temperature: {_no_temperature(seen)}; {known} {occasion}."
    kelvin, percent = _errors(seen, open_s)
    return f"Known {occasion}: the temperature to {kelvin}, the column to {percent}; {known}."


def _header(seen: Look, chosen: str) -> dict[str, Entry]:
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
        "systematic_column": Entry(
            seen.systematic.fixed_total, label="systematic error of N at this T", digits=2
        ),
        "systematic_temperature": Entry(
            seen.systematic.temperature_total_k, "K", digits=2, label="systematic error of T"
        ),
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
            "temperature_share",
            detail.temperature_share,
            digits=2,
            description="of the information on T, column free",
        ),
        caption=(
            f"The {best.size} lines of {len(lines)} that count most, one hour of open shutter. The last "
            "column is each line's share of the information on the temperature (column free)"
        ),
        rows=best.tolist(),
    )


def _systematics_table(errors: SystematicErrors) -> Table:
    return table(
        column("cause", CAUSES),
        column("column_at_this_temperature", errors.fixed, digits=2, infinite="none"),
        column("column", errors.column, digits=2, infinite="none"),
        column("temperature", np.round(errors.temperature_k, 9), "K", digits=2, infinite="none"),
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
