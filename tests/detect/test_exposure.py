"""Information per second against a slow simulation written the other way round.

The simulation knows no lines' windows, no averages over lines and no derivatives in closed form: it builds
the spectrum wavelength by wavelength, sends it through the air, blurs it with the slit's image, sums it in
pixels, adds noise by the nod pattern and differentiates by finite differences.
"""

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.constants import c, h, k
from scipy.signal import fftconvolve

from coldglow.detect import bench
from coldglow.detect.bench import Glow
from coldglow.detect.detail import expose_one
from coldglow.detect.exposure import expose_moments
from coldglow.detect.information import CONTINUUM_UNIT
from coldglow.errors import RangeError
from coldglow.light.atmosphere import load_atmosphere
from coldglow.light.continuum import solar_irradiance_w_m2_m
from coldglow.light.emission import partition_function
from coldglow.light.lines import load_lines
from coldglow.plan.goal import marginalise

LINES = load_lines()
AIR = load_atmosphere(4200.0)
AMU = 1.66053906660e-27
ETENDUE_FACTOR = math.pi / 4 * 4.0**2 * (1 - 0.2**2)


def simulate(made, moments, temperature, column, albedo, air):
    """Return (derivatives ndarray[4, pixel], variance ndarray[pixel]) of one on-slit moment."""
    setting, detector, beam = made.settings[0], made.detector, moments.beam
    omega, pixels = float(beam.solid_angle_sr[0]), float(beam.pixels_spatial[0])
    step = 1 / (setting.resolving_power * setting.pixels_per_element)
    count = int(math.log(setting.band_m[1] / setting.band_m[0]) / step + 1e-9)
    fine = max(24, int(step * c / 200.0))  # samples in a pixel, 200 m/s or less
    margin = 12 * fine
    grid = setting.band_m[0] * np.exp(step / fine * (np.arange(-margin, count * fine + margin) + 0.5))
    width = grid * step / fine
    clear = np.ones(grid.size) if air is None else air.transmission(grid, float(moments.airmass[0]), 0.002)
    lines = LINES.within(grid[0], grid[-1])
    velocity = float(moments.range_rate_m_s[0] + beam.velocity_m_s[0])
    slit = 1 / (setting.resolving_power * math.sqrt(8 * math.log(2))) / (step / fine)
    kernel = np.exp(-0.5 * (np.arange(-10 * fine, 10 * fine + 1) / slit) ** 2)
    kernel /= kernel.sum()

    def on_pixels(radiance):
        blurred = fftconvolve(radiance * width, kernel, mode="same")
        return blurred[margin:-margin].reshape(count, fine).sum(axis=1)

    def planck(temperature_k):
        return 2 * c / grid**4 / np.expm1(h * c / (grid * k * temperature_k))

    def spectrum(log_scale=0.0, warmer=0.0, level=0.0, shift=0.0):
        t = temperature + warmer
        # the width of a line tells nothing about T here, as in the program
        sigma = (
            math.hypot(math.sqrt(k * temperature / (3.0235 * AMU)), float(beam.velocity_spread_m_s[0])) / c
        )
        photons = lines.einstein_a_s * lines.weight * np.exp(-h * c * lines.upper_energy_m1 / (k * t))
        photons *= column * math.exp(log_scale) * float(beam.path_factor[0]) / (4 * math.pi)
        photons /= float(partition_function(t))
        radiance = np.zeros(grid.size)
        for place, light in zip(lines.wavelength_m * (1 + velocity / c), photons, strict=True):
            x = (grid / place - 1) / sigma
            near = np.abs(x) < 8
            radiance[near] += light * np.exp(-0.5 * x[near] ** 2) / (math.sqrt(2 * math.pi) * sigma * place)
        sunlight = solar_irradiance_w_m2_m(grid, 19.2 * 149597870700.0) * grid / (h * c)
        planet = sunlight * albedo / math.pi * float(beam.disk_fill[0])
        # an error of the wavelength zero moves what has come through the air
        arrived = np.interp(grid * (1 - shift / c), grid, clear * radiance)
        return photon_rate * 0.9 * on_pixels(arrived + clear * (planet + level * CONTINUUM_UNIT))

    photon_rate = ETENDUE_FACTOR * omega * setting.throughput
    sky = photon_rate * 0.9 * on_pixels((1 - clear) * planck(258.0))
    warm = photon_rate * 0.1 * on_pixels(planck(273.0))
    still = pixels * (detector.dark_e_s + detector.read_noise_pair_e**2 / 120.0)
    derivatives = np.array(
        [
            (spectrum(log_scale=1e-3) - spectrum(log_scale=-1e-3)) / 2e-3,
            (spectrum(warmer=0.5) - spectrum(warmer=-0.5)),
            (spectrum(level=1.0) - spectrum()),
            (spectrum(shift=200.0) - spectrum(shift=-200.0)) / 400.0,
        ]
    )
    return derivatives, spectrum() + 2 * (sky + warm + still)


