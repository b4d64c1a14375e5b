"""From moments to information: counts on pixels, noise, and the Fisher matrix per second of open shutter.

Only the pixels that lines reach are looked at one by one for each moment; all the others know nothing of
lines and only pin the continuum, so their share is taken from the table's nodes.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np
from scipy.ndimage import uniform_filter1d

from coldglow.describe.records import Continuum, Instrument, Setting
from coldglow.detect.background import PixelTable, collecting_area_m2, pixel_table
from coldglow.detect.beam import Beam
from coldglow.detect.information import CONTINUUM_UNIT, NodNoise, fisher, nod_noise
from coldglow.detect.integration import (
    Integrations,
    choose_integration,
    photon_variance_factor,
    read_variance_e2,
)
from coldglow.detect.pixels import LineWindows, Pixels, line_windows, make_pixels, profile_sigma
from coldglow.errors import RangeError
from coldglow.light.atmosphere import FWHM_PER_SIGMA, Atmosphere, line_transmission
from coldglow.light.emission import log_temperature_slope, photon_radiance_s_m2_sr, thermal_sigma_m_s
from coldglow.light.lines import LineList

NOISE_SOURCES = ("lines", "planet continuum", "sky", "telescope", "dark", "read-out")
LINES_KEPT = 0.999  # share of the information on N and on T; the faintest lines are left out
VELOCITY_STEP = 0.25  # of a pixel: moments closer in velocity than this share the places of their lines
WIDTH_STEP = 0.05  # of ln(width): the same for the width of the lines
SMOOTHED = 2e-4  # in ln(wavelength), +-30 km/s: what the Earth's motion does to a line in a season
_IMAGER_STEP_M_S = 1000.0


@dataclass(frozen=True, slots=True)
class Moments:
    """Conditions of the moments to be forecast; every field is an ndarray[moment], `beam` a record of such.

    `range_rate_m_s` positive receding; `airmass` and `water_m` are ignored in space.
    """

    airmass: np.ndarray
    range_rate_m_s: np.ndarray
    water_m: np.ndarray
    sun_distance_m: np.ndarray
    beam: Beam

    def take(self, index: np.ndarray | slice) -> Moments:
        """Return the moments that an index or a mask selects."""
        return Moments(
            self.airmass[index],
            self.range_rate_m_s[index],
            self.water_m[index],
            self.sun_distance_m[index],
            self.beam.take(index),
        )


@dataclass(frozen=True, slots=True)
class Exposure:
    """What one second of open shutter brings at each moment.

    `matrix` ndarray[moment, 4, 4] (see `information.PARAMETERS`), without prior. `prior` ndarray[4, 4] is
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


@dataclass(frozen=True, slots=True)
class Counts:
    """Rates of some moments on some pixels, in the whole aperture and per second of open shutter.

    `lines` ndarray[moment, pixel] in electron/s. All else is smooth and is kept as a product, `load`
    ndarray[moment, load] times `rows` ndarray[load, pixel], each load belonging to one noise source.
    `derivatives` ndarray[parameter, moment, pixel] and `variance` ndarray[moment, pixel] are those of the
    difference that the nod pattern forms.
    """

    index: np.ndarray
    lines: np.ndarray
    load: np.ndarray
    rows: np.ndarray
    derivatives: tuple[np.ndarray, ...]
    variance: np.ndarray
    plan: Integrations


@dataclass(frozen=True, slots=True)
class Bench:
    """All that stays the same from moment to moment: pixels, table, lines kept and what they emit.

    `radiance` ndarray[line] is per unit column (s-1 sr-1); `wanted` ndarray[line] marks those measured.
    `rows` ndarray[load, pixel] are the table's rates and ones, `source` ndarray[load] the place in
    NOISE_SOURCES that each belongs to, and `noise` ndarray[source] the variance per electron.
    """

    instrument: Instrument
    setting: Setting
    pixels: Pixels
    table: PixelTable
    atmosphere: Atmosphere | None
    lines: LineList
    radiance: np.ndarray
    slope: np.ndarray
    wanted: np.ndarray
    column_m2: float
    thermal_m_s: float
    nod: NodNoise
    rows: np.ndarray
    source: np.ndarray
    noise: np.ndarray


def goal_mask(lines: LineList, goal_lines: tuple[str, ...]) -> np.ndarray:
    """Return ndarray[line]: the lines asked for; all of them if none is named.

    Raises:
        NotFoundError: a name that is no line of the setting.

    """
    if not goal_lines:
        return np.ones(len(lines), dtype=bool)
    mask = np.zeros(len(lines), dtype=bool)
    mask[[lines.find(name) for name in goal_lines]] = True
    return mask


