"""Chapter: one moment in full. The spectrum, the SNR against time, what the opening sees of the disk."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.constants import arcsec, c

from coldglow.answers.common.moment import Look
from coldglow.answers.common.visit import told_after_s
from coldglow.answers.planning.findings import Exposed
from coldglow.detect.beam import Disk, point_spread, slit_angle
from coldglow.detect.season import longitude_for_spots_rad, spot_system
from coldglow.light.shell import view_of
from coldglow.plan.goal import column_error, correlation, temperature_error
from coldglow.report import words
from coldglow.report.figures.disk import DiskView, OpeningView, SpotView, beam_on_disk
from coldglow.report.figures.exposure import snr_against_time
from coldglow.report.figures.spectrum import spectrum
from coldglow.report.figures.state import error_ellipse
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result
from coldglow.scenario import air_over

POINTS = 150  # of a curve


def exposure_chapter(each: Exposed, tag: str = "") -> Section:
    """Return the chapter of one instrument; `tag` ends the names of its files."""
    seen, result = each.seen, each.result
    name = f"{seen.use.instrument.name}, {seen.use.setting.name}"
    pictures = [_spectrum(seen, result, tag), _against_time(each, tag), _disk(seen, tag)]
    ellipse = _ellipse(each, tag)
    tables = {
        f"exposure-time{tag}": result.table("time"),
        f"exposure-lines{tag}": result.table("lines"),
        f"exposure-noise{tag}": result.table("noise"),
        f"systematic-errors{tag}": result.table("systematics"),
        f"spectrum{tag}": result.table("spectrum"),
    }
    return Section(
        f"How long to integrate: {name}",
        [*result.sentences, f"The moment is {result.header['moment']}; {result.header['conditions']}."],
        [*pictures, *ellipse],
        tables,
    )


def _spectrum(seen: Look, result: Result, tag: str) -> Picture:
    table, lines = result.table("spectrum"), result.table("lines")
    wavelength = table["wavelength"]
    atmosphere = air_over(seen.use.instrument)
    where, clear = np.empty(0), np.empty(0)
    span = float(wavelength.min()), float(wavelength.max())
    setting = seen.use.setting
    imager = seen.use.instrument.opening.kind == "imager"
    if imager:
        edges = [1e6 * edge for band in (setting.band_m, setting.off_band_m) if band for edge in band]
        span = min(edges), max(edges)
    if atmosphere is not None:
        where = np.linspace(*span, 4000)
        clear = atmosphere.transmission(
            1e-6 * where, float(seen.moment.airmass[0]), float(seen.moment.water_m[0])
        )
    shift = 1.0 + float(seen.track.range_rate_m_s[0]) / c
    wanted = lines["wanted"]
    strongest = int(np.argmax(np.where(wanted, lines["snr_one_hour"], 0.0)))
    figure = spectrum(
        wavelength,
        table["line"],
        table["continuum"],
        table["sky"] + table["telescope"],
        where,
        clear,
        lines["wavelength"] * shift,
        [str(label) for label in lines["label"]],
        lines["snr_one_hour"],
        "e⁻ s⁻¹ in the aperture" if imager else "e⁻ s⁻¹ per spectral pixel, whole aperture",
        span,
    )
    best = f"{lines['label'][strongest]} at {lines['wavelength'][strongest]:.4f} µm"
    with_air = "" if atmosphere is None else " with the transmission of the air"
    above = "" if atmosphere is None else " and the transmission of the air above"
    return Picture(
        f"spectrum{tag}",
        figure,
        f"Forecast spectrum between {span[0]:.3f} and {span[1]:.3f} micron{with_air}; the line that counts "
        f"most is {best}.",
        f"The H₃⁺ lines as the detector sees them, with the background under them{above}; "
        f"the lines stand where the planet's motion puts them. {best} counts most.",
    )


def _against_time(each: Exposed, tag: str) -> Picture:
    seen, result, light = each.seen, each.result, each.brightness
    noise, goal = result.table("noise"), seen.request.goal
    shares = {str(s): float(v) for s, v in zip(noise["source"], noise["variance_share"], strict=True)}
    need = result.header.get("time_to_goal")
    time_h = float(need.value) if need is not None else np.inf
    last_s = 3600.0 * max(2.2 * time_h if np.isfinite(time_h) else 12.0, 1.0)
    begin_s = float(seen.visit.clock_s(0.0))  # the curve is steepest where the first exposure begins
    last_s = max(last_s, 1.5 * begin_s)
    clock_s = np.append(0.0, begin_s + (last_s - begin_s) * np.linspace(0.0, 1.0, POINTS) ** 2)
    if np.isfinite(time_h):
        clock_s = np.sort(np.append(clock_s, 3600.0 * time_h))

    def snr(factor: float) -> NDArray[np.float64]:
        visit = seen.visit_in(seen.state.temperature_k, factor * seen.state.column_m2)
        return visit.snr(visit.open_s(clock_s))

    brighter, fainter = np.exp(light.random), np.exp(-light.random)
    expected = snr(1.0)
    figure = snr_against_time(
        clock_s / 3600.0,
        expected,
        shares,
        goal.snr,
        time_h,
        snr(fainter),
        snr(brighter),
        goal.probability if goal.probability != 0.5 else None,
    )
    return Picture(
        f"snr-time{tag}",
        figure,
        f"SNR against clock time, rising to {expected[-1]:.3g} after {last_s / 3600.0:.3g} hours.",
        "How the signal-to-noise ratio of all the goal's lines together grows with time on the clock; the "
        f"band is a planet 1σ brighter or fainter ({words.number(float(brighter))} and "
        f"{words.number(float(fainter))} times the light). The bar below says "
        "where the noise comes from.",
    )


def _disk(seen: Look, tag: str) -> Picture:
    track, target, opening = seen.track, seen.request.target, seen.use.instrument.opening
    view = view_of(target.figure, float(track.sub_observer_latitude_rad[0]))
    radius_rad = 0.5 * float(track.equatorial_diameter_rad[0])
    disk = Disk(
        radius_rad,
        radius_rad * view.outline_pole,
        float(track.pole_angle_rad[0]),
        float(np.nan_to_num(track.parallactic_angle_rad[0])),
    )
    middle_m = 0.5 * sum(seen.use.setting.band_m)
    image, telescope = seen.use.instrument.image, seen.use.instrument.telescope
    spread = point_spread(image, telescope, middle_m, seen.air.seeing_rad, float(seen.moment.airmass[0]))
    kind = {"slit": "slit", "ifu": "field", "imager": "field"}[opening.kind]
    system = spot_system(target, track)
    figure = beam_on_disk(
        DiskView(
            2.0 * radius_rad / arcsec,
            target.figure.polar_radius_m / target.figure.equatorial_radius_m,
            float(np.degrees(track.sub_observer_latitude_rad[0])),
            float(np.degrees(longitude_for_spots_rad(target, track)[0])),
            float(np.degrees(track.pole_angle_rad[0])),
            system.grows == "west",
        ),
        OpeningView(
            f"{kind} of {seen.use.instrument.name}",
            opening.width_rad / arcsec,
            opening.length_rad / arcsec,
            float(np.degrees(slit_angle(opening, disk) + disk.pole_angle_rad)),
            opening.offset_rad / arcsec,
        ),
        spread.fwhm_rad / arcsec,
        [
            SpotView(
                spot.name,
                float(np.degrees(spot.latitude_rad)),
                float(np.degrees(spot.longitude_rad)),
                float(np.degrees(spot.radius_rad)),
                float(np.degrees(spot.inner_radius_rad)),
            )
            for spot in target.emission.spots
        ],
    )
    share = words.percent(float(seen.moment.beam.light_share[0]))
    return Picture(
        f"disk{tag}",
        figure,
        f"The disk of {target.name} with its longitude grid under the {kind}; {share} of the light is in it.",
        f"{target.name} as the {kind} sees it at that moment, north up and east left, with the blur of the "
        f"image beside it. {share} of the light of the visible shell falls into the summed aperture.",
    )


def _ellipse(each: Exposed, tag: str) -> list[Picture]:
    """Return the error ellipse when the goals are reached (or after an hour of open shutter).

    Nothing where these lines give no temperature.
    """
    seen = each.seen
    open_s = told_after_s(each.needs)
    matrix = seen.visit.yields(open_s)
    kelvin, fraction = float(temperature_error(matrix)), float(column_error(matrix))
    if not np.isfinite(kelvin):
        return []
    fixed = seen.systematic(open_s)
    rho, sigma = float(correlation(matrix)), np.array([fraction, kelvin])
    figure = error_ellipse(
        seen.state.temperature_k,
        seen.state.column_m2,
        np.outer(sigma, sigma) * np.array([[1.0, rho], [rho, 1.0]]),
        (fixed.column_total, fixed.temperature_total_k),
    )
    hours = words.duration(float(seen.visit.clock_s(open_s)))
    text = (
        f"After {hours} of one visit the temperature is known to ± {words.number(kelvin, 2)} K and the "
        f"column to ± {words.percent(fraction)} (random); the two trade against each other."
    )
    return [Picture(f"errors{tag}", figure, text, f"{text} The box shows the systematic errors.")]
