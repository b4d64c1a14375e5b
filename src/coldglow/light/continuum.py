"""Light without lines: Planck's law, sunlight and its reflection, zodiacal light, airglow and the warm sky.

Spectral radiances are per metre of wavelength; the photon versions count photons instead of joules.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import au, c, h, k

from coldglow.describe.records import Continuum

Floats = NDArray[np.float64]

SUN_RADIUS_M = 6.957e8  # nominal, IAU 2015 resolution B3 (Prsa et al. 2016, Astron. J. 152, 41)
# Brightness temperature of the whole disk, rounded from the spectrum outside the atmosphere of ASTM G173-03
# up to 4 um and continued flat: the continuum within 5 %, lines of the Sun left out.
SUN_WAVELENGTH_M = np.array([1.9, 2.2, 2.5, 2.7, 3.0, 3.4, 4.0, 5.5]) * 1e-6
SUN_TEMPERATURE_K = np.array([6300.0, 6150.0, 6000.0, 5800.0, 5700.0, 5630.0, 5560.0, 5550.0])

# Two grey bodies, low-background level (from memory of Glasse et al. 2015, PASP 127, 686);
# good to a factor 2
ZODIACAL = ((4.2e-14, 5500.0), (4.3e-8, 270.0))

AIRGLOW_BAND_M = (1.95e-6, 2.30e-6)  # OH bands end here (Ashley et al. 1996, PASP 108, 721)


def planck_w_m2_m_sr(wavelength_m: ArrayLike, temperature_k: ArrayLike) -> Floats:
    """Return the spectral radiance of a black body, W m-2 m-1 sr-1 (arguments broadcast)."""
    wavelength = np.asarray(wavelength_m, dtype=np.float64)
    x = h * c / (wavelength * k * np.asarray(temperature_k, dtype=np.float64))
    radiance: Floats = 2.0 * h * c**2 / wavelength**5 / np.expm1(x)
    return radiance


def planck_photon_s_m2_m_sr(wavelength_m: ArrayLike, temperature_k: ArrayLike) -> Floats:
    """Return the spectral photon radiance of a black body, s-1 m-2 m-1 sr-1 (arguments broadcast)."""
    return to_photons(wavelength_m, planck_w_m2_m_sr(wavelength_m, temperature_k))


def to_photons(wavelength_m: ArrayLike, radiance_w: ArrayLike) -> Floats:
    """Return any radiance in watts as photons per second: divided by h c / lambda."""
    photons: Floats = np.asarray(radiance_w, dtype=np.float64) * np.asarray(wavelength_m) / (h * c)
    return photons


def solar_irradiance_w_m2_m(wavelength_m: ArrayLike, sun_distance_m: ArrayLike = au) -> Floats:
    """Return the sunlight falling on a surface turned to the Sun, W m-2 m-1 (arguments broadcast).

    Planck's law at the Sun's brightness temperature, within 5 % at 1.9-5.5 um; the Sun's own lines (carbon
    monoxide near 2.3-2.5 and 4.4-5 um above all) are left out.
    """
    temperature = np.interp(np.asarray(wavelength_m), SUN_WAVELENGTH_M, SUN_TEMPERATURE_K)
    solid_angle = np.pi * (SUN_RADIUS_M / np.asarray(sun_distance_m, dtype=np.float64)) ** 2
    irradiance: Floats = planck_w_m2_m_sr(wavelength_m, temperature) * solid_angle
    return irradiance


def albedo(continuum: Continuum, wavelength_m: ArrayLike) -> Floats:
    """Return the geometric albedo, linear between the table's wavelengths and constant outside them."""
    value: Floats = np.interp(np.asarray(wavelength_m), continuum.albedo_wavelength_m, continuum.albedo)
    return value


def reflected_radiance_w_m2_m_sr(
    continuum: Continuum, wavelength_m: ArrayLike, sun_distance_m: ArrayLike
) -> Floats:
    """Return the mean radiance of the sunlit disk near full phase: irradiance * albedo / pi.

    No phase function: Jupiter stays within 12 deg of full phase, the planets beyond within 6.5 deg.
    """
    irradiance = solar_irradiance_w_m2_m(wavelength_m, sun_distance_m)
    radiance: Floats = irradiance * albedo(continuum, wavelength_m) / np.pi
    return radiance


def thermal_radiance_w_m2_m_sr(continuum: Continuum, wavelength_m: ArrayLike) -> Floats:
    """Return the planet's own thermal radiance as described (linear in the table), 0 where there is none."""
    if not continuum.thermal_wavelength_m:
        return np.zeros(np.shape(wavelength_m))
    radiance: Floats = np.interp(
        np.asarray(wavelength_m), continuum.thermal_wavelength_m, continuum.thermal_radiance_w_m2_m_sr
    )
    return radiance


def planet_photon_s_m2_m_sr(
    continuum: Continuum, wavelength_m: ArrayLike, sun_distance_m: ArrayLike
) -> Floats:
    """Return all light of the disk that is no line, in photons, s-1 m-2 m-1 sr-1 (arguments broadcast)."""
    reflected = reflected_radiance_w_m2_m_sr(continuum, wavelength_m, sun_distance_m)
    return to_photons(wavelength_m, reflected + thermal_radiance_w_m2_m_sr(continuum, wavelength_m))


def zodiacal_photon_s_m2_m_sr(wavelength_m: ArrayLike, scale: float = 1.0) -> Floats:
    """Return zodiacal light seen from space, s-1 m-2 m-1 sr-1; `scale` 1 (low level) to 5 (ecliptic)."""
    return scale * sum(
        (share * planck_photon_s_m2_m_sr(wavelength_m, temperature) for share, temperature in ZODIACAL),
        start=np.zeros(np.shape(wavelength_m)),
    )


def sky_photon_s_m2_m_sr(
    wavelength_m: ArrayLike,
    transmission: ArrayLike,
    sky_temperature_k: float,
    airglow_photon_s_m2_sr_m: float = 0.0,
) -> Floats:
    """Return the radiance of the sky above the telescope, s-1 m-2 m-1 sr-1: (1 - T) B(T_sky) + airglow.

    `transmission` [..., wavelength] as seen by a pixel (the mean over it). The airglow is the mean of the OH
    bands, spread evenly over 1.95-2.30 um: single OH lines are up to a hundred times brighter and are not
    placed. Within saturated lines the air nearer the ground (some 10 K warmer) radiates: there the sky is too
    faint here by about half, where no planetary light arrives anyway.
    """
    wavelength = np.asarray(wavelength_m, dtype=np.float64)
    thermal = (1.0 - np.asarray(transmission)) * planck_photon_s_m2_m_sr(wavelength, sky_temperature_k)
    first, last = AIRGLOW_BAND_M
    return thermal + np.where((wavelength >= first) & (wavelength <= last), airglow_photon_s_m2_sr_m, 0.0)
