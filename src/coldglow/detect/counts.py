"""Electrons of moments on pixels: lines, what lies under them, the noise of the nodded difference."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coldglow.detect.background import collecting_area_m2
from coldglow.detect.bench import NOISE_SOURCES, Bench, Moments
from coldglow.detect.information import CONTINUUM_UNIT
from coldglow.detect.integration import Integrations, choose_integration, read_variance_e2
from coldglow.detect.pixels import LineWindows
from coldglow.light.atmosphere import line_transmission


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
