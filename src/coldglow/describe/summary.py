"""What was understood of a description, in rows of label and value for people."""

from __future__ import annotations

import math

from coldglow.describe.column import line_of_sight_column
from coldglow.describe.records import (
    Conditions,
    Cooling,
    Coverage,
    Estimate,
    Instrument,
    Request,
    Setting,
    Site,
    Target,
)
from coldglow.units import KINDS, from_si, show_quantity

Rows = list[tuple[str, str]]
LISTED = 6  # nights that are named


def summary(record: Target | Instrument | Request) -> Rows:
    """Return label and value of all that matters in a record, rounded for reading."""
    if isinstance(record, Target):
        return _target(record)
    if isinstance(record, Instrument):
        return _instrument(record)
    return _request(record)


def _estimate(found: Estimate, kind: str) -> str:
    shown = KINDS[kind].shown
    text = f"{from_si(found.value, shown):.3g}"
    if found.uncertainty:
        text += f" ± {from_si(found.uncertainty, shown):.2g}"
    if found.scatter:
        text += f" (scatter {from_si(found.scatter, shown):.2g})"
    return f"{text} {shown}"


def _target(target: Target) -> Rows:
    figure, emission = target.figure, target.emission
    rows = [("target", target.name), ("body in the ephemeris", target.body)]
    for index, system in enumerate(target.rotation.systems):
        period = f"{system.period_s / 3600:.6f} h"
        if system.period_uncertainty_s:
            period += f" ± {system.period_uncertainty_s / 3600:.2g} h"
        note = ", the default" if index == 0 else ""
        label = "longitude systems" if index == 0 else ""
        rows.append((label, f"{system.name}: {period}, longitude grows {system.grows}{note}"))
    rows.append(("why that default", target.rotation.reason))
    rows.append(
        (
            "figure",
            f"{show_quantity(figure.equatorial_radius_m, 'radius')} x "
            f"{show_quantity(figure.polar_radius_m, 'radius')}, "
            f"shell at {show_quantity(figure.shell_height_m, 'radius')}",
        )
    )
    rows.append(("temperature", _estimate(emission.temperature_k, "temperature")))
    rows.append(("column, vertical", _estimate(emission.column_m2, "column")))
    rows.append(
        ("column, line of sight", _estimate(line_of_sight_column(emission.column_m2, figure), "column"))
    )
    rows.append(("given as", emission.given_as))
    for spot in emission.spots:
        where = f"latitude {show_quantity(spot.latitude_rad, 'angle')}"
        where += f", longitude {show_quantity(spot.longitude_rad, 'angle')} ({spot.system})"
        shape = "oval" if spot.inner_radius_rad else "spot"
        rows.append((shape, f"{spot.name}: {spot.share:.3g} of all ions at {where}"))
    albedo = target.continuum.albedo
    rows.append(("geometric albedo", f"{min(albedo):.3g} to {max(albedo):.3g}"))
    rows.append(("cooling", _cooling(target.cooling)))
    return rows


def _cooling(cooling: Cooling) -> str:
    parts: list[str] = [cooling.law]
    if cooling.law == "linear":
        parts.append(f"{_estimate(cooling.rate_k_s, 'temperature rate')} from {cooling.epoch}")
    if cooling.time_scale_s is not None:
        parts.append(f"time scale {_estimate(cooling.time_scale_s, 'years')} from {cooling.epoch}")
    if cooling.floor_k is not None:
        parts.append(f"floor {_estimate(cooling.floor_k, 'temperature')}")
    if cooling.valid_until is not None:
        parts.append(f"valid until {cooling.valid_until}")
    return ", ".join(parts)


def _place(instrument: Instrument) -> str:
    place = instrument.place
    if not isinstance(place, Site):
        return place.kind
    longitude, latitude = math.degrees(place.longitude_rad), math.degrees(place.latitude_rad)
    return f"longitude {longitude:+.4f} deg (east), latitude {latitude:+.4f} deg, {place.height_m:.0f} m"


def _setting(setting: Setting) -> str:
    low, high = (from_si(edge, "um") for edge in setting.band_m)
    text = f"{setting.name}: {low:.4g} to {high:.4g} um"
    if setting.resolving_power:
        text += f", R {setting.resolving_power:.6g}"
    if setting.off_band_m is not None:
        low, high = (from_si(edge, "um") for edge in setting.off_band_m)
        text += f", off band {low:.4g} to {high:.4g} um"
    return f"{text}, throughput {100 * setting.throughput:.3g} %"