def set_up(
    moments: Moments,
    lines: LineList,
    temperature_k: float,
    column_m2: float,
    continuum: Continuum,
    atmosphere: Atmosphere | None,
    instrument: Instrument,
    setting: Setting,
    goal_lines: tuple[str, ...] = (),
) -> Bench:
    """Prepare a setting for some moments; arguments as in `expose_moments`."""
    pixels = make_pixels(setting)
    table = pixel_table(
        instrument,
        setting,
        pixels,
        atmosphere,
        continuum,
        moments.airmass,
        moments.water_m,
        float(np.median(moments.sun_distance_m)),
    )
    inside = np.zeros(len(lines), dtype=bool)
    whole = [(pixels.low_m[0], pixels.high_m[-1])]
    for low, high in whole if pixels.step else zip(pixels.low_m, pixels.high_m, strict=True):
        inside |= (lines.wavelength_m >= low) & (lines.wavelength_m <= high)
    band = lines.take(inside)
    if not len(band):
        raise RangeError(
            f"The setting {setting.name!r} holds no line of H3+ between {setting.band_m[0] * 1e6:g} and "
            f"{setting.band_m[1] * 1e6:g} micron.",
            "settings.band",
        )
    wanted = goal_mask(band, goal_lines)
    radiance = photon_radiance_s_m2_sr(band, temperature_k, 1.0)
    slope = log_temperature_slope(band, temperature_k)
    kept = _lines_that_count(band, radiance, slope, pixels, table) | (wanted if goal_lines else False)
    band = band.take(kept)
    nod, factor = nod_noise(instrument.operation), photon_variance_factor(instrument.detector)
    nodes, ones = len(table.sky), np.ones((2, pixels.low_m.size))
    return Bench(
        instrument,
        setting,
        pixels,
        table,
        atmosphere,
        band,
        radiance[kept],
        slope[kept],
        wanted[kept].astype(float),
        column_m2,
        float(thermal_sigma_m_s(temperature_k)),
        nod,
        np.concatenate([table.continuum, table.sky, table.telescope[None, :], ones]),
        np.array([1] * nodes + [2] * nodes + [3, 4, 5]),
        np.array([nod.source * factor] * 2 + [nod.background * factor] * 3 + [nod.background]),
    )


def _lines_that_count(
    lines: LineList, radiance: np.ndarray, slope: np.ndarray, pixels: Pixels, table: PixelTable
) -> np.ndarray:
    """Return ndarray[line]: the lines without which less than 1 - LINES_KEPT of the information is lost.

    In a resolution element e lines add up to M_e = sum of m_l, m_l = signal over background noise; the
    information is the sum of M_e², and a faint line contributes 2 M_e m_l to it. The same is asked of the
    information on T, where a line counts with its slope. The air is taken at its clearest, smoothed, so
    that no line is lost that another velocity would uncover.
    """
    if pixels.step == 0.0:
        return np.ones(len(lines), dtype=bool)
    background = table.sky.min(axis=0) + table.telescope
    clear = table.unit_continuum.max(axis=0) / pixels.width_m
    clear = uniform_filter1d(clear, max(int(SMOOTHED / pixels.step), 1))
    place = np.log(lines.wavelength_m / pixels.low_m[0]) / pixels.step
    pixel = np.clip(place.astype(int), 0, pixels.low_m.size - 1)
    element = (place * pixels.step / (pixels.instrument_sigma * FWHM_PER_SIGMA)).astype(int)
    merit = radiance * clear[pixel] / np.sqrt(np.maximum(background[pixel], background.max() * 1e-12))
    mean_slope = float(np.square(merit) @ slope) / float(np.sum(np.square(merit)))
    kept = np.zeros(len(lines), dtype=bool)
    for weighted in (merit, merit * np.abs(slope - mean_slope)):
        gain = weighted * np.bincount(element, weighted)[element]
        order = np.argsort(-gain)
        total = np.cumsum(gain[order])
        kept[order[: int(np.searchsorted(total, total[-1] * (1.0 - 0.5 * (1.0 - LINES_KEPT)))) + 1]] = True
    return kept


def line_rates(bench: Bench, moments: Moments) -> tuple[np.ndarray, np.ndarray]:
    """Return electron/s of each line in the aperture and its transmission, both ndarray[moment, line]."""
    width_m_s = np.hypot(bench.thermal_m_s, moments.beam.velocity_spread_m_s)
    sigma_m_s = np.hypot(float(np.median(width_m_s)), bench.lines.position_sigma_m_s())
    if bench.atmosphere is None:
        clear = np.ones((moments.airmass.size, len(bench.lines)))
    else:
        clear = line_transmission(
            bench.atmosphere,
            bench.lines.wavelength_m,
            sigma_m_s,
            moments.range_rate_m_s + moments.beam.velocity_m_s,
            moments.airmass,
            moments.water_m,
        )
    beam = moments.beam
    etendue = collecting_area_m2(bench.instrument.telescope) * beam.solid_angle_sr
    column = bench.table.efficiency * bench.column_m2 * etendue * beam.path_factor
    return column[:, None] * clear * bench.radiance, clear


