"""Planck's law, sunlight, zodiacal light, and the brightness of the sky they make."""

from __future__ import annotations

import math

import numpy as np
import pvlib
import pytest
from astropy import constants
from astropy import units as u
from astropy.modeling.physical_models import BlackBody
from hypothesis import given, settings
from hypothesis import strategies as st

from coldglow.describe.records import Continuum
from coldglow.light import continuum
from coldglow.light.atmosphere import load_atmosphere

ARCSEC2 = (math.pi / 180.0 / 3600.0) ** 2
AU_M = 1.495978707e11
# Vega, W m-2 um-1: Tokunaga & Vacca 2005, PASP 117, 421 (with erratum). Edges of the filters, um:
# half-power points of Tokunaga, Simons & Vacca 2002, PASP 114, 180 (from memory).
BANDS = {"K": (2.03, 2.37, 4.00e-10), "L'": (3.42, 4.12, 5.31e-11), "M'": (4.57, 4.79, 2.22e-11)}


def test_planck_against_values_computed_elsewhere(light_rows):
    table = light_rows("planck.csv")
    assert len(table) == 12
    for row in table:
        ours = continuum.planck_photon_s_m2_m_sr(
            1e-6 * float(row["wavelength_um"]), float(row["temperature_k"])
        )
        assert ours * 1e-6 * ARCSEC2 == pytest.approx(float(row["photon_s_m2_um_arcsec2"]), rel=1e-3)


def test_planck_against_astropy():
    wavelength = np.linspace(1.9e-6, 5.5e-6, 50)
    for temperature_k in (40.0, 258.0, 5800.0):
        body = BlackBody(temperature_k * u.K, scale=1.0 * u.W / (u.m**2 * u.m * u.sr))
        theirs = body(wavelength * u.m).to_value(u.W / (u.m**2 * u.m * u.sr))
        ours = continuum.planck_w_m2_m_sr(wavelength, temperature_k)
        assert ours == pytest.approx(theirs, rel=1e-9)


@pytest.mark.parametrize("wavelength_um", [2.0, 2.1, 2.2, 2.4, 2.6, 3.0, 3.3, 3.5, 3.8, 4.0])
def test_sunlight_against_the_standard_spectrum(wavelength_um):
    # ASTM G173-03, extraterrestrial column (to 4.0 um), as carried by pvlib; the brightness temperatures
    # were rounded from it, so this measures the rounding and the interpolation: 3 %, lines of the Sun
    # included
    table = pvlib.spectrum.get_reference_spectra(standard="ASTM G173-03")["extraterrestrial"]
    near = table[(table.index > 1e3 * wavelength_um - 25) & (table.index < 1e3 * wavelength_um + 25)]
    ours = continuum.solar_irradiance_w_m2_m(1e-6 * wavelength_um) * 1e-9
    assert ours == pytest.approx(near.mean(), rel=0.03)


@pytest.mark.parametrize(
    ("wavelength_um", "absolute_magnitude", "vega_w_m2_um"),
    [(2.149, 3.27, 4.35e-10), (3.353, 3.26, 8.18e-11), (4.603, 3.27, 2.415e-11)],
)
def test_sunlight_against_the_magnitudes_of_the_sun(wavelength_um, absolute_magnitude, vega_w_m2_um):
    # Independent of the spectrum above: absolute magnitudes of the Sun in Ks and at 3.35 and 4.60 um,
    # Willmer 2018, ApJS 236, 47 (from memory); zero points Tokunaga & Vacca 2005, PASP 117, 421 and Jarrett
    # et al. 2011, ApJ 735, 112 (from memory).
    apparent = absolute_magnitude - 31.572
    observed = vega_w_m2_um * 10.0 ** (-0.4 * apparent)
    ours = float(continuum.solar_irradiance_w_m2_m(1e-6 * wavelength_um)) * 1e-6
    assert ours == pytest.approx(observed, rel=0.05)


def test_sunlight_falls_with_the_square_of_the_distance():
    near, far = continuum.solar_irradiance_w_m2_m(3e-6, [AU_M, 19.2 * AU_M])
    assert near / far == pytest.approx(19.2**2, rel=1e-12)


def test_reflected_radiance_of_a_white_lambert_disk():
    # a disk of geometric albedo 1 turned to the Sun shines like a perfect diffuser: radiance * pi =
    # irradiance (definition)
    white = Continuum((1.9e-6, 5.5e-6), (1.0, 1.0), (), (), "")
    wavelength = np.array([2.2e-6, 3.9e-6])
    radiance = continuum.reflected_radiance_w_m2_m_sr(white, wavelength, 5.2 * AU_M)
    assert radiance * math.pi == pytest.approx(
        continuum.solar_irradiance_w_m2_m(wavelength, 5.2 * AU_M), rel=1e-14
    )
    photons = continuum.planet_photon_s_m2_m_sr(white, wavelength, 5.2 * AU_M)
    energy = constants.h.si.value * constants.c.si.value / wavelength
    assert photons * energy == pytest.approx(radiance, rel=1e-9)