def _instrument(instrument: Instrument) -> Rows:
    telescope, opening, detector = instrument.telescope, instrument.opening, instrument.detector
    rows = [("instrument", instrument.name), ("place", _place(instrument))]
    if isinstance(instrument.place, Site):
        rows.append(("median seeing", show_quantity(instrument.sky.seeing_rad.median, "small angle", 3)))
        rows.append(("median water", show_quantity(instrument.sky.water_m.median, "water", 3)))
        rows.append(("airmass", f"up to {instrument.limits.airmass_max:g}"))
    rows.append(
        (
            "telescope",
            f"{telescope.aperture_m:g} m at {telescope.temperature_k:g} K, "
            f"emissivity {telescope.emissivity:g}, transmission {telescope.transmission:g}",
        )
    )
    size = " x ".join(
        show_quantity(side, "small angle", 4) for side in (opening.width_rad, opening.length_rad)
    )
    rows.append((opening.kind, f"{size}, pixel {show_quantity(opening.pixel_rad, 'small angle', 4)}"))
    rows.append(("orientation", opening.angle))
    rows.append(("image quality", instrument.image.kind))
    rows += [("setting", _setting(setting)) for setting in instrument.settings]
    rows.append(
        (
            "detector",
            f"dark {detector.dark_e_s:g} e-/s, read noise {detector.read_noise_pair_e:g} e- a pair, "
            f"{detector.reads} reads, well {detector.full_well_e:g} e-",
        )
    )
    rows.append(("integrations", f"{detector.shortest_s:g} to {detector.longest_s:g} s"))
    rows.append(("nod", instrument.operation.nod))
    return rows


def _coverage(coverage: Coverage) -> str:
    if coverage.snr is not None:
        goal = f"SNR {coverage.snr:g}"
    elif coverage.temperature_error_k is not None:
        goal = f"temperature to {coverage.temperature_error_k:g} K"
    else:
        goal = f"{coverage.minutes:g} min"
    where = f"{goal} in each of {coverage.bins} bins of longitude"
    if coverage.spot:
        where = f"{goal} on the spot {coverage.spot}"
    elif coverage.latitude_rad is not None:
        where += f" at latitude {show_quantity(coverage.latitude_rad, 'angle', 4)}"
    return f"{where}, by {coverage.candidates}"


def _conditions(conditions: Conditions) -> str:
    stated = []
    if conditions.seeing_rad is not None:
        stated.append(f"seeing {show_quantity(conditions.seeing_rad, 'small angle', 3)}")
    if conditions.water_m is not None:
        stated.append(f"water {show_quantity(conditions.water_m, 'water', 3)}")
    return ", ".join([conditions.name, *stated])


def _request(request: Request) -> Rows:
    dates, goal, weather = request.dates, request.goal, request.weather
    rows = [("request", request.name), ("target", request.target.name)]
    rows += [
        ("instrument", f"{use.instrument.name}, setting {_setting(use.setting)}") for use in request.uses
    ]
    rows.append(("longitudes", request.longitudes))
    offered = "days" if request.in_space else f"offered as {dates.unit}s"
    rows.append(("nights", f"{dates.first} to {dates.last}, {offered}"))
    for label in ("offered", "forbidden", "fixed"):
        if some := getattr(dates, label):
            more = f" and {len(some) - LISTED} more" if len(some) > LISTED else ""
            rows.append((f"{label} nights", ", ".join(some[:LISTED]) + more))
    aims = []
    if goal.snr is not None:
        aims.append(
            f"SNR {goal.snr:g} in {', '.join(goal.lines) if goal.lines else 'all lines of the setting'} with "
            f"probability {goal.probability:g}"
        )
    if goal.temperature_error_k is not None:
        aims.append(f"temperature to {goal.temperature_error_k:g} K")
    if goal.column_error is not None:
        aims.append(f"column to {100 * goal.column_error:g} %")
    rows.append(("goal", "; ".join(aims)))
    rows.append(("coverage", _coverage(request.coverage) if request.coverage.asked else "not asked for"))
    if not request.in_space:
        rows.append(("conditions", _conditions(request.conditions)))
        rows.append(
            (
                "weather",
                f"{100 * weather.clear_fraction:g} % clear, correlation {weather.correlation:g}, "
                f"wanted probability {weather.probability:g}",
            )
        )
    budget = [] if request.budget.nights is None else [f"{request.budget.nights:g} nights"]
    budget += [] if request.budget.hours is None else [f"{request.budget.hours:g} h"]
    rows.append(("budget", " and ".join(budget) or "none stated"))
    rows.append(("outlook", f"{request.fade.first_year} to {request.fade.last_year}"))
    rows.append(("ephemeris", request.ephemeris or "packaged DE421"))
    return rows
