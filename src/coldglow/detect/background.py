"""Electrons from everything that is not a line: sky, telescope, zodiacal light, the planet's continuum.

This is the place where photons become electrons. Rates are tabulated per unit etendue (collecting area
times solid angle) on nodes of airmass and water, once per setting, and interpolated for each moment.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.ndimage import gaussian_filter1d

from coldglow.describe.records import Continuum, Instrument, Setting, Telescope
from coldglow.detect.pixels import Pixels
from coldglow.light.atmosphere import Atmosphere
from coldglow.light.continuum import (
    planck_photon_s_m2_m_sr,
    planet_photon_s_m2_m_sr,
    sky_photon_s_m2_m_sr,
    zodiacal_photon_s_m2_m_sr,
)

AIRMASS_STEP = 0.2  # linear between nodes is off by at most 0.003 in exp(-X tau), where that is about 0.1
WATER_NODES = 5  # when the water differs from moment to moment
_FILTER_CELLS = 400  # parts of a filter's band that are summed


@dataclass(frozen=True, slots=True)
class PixelTable:
    """Electrons per second and per m² sr of etendue, ndarray[node, pixel]; `telescope` is ndarray[pixel].

    Nodes run over airmass, and over water within each airmass. `unit_continuum` belongs to a source of
    1 photon s-1 m-2 sr-1 m-1 above the atmosphere, `continuum` to the planet's own. `efficiency` is
    electrons per photon that reaches the telescope. `peak_warm` (sky and telescope) and `peak_continuum`
    are ndarray[node], the largest over the pixels.
    """

    airmass: np.ndarray
    water_m: np.ndarray
    unit_continuum: np.ndarray
    continuum: np.ndarray
    sky: np.ndarray
    telescope: np.ndarray
    efficiency: float
    peak_warm: np.ndarray
    peak_continuum: np.ndarray

    def weights(self, airmass: np.ndarray, water_m: np.ndarray) -> np.ndarray:
        """Return ndarray[moment, node] of the (bi)linear interpolation."""
        across, down = _hat(self.airmass, airmass), _hat(self.water_m, water_m)
        product: np.ndarray = (across[:, :, None] * down[:, None, :]).reshape(len(across), -1)
        return product

    def efficiency_of(self, airmass: np.ndarray, water_m: np.ndarray, width_m: np.ndarray) -> np.ndarray:
        """Return ndarray[moment, pixel]: electrons per photon above the atmosphere."""
        level: np.ndarray = self.weights(airmass, water_m) @ self.unit_continuum / width_m
        return level


def _hat(nodes: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Return ndarray[value, node]: linear interpolation as a matrix, constant outside."""
    if nodes.size == 1:
        return np.ones((values.size, 1))
    return np.stack([np.interp(values, nodes, unit) for unit in np.eye(nodes.size)], axis=1)


def collecting_area_m2(telescope: Telescope) -> float:
    """Return the open area of the aperture."""
    return 0.25 * math.pi * telescope.aperture_m**2 * (1.0 - telescope.obstruction**2)


def _nodes(values: np.ndarray, count: int) -> np.ndarray:
    low, high = float(np.min(values)), float(np.max(values))
    return np.array([low]) if high == low else np.linspace(low, high, max(count, 2))


def _collect(cells: np.ndarray, pixels: Pixels) -> np.ndarray:
    """Return ndarray[..., pixel] of ndarray[..., cell]: blurred by the slit's image, or summed in filters."""
    if pixels.step == 0.0:
        summed: np.ndarray = cells.reshape(*cells.shape[:-1], pixels.low_m.size, -1).sum(axis=-1)
        return summed
    blurred: np.ndarray = gaussian_filter1d(cells, pixels.instrument_sigma / pixels.step, mode="nearest")
    return blurred


def pixel_table(
    instrument: Instrument,
    setting: Setting,
    pixels: Pixels,
    atmosphere: Atmosphere | None,
    continuum: Continuum,
    airmass: np.ndarray,
    water_m: np.ndarray,
    sun_distance_m: float,
) -> PixelTable:
    """Tabulate the rates of all pixels for the airmasses and water columns of ndarray[moment].

    The transmission is averaged over each pixel (or each cell of a filter) from the fine grid first and
    blurred by the instrument's profile afterwards. Against blurring before averaging, single pixels at the
    edges of deep telluric lines are off by up to 4 %, their mean by 4e-5 (tests/detect/test_exposure.py).
    Without an atmosphere the telescope is in space, and the sky is zodiacal light.
    """
    telescope = instrument.telescope
    efficiency = telescope.transmission * setting.throughput
    if pixels.step == 0.0:
        edges = [
            np.geomspace(a, b, _FILTER_CELLS + 1) for a, b in zip(pixels.low_m, pixels.high_m, strict=True)
        ]
    else:
        edges = [np.append(pixels.low_m, pixels.high_m[-1])]
    centre_m = np.concatenate([0.5 * (e[1:] + e[:-1]) for e in edges])
    width_m = np.concatenate([np.diff(e) for e in edges])
    if atmosphere is None:
        airmass_nodes, water_nodes = np.ones(1), np.zeros(1)
        clear = np.ones((1, centre_m.size))
        sky = zodiacal_photon_s_m2_m_sr(centre_m, instrument.sky.zodiacal_scale)[None, :]
    else:
        airmass_nodes = _nodes(airmass, math.ceil(np.ptp(airmass) / AIRMASS_STEP) + 1)
        water_nodes = _nodes(water_m, WATER_NODES)
        means = [
            np.concatenate([atmosphere.pixel_means(e, airmass_nodes, float(w)) for e in edges], axis=1)
            for w in water_nodes
        ]
        clear = np.stack(means, axis=1).reshape(-1, centre_m.size)
        air = instrument.sky
        sky = sky_photon_s_m2_m_sr(centre_m, clear, air.temperature_k, air.airglow_photon_s_m2_sr_m)
    planet = planet_photon_s_m2_m_sr(continuum, centre_m, sun_distance_m)
    warm = planck_photon_s_m2_m_sr(centre_m, telescope.temperature_k)
    planet_e = efficiency * _collect(clear * planet * width_m, pixels)
    sky_e = efficiency * _collect(sky * width_m, pixels)
    telescope_e = setting.throughput * telescope.emissivity * _collect(warm * width_m, pixels)
    return PixelTable(
        airmass_nodes,
        water_nodes,
        efficiency * _collect(clear * width_m, pixels),
        planet_e,
        sky_e,
        telescope_e,
        efficiency,
        (sky_e + telescope_e).max(axis=1),
        planet_e.max(axis=1),
    )
