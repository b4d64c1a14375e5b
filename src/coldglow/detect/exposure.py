"""From moments to information: the Fisher matrix per second of open shutter at each of them.

Only the pixels that lines reach are looked at one by one for each moment; all the others know nothing of
lines and only pin the continuum, so their share is taken from the table's nodes.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np
from scipy.constants import c as LIGHT_M_S

from coldglow.describe.records import Instrument, Setting
from coldglow.detect.background import collecting_area_m2
from coldglow.detect.bench import NOISE_SOURCES, Bench, Glow, Moments, set_up
from coldglow.detect.counts import count, line_rates, variance_shares
from coldglow.detect.information import CONTINUUM_UNIT, fisher
from coldglow.detect.integration import (
    Integrations,
    choose_integration,
    photon_variance_factor,
    read_variance_e2,
)
from coldglow.detect.pixels import line_windows, profile_sigma
from coldglow.errors import RangeError
from coldglow.light.atmosphere import Atmosphere

__all__ = ["NOISE_SOURCES", "Exposure", "Glow", "Moments", "continuum_prior", "expose_moments"]

VELOCITY_STEP = 0.25  # of a pixel: moments closer in velocity than this share the places of their lines
WIDTH_STEP = 0.05  # of ln(width): the same for the width of the lines
_IMAGER_STEP_M_S = 1000.0


@dataclass(frozen=True, slots=True)
class Exposure:
    """What one second of open shutter brings at each moment.

    `matrix` ndarray[moment, 4, 4] (parameters as in `information`), without prior. `prior` ndarray[4, 4] is
    to be added once to the sum of each visit before it is marginalised (zero without a continuum prior).
    `signal_e_s` electrons of the wanted lines; `variance_share` ndarray[moment, source] in the order of
    NOISE_SOURCES, as it enters the matched filter over the lines; `line_transmission` ndarray[moment] of the
    wanted lines' light.
    """

    matrix: np.ndarray
    prior: np.ndarray
    signal_e_s: np.ndarray
    variance_share: np.ndarray
    line_transmission: np.ndarray
    integration_s: np.ndarray
    coadds: np.ndarray
    well_fill: np.ndarray
    shutter_share: np.ndarray


def _groups(bench: Bench, moments: Moments) -> Iterator[tuple[np.ndarray, float, float]]:
    """Yield (moments, velocity, width) of the moments whose lines fall on the same places."""
    velocity = moments.range_rate_m_s + moments.beam.velocity_m_s
    sigma = profile_sigma(bench.pixels, bench.thermal_m_s, moments.beam.velocity_spread_m_s)
    step_m_s = VELOCITY_STEP * bench.pixels.step * LIGHT_M_S or _IMAGER_STEP_M_S
    key = np.stack([np.round(velocity / step_m_s), np.round(np.log(sigma) / WIDTH_STEP)], axis=1)
    _, group = np.unique(key, axis=0, return_inverse=True)
    order = np.argsort(group.ravel(), kind="stable")
    for members in np.split(order, np.flatnonzero(np.diff(group.ravel()[order])) + 1):
        yield members, float(np.mean(velocity[members])), float(np.mean(sigma[members]))


def continuum_prior(bench: Bench, moments: Moments) -> np.ndarray:
    """Return ndarray[4, 4]: information on the continuum level that a visit starts with.

    Raises:
        RangeError: an imager with neither off-band filter nor prior cannot tell lines from continuum.

    """
    setting, prior = bench.setting, np.zeros((4, 4))
    if math.isfinite(setting.continuum_prior):
        radiance = bench.table.continuum.sum() / bench.table.unit_continuum.sum()
        level = setting.continuum_prior * radiance * float(np.mean(moments.beam.disk_fill)) / CONTINUUM_UNIT
        prior[2, 2] = 1.0 / max(level, 1e-6) ** 2
    elif bench.pixels.low_m.size < 2:
        raise RangeError(
            f"The setting {setting.name!r} measures one band only and cannot tell lines from continuum: "
            "give it an off-band filter (`off_band`) or a `continuum_prior`.",
            f"settings.{setting.name}.off_band",
        )
    return prior


def expose_moments(
    moments: Moments,
    glow: Glow,
    atmosphere: Atmosphere | None,
    instrument: Instrument,
    setting: Setting,
    goal_lines: tuple[str, ...] = (),
) -> Exposure:
    """Return the information per second of open shutter at each moment.

    Args:
        moments: conditions; only moments at which the target is up.
        glow: what shines.
        atmosphere: above the site; None in space.
        instrument: the instrument.
        setting: one of its settings.
        goal_lines: names of the lines to be measured, empty for all; the others are known light whose
            photons only make noise.

    Raises:
        RangeError: no line in the setting, none of its light passes the air or falls into the opening, or
            an imager without any hold on the continuum.
        SaturationError: the shortest integration fills the well.
        NotFoundError: a goal line that the setting does not hold.

    """
    bench = set_up(moments, glow, atmosphere, instrument, setting, goal_lines)
    prior = continuum_prior(bench, moments)
    rates, clear = line_rates(bench, moments)
    level = _continuum_of_pixels(bench, moments)
    level_sum = level.sum(axis=1)
    size = moments.airmass.size
    matrix = np.empty((size, 4, 4))
    shares = np.empty((size, len(NOISE_SOURCES)))
    plan = [np.empty(size) for _ in fields(Integrations)]
    for members, velocity, sigma in _groups(bench, moments):
        windows = line_windows(bench.pixels, bench.lines.wavelength_m, velocity, sigma)
        part = moments.take(members)
        counts = count(bench, part, rates[members], windows)
        time_share = bench.pixels.time_share[counts.index]
        matrix[members] = fisher(counts.derivatives, counts.variance, time_share)
        outside = level_sum - level[:, counts.index].sum(axis=1)
        etendue = collecting_area_m2(instrument.telescope) * part.beam.solid_angle_sr
        matrix[members, 2, 2] += etendue * (bench.table.weights(part.airmass, part.water_m) @ outside)
        shares[members] = variance_shares(bench, counts)
        for whole, field in zip(plan, fields(Integrations), strict=True):
            whole[members] = getattr(counts.plan, field.name)
    light = bench.radiance * bench.wanted
    return Exposure(
        matrix,
        prior,
        rates @ bench.wanted,
        shares,
        clear @ light / light.sum(),
        *plan,
    )


def _continuum_of_pixels(bench: Bench, moments: Moments) -> np.ndarray:
    """Return ndarray[node, pixel]: what each pixel would tell about the continuum if it held no line.

    Per second and per m² sr of etendue, for the mean beam of the moments.
    """
    detector, table, nod = bench.instrument.detector, bench.table, bench.nod
    area_m2 = collecting_area_m2(bench.instrument.telescope)
    etendue = area_m2 * float(np.mean(moments.beam.solid_angle_sr))
    pixels = float(np.mean(moments.beam.pixels_spatial))
    factor = photon_variance_factor(detector)
    warm = table.sky + table.telescope
    peak = np.array([np.max(table.peak_warm) * etendue / pixels + detector.dark_e_s])
    integration_s = float(choose_integration(peak, detector, bench.instrument.operation).integration_s[0])
    still = pixels * (factor * detector.dark_e_s + read_variance_e2(detector) / integration_s)
    planet = float(np.mean(moments.beam.disk_fill)) * table.continuum
    variance = factor * etendue * (nod.source * planet + nod.background * warm) + nod.background * still
    slope = nod.signal * CONTINUUM_UNIT * etendue * table.unit_continuum
    level: np.ndarray = bench.pixels.time_share * np.square(slope) / variance / etendue
    return level
