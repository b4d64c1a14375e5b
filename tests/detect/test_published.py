"""Published outcomes and forecasts of the same work; no number is tuned, each is given or a round one."""

import math

import numpy as np
import pytest
from scipy.constants import c

from coldglow.describe.column import mean_path_factor
from coldglow.describe.records import Figure
from coldglow.detect.bench import Glow
from coldglow.detect.detail import expose_one
from coldglow.detect.exposure import expose_moments
from coldglow.detect.systematics import systematic_errors
from coldglow.light.atmosphere import load_atmosphere
from coldglow.light.emission import line_radiance_w_m2_sr
from coldglow.light.lines import load_lines
from coldglow.plan.goal import marginalise, snr, temperature_error

ARCSEC = math.pi / 648000.0
LINES = load_lines()
# radii: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, table 4; height of the shell: invented
NEPTUNE = Figure(24764e3, 24341e3, 1500e3, "Archinal et al. 2018")


def test_limit_on_neptune_in_2017(make):
    """arXiv 1711.08978, abstract: 15.4 h at 3.93-4.00 um (Aug 2017) leave 1.0e13 (+1.2e13 -0.8e13) m-2 at
    550 K, along the line of sight. The instrument is a generic one of that class: 3.0 m, R 70 000 for a
    slit of 0.75 arcsec, 0.06 after the telescope, emissivity 0.1 at 273 K, 2 mm of water at 4.2 km, nods on
    the slit; detector, seeing and slit length are the round numbers of these tests.
    """
    made = make.instrument(
        telescope={"aperture_m": 3.0, "obstruction": 0.0},
        settings={"band_m": (3.93e-6, 4.00e-6), "resolving_power": 70000.0, "throughput": 0.06},
    )
    # August 2017, by hand: 24764 km at 29.0 au are 1.18 arcsec; opposition is in early September, so the
    # planet approaches with up to 20 km/s
    moments = make.moments_of(
        made,
        airmass=np.full(5, 1.3),
        range_rate_m_s=np.linspace(-20e3, 0.0, 5),
        radius_rad=1.18 * ARCSEC,
        latitude_rad=-0.45,
        figure=NEPTUNE,
    )
    column = 1e12  # far below the limit: the noise is that of the empty sky
    exposure = expose_moments(
        moments, Glow(LINES, 550.0, column, make.grey), load_atmosphere(4200.0), made, made.settings[0]
    )
    visit = marginalise(exposure.matrix.mean(axis=0) * 15.4 * 3600.0)
    vertical = column / float(snr(visit[0, 0]))
    assert 1.0e13 / 3 < vertical * mean_path_factor(NEPTUNE) < 1.0e13 * 3


@pytest.mark.parametrize(("year", "flux_jy"), [(2000.7, 0.031), (2001.7, 0.053)])
def test_uranus_flux_density_asks_for_a_likely_column(year, flux_jy):
    """Planet. Space Sci. 51, 1013 (2003), abstract: 0.031 Jy (Sept 2000) and 0.053 Jy (Sept 2001) at 3.986 um
    in 0.8 x 3.7 arcsec at a resolving power of about 1000. Temperature of the trend in ApJ 729, 134 (2011),
    abstract: 715 K in 1992, falling 8 K a year. The column is the mean along the line of sight over that
    aperture; known columns: a few 1e14 to a few 1e15 m-2 (scale, from memory).

    (The mean over the whole visible disk, its bright rim included, is twice as large, as seeing carries
    light out of the aperture and the corners of the aperture are dark.)
    """
    temperature_k = 715.0 - 8.0 * (year - 1992.0)
    radiance = line_radiance_w_m2_sr(LINES, temperature_k, 1.0)
    frequency = c / LINES.wavelength_m
    sigma_hz = c / 3.986e-6 / 1000.0 / math.sqrt(8 * math.log(2))
    profile = np.exp(-0.5 * ((frequency - c / 3.986e-6) / sigma_hz) ** 2)
    profile /= math.sqrt(2 * math.pi) * sigma_hz
    per_column_jy = float(radiance @ profile) * 0.8 * 3.7 * ARCSEC**2 / 1e-26
    assert 5e14 < flux_jy / per_column_jy < 5e15


def test_a_space_ifu_measures_the_temperature_of_uranus(make):
    """Common practice: a space IFU of this class (6 m, R 3000, field 3.2 arcsec) gives the mean temperature
    of Uranus to 0.9 K. For 430 K, 1e15 m-2 vertical and 1000 s on source the random error lies below 1 K,
    random and systematic error together between 0.3 and 3 K.
    """
    made = make.instrument(
        "space",
        telescope={"aperture_m": 6.0, "temperature_k": 45.0, "emissivity": 0.2, "transmission": 0.8},
        opening={
            "kind": "ifu",
            "width_rad": 3.2 * ARCSEC,
            "length_rad": 3.2 * ARCSEC,
            "pixel_rad": 0.1 * ARCSEC,
        },
        image={"kind": "diffraction", "core_share": 1.0},
        settings={"band_m": (2.9e-6, 5.1e-6), "resolving_power": 3000.0, "throughput": 0.3},
        detector={"dark_e_s": 0.01, "read_noise_pair_e": 15.0, "reads": 10, "sampling": "ramp"},
        operation={"nod": "off-slit", "on_fraction": 0.5, "nod_time_s": 500.0},
    )
    moments = make.moments_of(made, latitude_rad=0.9)
    detail = expose_one(moments, Glow(LINES, 430.0, 1e15, make.grey), None, made, made.settings[0])
    random_k = float(temperature_error(marginalise(detail.matrix * 1000.0 / 0.5)))
    systematic = systematic_errors(
        detail.lines.wavelength_m,
        detail.line_information * detail.wanted,
        detail.temperature_slope,
        np.zeros(len(detail.lines)),
        made.operation,
        open_shutter_s=2000.0,
    )
    assert random_k < 1.0
    assert 0.3 < math.hypot(random_k, systematic.temperature_total_k) < 3.0