CASES = {
    # resolving power, band, column, range rate, airmass
    "echelle": (60000.0, (3.94e-6, 4.00e-6), 5e14, 17e3, 1.3),
    "telluric": (40000.0, (3.41e-6, 3.46e-6), 5e15, -12e3, 1.7),
    "low": (2500.0, (3.6e-6, 4.0e-6), 3e15, 3e3, 1.1),
}


@pytest.mark.parametrize("case", CASES)
def test_information_as_simulated(make, case):
    power, band, column, rate, airmass = CASES[case]
    made = make.instrument(
        settings={"resolving_power": power, "band_m": band, "throughput": 0.05},
        opening={"angle": "equator"},
        detector={"full_well_e": 1e9},
    )
    moments = make.moments_of(made, airmass=(airmass,), range_rate_m_s=(rate,), latitude_rad=0.2)
    derivatives, variance = simulate(made, moments, 600.0, column, 1e-4, AIR)
    expected = (derivatives / variance) @ derivatives.T
    arguments = (Glow(LINES, 600.0, column, make.grey), AIR, made, made.settings[0])
    exact = expose_one(moments, *arguments)
    assert exact.plan.integration_s[0] == 120.0
    fast = expose_moments(moments, *arguments)
    # the mean transmission of a line stands for its structure, pixel means for the sky's: below 0.5 %
    sky = exact.variance / variance - 1
    assert np.abs(sky).max() < 0.045
    assert abs(sky.mean()) < 2e-3
    for found in (exact.matrix, fast.matrix[0]):
        for i in range(4):
            assert found[i, i] == pytest.approx(expected[i, i], rel=0.005)
        kept, wanted = marginalise(found), marginalise(expected)
        assert kept == pytest.approx(wanted, rel=0.005)


def test_the_fast_path_is_the_slow_one(make, monkeypatch):
    """Groups of velocity, windows, dropped lines and airmass nodes together cost less than 0.6 %."""
    made = make.instrument(
        settings={"band_m": (3.4e-6, 4.0e-6)}, opening={"angle": "equator"}, detector={"full_well_e": 1e9}
    )
    rng = np.random.default_rng(7)
    moments = make.moments_of(
        made, airmass=rng.uniform(1.0, 2.0, 25), range_rate_m_s=rng.uniform(-30e3, 30e3, 25), latitude_rad=0.2
    )
    arguments = (Glow(LINES, 550.0, 1e15, make.grey), AIR, made, made.settings[0])
    fast = marginalise(expose_moments(moments, *arguments).matrix)
    monkeypatch.setattr(bench, "LINES_KEPT", 1.0)
    slow = np.array(
        [
            marginalise(expose_one(moments.take(np.array([i])), *arguments).matrix)
            for i in range(moments.airmass.size)
        ]
    )
    ratio = fast / slow
    assert np.abs(ratio - 1).max() < 6e-3
    assert abs(ratio[:, 0, 0].mean() - 1) < 1.5e-3


def test_dropped_lines_carry_a_thousandth_of_the_information(make, monkeypatch):
    for power, band in ((60000.0, (3.4e-6, 4.0e-6)), (2500.0, (2.0e-6, 4.0e-6))):
        made = make.instrument(
            settings={"resolving_power": power, "band_m": band}, detector={"full_well_e": 1e12}
        )
        moments = make.moments_of(made, airmass=(1.0,), range_rate_m_s=(8e3,))
        arguments = (Glow(LINES, 500.0, 1e14, make.grey), AIR, made, made.settings[0])
        part = expose_one(moments, *arguments)
        with monkeypatch.context() as patch:
            patch.setattr(bench, "LINES_KEPT", 1.0)
            whole = expose_one(moments, *arguments)
        assert len(part.lines) < 0.25 * len(whole.lines)
        lost = 1 - marginalise(part.matrix)[(0, 1), (0, 1)] / marginalise(whole.matrix)[(0, 1), (0, 1)]
        assert lost.max() < 2e-3


