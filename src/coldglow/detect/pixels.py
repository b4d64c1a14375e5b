"""The pixels of a setting and how a line spreads over them.

A spectrograph has pixels of equal width in ln(wavelength); an imager has two, its filter and its off-band
filter, which share the open-shutter time. An extended source fills the slit, so the instrument's profile
is the image of the slit (a Gaussian of FWHM wavelength / R with R given for a filled slit), widened by the
thermal motion of the ions and by the spread of the disk's rotation inside the beam.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.constants import c as LIGHT_M_S
from scipy.sparse import csr_array
from scipy.special import erf

from coldglow.describe.records import Setting
from coldglow.light.average import FWHM_PER_SIGMA

REACH_SIGMA = 4.5  # half width of a line's window; 7e-6 of its light lies outside


@dataclass(frozen=True, slots=True)
class Pixels:
    """Pixels of a setting: edges (ndarray[pixel]) and share of the open-shutter time that each collects."""

    low_m: np.ndarray
    high_m: np.ndarray
    time_share: np.ndarray
    step: float  # width in ln(wavelength); 0 for an imager
    instrument_sigma: float  # rms width of the instrument's profile in ln(wavelength); 0 for an imager

    @property
    def centre_m(self) -> np.ndarray:
        """Middle of each pixel."""
        return np.asarray(0.5 * (self.low_m + self.high_m))

    @property
    def width_m(self) -> np.ndarray:
        """Width of each pixel."""
        return np.asarray(self.high_m - self.low_m)


@dataclass(frozen=True, slots=True)
class LineWindows:
    """The pixels that lines reach, and what they put there.

    `index` ndarray[window pixel]; `share` and `slope` are sparse [line, window pixel]: share of the line's
    electrons in the pixel, and its change with the velocity of the source in (m/s)^-1.
    """

    index: np.ndarray
    share: csr_array
    slope: csr_array


def make_pixels(setting: Setting) -> Pixels:
    """Return the pixels of a setting."""
    first, last = setting.band_m
    if setting.resolving_power == 0.0:
        bands = [setting.band_m] + ([setting.off_band_m] if setting.off_band_m else [])
        shares = [setting.on_band_share, 1.0 - setting.on_band_share][: len(bands)]
        low, high = np.array(bands).T
        return Pixels(low, high, np.array(shares), 0.0, 0.0)
    step = 1.0 / (setting.resolving_power * setting.pixels_per_element)
    edges = first * np.exp(step * np.arange(max(int(math.log(last / first) / step + 1e-9), 1) + 1))
    return Pixels(
        edges[:-1],
        edges[1:],
        np.ones(edges.size - 1),
        step,
        1.0 / (setting.resolving_power * FWHM_PER_SIGMA),
    )


def profile_sigma(pixels: Pixels, thermal_sigma_m_s: float, spread_m_s: np.ndarray) -> np.ndarray:
    """Return the rms width of a line in ln(wavelength), of the shape of `spread_m_s`.

    All lines of the molecule share it: each part of it is a velocity, or a fixed fraction of the wavelength.
    """
    sigma: np.ndarray = np.sqrt(
        pixels.instrument_sigma**2 + (thermal_sigma_m_s**2 + np.square(spread_m_s)) / LIGHT_M_S**2
    )
    return sigma


def _normal_part(low: np.ndarray, high: np.ndarray) -> np.ndarray:
    """Return the share of a unit Gaussian between two abscissas."""
    part: np.ndarray = 0.5 * (erf(high / math.sqrt(2.0)) - erf(low / math.sqrt(2.0)))
    return part


def _normal_density(x: np.ndarray) -> np.ndarray:
    density: np.ndarray = np.exp(-0.5 * x * x) / math.sqrt(2.0 * math.pi)
    return density


def line_windows(
    pixels: Pixels,
    wavelength_m: np.ndarray,
    velocity_m_s: float,
    sigma: float,
    every_pixel: bool = False,
) -> LineWindows:
    """Return where lines fall and how they spread, at a line-of-sight velocity (positive receding).

    Args:
        pixels: of the setting.
        wavelength_m: ndarray[line], vacuum, at rest.
        velocity_m_s: of the source against the telescope.
        sigma: rms width of the profile in ln(wavelength).
        every_pixel: return all pixels of the setting, also those that no line reaches.

    """
    centre = np.log(wavelength_m) + math.log1p(velocity_m_s / LIGHT_M_S)
    count = pixels.low_m.size
    if pixels.step == 0.0:
        columns = np.broadcast_to(np.arange(count), (centre.size, count))
    else:
        reach = math.ceil(REACH_SIGMA * sigma / pixels.step)
        middle = np.floor((centre - math.log(pixels.low_m[0])) / pixels.step).astype(int)
        columns = middle[:, None] + np.arange(-reach, reach + 1)
    rows = np.broadcast_to(np.arange(centre.size)[:, None], columns.shape)
    inside = (columns >= 0) & (columns < count)
    rows, columns = rows[inside], columns[inside]
    low = (np.log(pixels.low_m[columns]) - centre[rows]) / sigma
    high = (np.log(pixels.high_m[columns]) - centre[rows]) / sigma
    share = _normal_part(low, high)
    # the edges of a filter are known: an imager has no wavelength zero to find
    slope = np.zeros_like(share)
    if pixels.step > 0.0:
        slope = (_normal_density(low) - _normal_density(high)) / (sigma * (LIGHT_M_S + velocity_m_s))
    index, place = np.unique(columns, return_inverse=True)
    if every_pixel:
        index, place = np.arange(count), columns
    shape = (centre.size, index.size)
    return LineWindows(
        index,
        csr_array((share, (rows, place)), shape=shape),
        csr_array((slope, (rows, place)), shape=shape),
    )
