"""`expose`: how long must I integrate, and what limits me?"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.inputs import NamePath, Quantity, as_request, described, in_si, place_errors
from coldglow.answers.common.moment import Look, look
from coldglow.answers.common.scenes import choose_use, median_moment, unseen_words
from coldglow.answers.common.visit import Need, Visit, needs
from coldglow.answers.exposing.edges import coldest_temperatures, refined, smallest_columns
from coldglow.answers.exposing.words import header_of, limit_sentence, precision_sentence, yields_of
from coldglow.describe.records import Request, Use
from coldglow.detect.detail import Detail
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.detect.systematics import CAUSES, SystematicErrors
from coldglow.errors import RangeError
from coldglow.plan.goal import (
    column_error,
    temperature_error,
)
from coldglow.plan.limits import Edge
from coldglow.report import words
from coldglow.report.results import Entry, Result, Table, column, table
from coldglow.scenario import (
    follow,
    scenario,
    watch,
)
from coldglow.sky.clock import times_grid

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
    times_s = np.array(
        [time_s for time_s in SHUTTER_S if time_s >= visit.shortest_s or time_s == SHUTTER_S[-1]]
    )
    edges = _edges(seen, np.append(times_s, open_s))
    header = header_of(seen, chosen)
    for need in wanted:
        header[need.name] = Entry(need.clock_s / 3600.0, "h", text=need.text)
    header |= yields_of(seen, open_s, occasion, *(_exact(seen, edges, open_s)))
    strongest = int(np.argmax(detail.variance_share))
    sentences = [f"{need.text}." for need in wanted]
    sentences.append(precision_sentence(seen, open_s, occasion))
    sentences.append(limit_sentence(seen, header, occasion))
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
            "systematics": _systematics_table(seen.systematic(open_s), occasion),
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
            f"The {len(lines)} lines (printed are those that count most), one hour of open shutter. The last "
            "column is each line's share of the information on the temperature (column free)"
        ),
        rows=best.tolist(),
    )


def _systematics_table(errors: SystematicErrors, occasion: str) -> Table:
    return table(
        column("cause", CAUSES),
        column("column_at_this_temperature", errors.fixed, digits=2, infinite="none"),
        column("column", errors.column, digits=2, infinite="none"),
        column("temperature", np.round(errors.temperature_k, 9), "K", digits=2, infinite="none"),
        caption=f"Errors from elsewhere than counting, 1 sigma, {occasion}; more time lowers them little",
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