def test_albedo_and_own_radiance_are_interpolated():
    planet = Continuum((2e-6, 3e-6), (0.1, 0.3), (4e-6, 5e-6), (10.0, 30.0), "")
    assert continuum.albedo(planet, [1.9e-6, 2.5e-6, 5e-6]) == pytest.approx([0.1, 0.2, 0.3])
    assert continuum.thermal_radiance_w_m2_m_sr(planet, [4.5e-6]) == pytest.approx([20.0])
    dark = Continuum((2e-6, 3e-6), (0.0, 0.0), (), (), "")
    assert continuum.thermal_radiance_w_m2_m_sr(dark, [4.5e-6, 5e-6]) == pytest.approx([0.0, 0.0])


@pytest.mark.parametrize(
    ("wavelength_um", "mjy_sr"), [(2.2, 0.0686), (3.5, 0.0447), (3.95, 0.0672), (4.5, 0.1582), (4.9, 0.2949)]
)
def test_zodiacal_light(wavelength_um, mjy_sr):
    # 4.2e-14 B(5500 K) + 4.3e-8 B(270 K) computed elsewhere; the level itself from memory of Glasse et al.
    # 2015, PASP 127, 686
    photons = float(continuum.zodiacal_photon_s_m2_m_sr(1e-6 * wavelength_um))
    # photons per metre of wavelength -> W m-2 Hz-1 sr-1: times h lambda
    assert photons * 6.62607015e-34 * 1e-6 * wavelength_um * 1e20 == pytest.approx(mjy_sr, rel=1e-3)
    assert continuum.zodiacal_photon_s_m2_m_sr(1e-6 * wavelength_um, 3.0) == pytest.approx(3.0 * photons)


def _magnitude(band, height_m, water_m, sky_k, emissivity=0.0, telescope_k=273.0, airglow=0.0):
    """Return the surface brightness, mag arcsec-2 (Vega), of sky and telescope, mean over the band."""
    low, high, vega = BANDS[band]
    air = load_atmosphere(height_m)
    grid = air.wavelength_m
    grid = grid[(grid >= 1e-6 * low) & (grid <= 1e-6 * high)]
    transmission = air.transmission(grid, 1.0, water_m)
    photons = continuum.sky_photon_s_m2_m_sr(grid, transmission, sky_k, airglow)
    photons = photons + emissivity * continuum.planck_photon_s_m2_m_sr(grid, telescope_k)
    watts = (photons * 6.62607015e-34 * 299792458.0 / grid).mean() * ARCSEC2 * 1e-6
    return -2.5 * math.log10(watts / vega)


@pytest.mark.parametrize(
    ("band", "sky_only", "with_telescope", "lower_site"),
    [("K", 17.8, 15.3, 14.2), ("L'", 6.9, 5.25, 4.5), ("M'", 3.0, 2.2, 1.5)],
)
def test_thermal_sky_against_the_makers_of_the_table(band, sky_only, with_telescope, lower_site):
    # their own computation from the same table, thermal terms only, +-0.2 mag (filters' edges not stated)
    assert _magnitude(band, 4200.0, 0.001, 258.0) == pytest.approx(sky_only, abs=0.2)
    assert _magnitude(band, 4200.0, 0.001, 258.0, 0.1, 273.0) == pytest.approx(with_telescope, abs=0.2)
    assert _magnitude(band, 2600.0, 0.0025, 270.0, 0.1, 285.0) == pytest.approx(lower_site, abs=0.2)


@pytest.mark.parametrize(("band", "bright", "dark"), [("K", 12.8, 13.8), ("L'", 3.0, 5.0), ("M'", 0.0, 2.0)])
def test_sky_is_as_bright_as_observers_find_it(band, bright, dark):
    # Sky plus telescope at dry sites, clear and dark: common practice, from memory. Warm site of 2.6 km, 10
    # % emissivity; OH in K: some twenty strong lines between 1.95 and 2.3 um of up to 100 photon s-1 m-2
    # arcsec-2 (from memory), at their strongest. Without airglow, at its faintest, K is 14.2.
    airglow = 20.0 * 100.0 / 0.35 / ARCSEC2 * 1e6
    assert bright < _magnitude(band, 2600.0, 0.0025, 270.0, 0.1, 285.0, airglow) < dark


def test_airglow_ends_at_2_3_um():
    # OH bands end there: Ashley et al. 1996, PASP 108, 721
    sky = continuum.sky_photon_s_m2_m_sr(np.array([1.94e-6, 2.1e-6, 2.31e-6]), np.ones(3), 260.0, 5.0)
    assert list(sky) == [0.0, 5.0, 0.0]


@settings(deadline=None)  # a busy machine is no failure
@given(st.floats(1.9e-6, 5.5e-6), st.floats(150.0, 400.0), st.floats(0.1, 50.0), st.floats(0.0, 1.0))
def test_a_warmer_or_more_opaque_sky_is_brighter(wavelength, temperature_k, warmer_k, transmission):
    cold = continuum.sky_photon_s_m2_m_sr(wavelength, transmission, temperature_k)
    assert continuum.sky_photon_s_m2_m_sr(wavelength, transmission, temperature_k + warmer_k) >= cold
    assert continuum.sky_photon_s_m2_m_sr(wavelength, 0.0, temperature_k) >= cold
