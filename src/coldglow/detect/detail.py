"""One moment in full: the spectrum on pixels, each line's part, and what makes the noise."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coldglow.describe.records import Instrument, Setting
from coldglow.detect.bench import NOISE_SOURCES, Glow, Moments, set_up
from coldglow.detect.counts import count, line_rates, variance_shares
from coldglow.detect.exposure import continuum_prior
from coldglow.detect.information import fisher
from coldglow.detect.integration import Integrations
from coldglow.detect.pixels import line_windows, profile_sigma
from coldglow.light.atmosphere import Atmosphere
from coldglow.light.lines import LineList


@dataclass(frozen=True, slots=True)
class Detail:
    """What the detector records in one second of open shutter at one moment.

    Pixels (ndarray[pixel], electron/s in the whole aperture, and `variance` of the nodded difference):
    `wavelength_m`, `line_e_s`, `continuum_e_s`, `sky_e_s`, `telescope_e_s`, `efficiency` (transmission of
    the air times electrons per photon). One number for all: `dark_e_s`, `readout_e2_s` per spectral pixel.

    Lines (ndarray[line], those that were kept): `line_signal_e_s`, `line_transmission`, `line_information`
    (1/sigma² of ln of the line's flux per second, all else known; its root times the root of the time is
    the line's SNR), `temperature_share` (of the information on T when N is free; sums to 1, or is zero with
    one line). `wanted` marks the goal's lines. `temperature_slope` is d ln(flux)/dT as far as the setting
    tells lines apart: an imager sees one slope, the mean over the light.

    `variance_share` in the order of `exposure.NOISE_SOURCES`.
    """

    wavelength_m: np.ndarray
    line_e_s: np.ndarray
    continuum_e_s: np.ndarray
    sky_e_s: np.ndarray
    telescope_e_s: np.ndarray
    efficiency: np.ndarray
    variance: np.ndarray
    dark_e_s: float
    readout_e2_s: float
    lines: LineList
    wanted: np.ndarray
    temperature_slope: np.ndarray
    line_signal_e_s: np.ndarray
    line_transmission: np.ndarray
    line_information: np.ndarray
    temperature_share: np.ndarray
    matrix: np.ndarray
    prior: np.ndarray
    variance_share: np.ndarray
    plan: Integrations


def temperature_shares(information: np.ndarray, slope: np.ndarray) -> np.ndarray:
    """Return ndarray[line]: each line's share of the information on T when the column is free.

    With lines that do not overlap it is I_l (g_l - mean g)², g_l = d ln(flux)/dT weighted by I_l.
    """
    total = float(information.sum())
    if total <= 0.0:
        return np.zeros_like(information)
    part = information * np.square(slope - float(information @ slope) / total)
    whole = float(part.sum())
    rounding = 1e-12 * float(information @ np.square(slope))
    return np.asarray(part / whole) if whole > rounding else np.zeros_like(part)


def expose_one(
    moment: Moments,
    glow: Glow,
    atmosphere: Atmosphere | None,
    instrument: Instrument,
    setting: Setting,
    goal_lines: tuple[str, ...] = (),
) -> Detail:
    """Return one moment in full, pixel by pixel; arguments and errors as in `exposure.expose_moments`.

    `moment` holds arrays of length 1.
    """
    bench = set_up(moment, glow, atmosphere, instrument, setting, goal_lines)
    prior = continuum_prior(bench, moment)
    rates, clear = line_rates(bench, moment)
    velocity = float(moment.range_rate_m_s[0] + moment.beam.velocity_m_s[0])
    sigma = float(profile_sigma(bench.pixels, bench.thermal_m_s, moment.beam.velocity_spread_m_s)[0])
    windows = line_windows(bench.pixels, bench.lines.wavelength_m, velocity, sigma, every_pixel=True)
    counts = count(bench, moment, rates, windows)
    time_share = bench.pixels.time_share
    continuum_e, sky_e, telescope_e, dark_e, readout_e2 = (
        counts.load[0, bench.source == source] @ counts.rows[bench.source == source]
        for source in range(1, len(NOISE_SOURCES))
    )
    signal = bench.nod.signal * rates[0]
    information = np.square(signal) * (windows.share.power(2) @ (time_share / counts.variance[0]))
    measured = information * bench.wanted
    slope = bench.slope
    if bench.pixels.step == 0.0:
        light = rates[0] * bench.wanted
        slope = np.full_like(slope, float(light @ slope) / float(light.sum()))
    return Detail(
        bench.pixels.centre_m,
        counts.lines[0],
        continuum_e,
        sky_e,
        telescope_e,
        bench.table.efficiency_of(moment.airmass, moment.water_m, bench.pixels.width_m)[0],
        counts.variance[0],
        float(dark_e[0]),
        float(readout_e2[0]),
        bench.lines,
        bench.wanted > 0.0,
        slope,
        rates[0],
        clear[0],
        information,
        temperature_shares(measured, slope),
        fisher(counts.derivatives, counts.variance, time_share)[0],
        prior,
        variance_shares(bench, counts)[0],
        counts.plan,
    )