def test_an_array_of_moments_is_each_of_them(make):
    made = make.instrument("ifu", detector={"full_well_e": 1e9})
    moments = make.moments_of(made, airmass=(1.3, 1.3), range_rate_m_s=(4e3, -9e3))
    arguments = (Glow(LINES, 500.0, 1e15, make.grey), AIR, made, made.settings[0])
    both = expose_moments(moments, *arguments)
    for i in range(2):
        one = expose_moments(moments.take(slice(i, i + 1)), *arguments)
        assert both.matrix[i] == pytest.approx(one.matrix[0], rel=2e-3, abs=1e-9)
        assert both.variance_share[i] == pytest.approx(one.variance_share[0], rel=1e-3)


def test_moments_of_different_airmass_are_each_of_them(make):
    made = make.instrument(detector={"full_well_e": 1e9})
    moments = make.moments_of(made, airmass=(1.05, 1.45, 1.9), range_rate_m_s=(4e3,) * 3)
    arguments = (Glow(LINES, 500.0, 1e15, make.grey), AIR, made, made.settings[0])
    together = expose_moments(moments, *arguments)
    for i in range(3):
        one = expose_moments(moments.take(slice(i, i + 1)), *arguments)
        assert together.matrix[i, 0, 0] == pytest.approx(one.matrix[0, 0, 0], rel=5e-3)
        assert together.variance_share[i] == pytest.approx(one.variance_share[0], rel=1e-2, abs=1e-6)
    assert together.line_transmission[2] < together.line_transmission[0]


def test_the_planets_rotation_adds_to_its_range_rate(make):
    made = make.instrument(detector={"full_well_e": 1e9})
    still = make.moments_of(made, range_rate_m_s=(21e3,))
    beam = replace(still.beam, velocity_m_s=np.array([15e3]))
    turning = replace(make.moments_of(made, range_rate_m_s=(6e3,)), beam=beam)
    arguments = (Glow(LINES, 500.0, 1e15, make.grey), AIR, made, made.settings[0])
    one, other = expose_moments(still, *arguments), expose_moments(turning, *arguments)
    np.testing.assert_allclose(other.matrix, one.matrix, rtol=1e-12)
    away = replace(turning, range_rate_m_s=np.array([-6e3]))
    assert not np.allclose(expose_moments(away, *arguments).matrix, one.matrix, rtol=1e-4)


def test_an_opening_that_sees_nothing_and_a_dark_band_are_refused(make):
    made = make.instrument(detector={"full_well_e": 1e9})
    moments = make.moments_of(made)
    nothing = replace(moments, beam=replace(moments.beam, light_share=np.array([1e-9])))
    glow = Glow(LINES, 500.0, 1e15, make.grey)
    with pytest.raises(RangeError, match="sees nothing of the planet") as beside:
        expose_moments(nothing, glow, AIR, made, made.settings[0])
    assert beside.value.key == "opening.offset"
    dark = make.instrument(settings={"band_m": (2.700e-6, 2.701e-6)}, detector={"full_well_e": 1e9})
    with pytest.raises(RangeError, match="None of the light of these lines arrives") as opaque:
        expose_moments(make.moments_of(dark), glow, AIR, dark, dark.settings[0])
    assert opaque.value.key == "settings.band"


def test_a_line_under_a_telluric_one_loses(make):
    """The same line, moved over the telluric structure by the Earth's motion."""
    made = make.instrument(settings={"band_m": (3.40e-6, 3.48e-6)}, detector={"full_well_e": 1e9})
    moments = make.moments_of(made, airmass=np.full(61, 1.5), range_rate_m_s=np.linspace(-30e3, 30e3, 61))
    found = expose_moments(
        moments, Glow(LINES, 600.0, 1e15, make.grey), AIR, made, made.settings[0], ("R(3,3)u",)
    )
    snr = np.sqrt(marginalise(found.matrix)[:, 0, 0])
    order = np.argsort(found.line_transmission)
    assert found.line_transmission[order[-1]] > 1.3 * found.line_transmission[order[0]]
    assert np.corrcoef(snr, found.line_transmission)[0, 1] > 0.95


def test_other_lines_are_light_without_information(make):
    made = make.instrument("ifu", detector={"full_well_e": 1e9})
    moments = make.moments_of(made)
    arguments = (Glow(LINES, 600.0, 1e17, make.grey), AIR, made, made.settings[0])
    every, one = expose_moments(moments, *arguments), expose_moments(moments, *arguments, ("Q(1,0)",))
    assert one.signal_e_s[0] < every.signal_e_s[0]
    assert one.matrix[0, 0, 0] < every.matrix[0, 0, 0]
    detail = expose_one(moments, *arguments, ("Q(1,0)",))
    assert detail.wanted.sum() == 1
    # the light of all lines is on the detector all the same
    assert detail.line_e_s == pytest.approx(expose_one(moments, *arguments).line_e_s, rel=0.02, abs=0.5)