def count(bench: Bench, moments: Moments, rates: np.ndarray, windows: LineWindows) -> Counts:
    """Return the rates, derivatives and variance of the moments on the pixels of the windows.

    Args:
        bench: of the setting.
        moments: those that share the windows.
        rates: ndarray[moment, line] from `line_rates`.
        windows: where the lines fall.

    """
    detector, beam, table = bench.instrument.detector, moments.beam, bench.table
    etendue = collecting_area_m2(bench.instrument.telescope) * beam.solid_angle_sr
    node = table.weights(moments.airmass, moments.water_m)
    pixels = beam.pixels_spatial
    lines = rates @ windows.share
    # the planet's light falls on the pixels that the disk covers, the background on all of them
    covered = pixels * np.clip(beam.disk_fill, 1.0 / pixels, 1.0)
    planet = lines.max(axis=1, initial=0.0) + etendue * beam.disk_fill * (node @ table.peak_continuum)
    peak = etendue * (node @ table.peak_warm) / pixels + planet / covered + detector.dark_e_s
    plan = choose_integration(peak, detector, bench.instrument.operation)
    dark = pixels * detector.dark_e_s
    readout = pixels * read_variance_e2(detector) / plan.integration_s
    seen = etendue[:, None] * node
    load = np.concatenate(
        [beam.disk_fill[:, None] * seen, seen, etendue[:, None], dark[:, None], readout[:, None]], axis=1
    )
    rows = bench.rows.take(windows.index, axis=1)
    variance = (load * bench.noise[bench.source]) @ rows
    variance += bench.noise[0] * lines
    signal = bench.nod.signal
    wanted = signal * rates * bench.wanted
    derivatives = (
        wanted @ windows.share,
        (wanted * bench.slope) @ windows.share,
        (signal * CONTINUUM_UNIT * seen) @ table.unit_continuum.take(windows.index, axis=1),
        wanted @ windows.slope,
    )
    return Counts(windows.index, lines, load, rows, derivatives, variance, plan)


def variance_shares(bench: Bench, counts: Counts) -> np.ndarray:
    """Return ndarray[moment, source]: who makes the variance of the matched filter over the wanted lines.

    The filter weighs pixels with signal over variance, so each source counts with the square of that.
    """
    weight = bench.pixels.time_share[counts.index] * np.square(counts.derivatives[0] / counts.variance)
    each = np.empty((len(weight), len(NOISE_SOURCES)))
    each[:, 0] = np.einsum("mk,mk->m", weight, counts.lines)
    smooth = (weight @ counts.rows.T) * counts.load
    for source in range(1, len(NOISE_SOURCES)):
        each[:, source] = smooth[:, bench.source == source].sum(axis=1)
    each *= bench.noise
    total = each.sum(axis=1, keepdims=True)
    return np.where(total > 0.0, each / np.where(total > 0.0, total, 1.0), 0.0)


def _groups(bench: Bench, moments: Moments) -> Iterator[tuple[np.ndarray, float, float]]:
    """Yield (moments, velocity, width) of the moments whose lines fall on the same places."""
    velocity = moments.range_rate_m_s + moments.beam.velocity_m_s
    sigma = profile_sigma(bench.pixels, bench.thermal_m_s, moments.beam.velocity_spread_m_s)
    step_m_s = VELOCITY_STEP * bench.pixels.step * 299792458.0 or _IMAGER_STEP_M_S
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
    lines: LineList,
    temperature_k: float,
    column_m2: float,
    continuum: Continuum,
    atmosphere: Atmosphere | None,
    instrument: Instrument,
    setting: Setting,
    goal_lines: tuple[str, ...] = (),
) -> Exposure:
    """Return the information per second of open shutter at each moment.

    Args:
        moments: conditions; only moments at which the target is up.
        lines: the line list.
        temperature_k: of the ions.
        column_m2: mean *vertical* column of ions in local equilibrium.
        continuum: of the target.
        atmosphere: above the site; None in space.
        instrument: the instrument.
        setting: one of its settings.
        goal_lines: names of the lines to be measured, empty for all; the others are known light whose
            photons only make noise.

    Raises:
        RangeError: no line in the setting, or an imager without any hold on the continuum.
        SaturationError: the shortest integration fills the well.
        NotFoundError: a goal line that the setting does not hold.

    """
    bench = set_up(
        moments, lines, temperature_k, column_m2, continuum, atmosphere, instrument, setting, goal_lines
    )
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
