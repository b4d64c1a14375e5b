"""The errors that the matrix promises against the scatter of estimates from simulated counts."""

import math

import numpy as np
import pytest
from scipy.constants import c, h, k
from scipy.stats import norm

from coldglow.detect.bench import Glow
from coldglow.detect.detail import expose_one, temperature_shares
from coldglow.detect.exposure import expose_moments
from coldglow.detect.information import CONTINUUM_UNIT
from coldglow.light.atmosphere import load_atmosphere
from coldglow.light.emission import partition_function
from coldglow.light.lines import load_lines
from coldglow.plan.goal import column_error, correlation, marginalise, temperature_error

LINES = load_lines()
AIR = load_atmosphere(4200.0)
TRIALS = 1500
C2 = h * c / k


def simulated_estimates(made, moments, detail, temperature, seconds, free, rng):
    """Draw nodded counts, fit them by maximum likelihood; return ndarray[trial, free parameter].

    The spectrum is built here from normal distributions on the pixels; counts are Poisson plus Gaussian
    read noise, on the target and on the sky; the fit is a Newton iteration on the likelihood with the
    variance of the model (counts are large), started at the truth.
    """
    setting = made.settings[0]
    step = 1 / (setting.resolving_power * setting.pixels_per_element)
    edges = setting.band_m[0] * np.exp(step * np.arange(detail.wavelength_m.size + 1))
    lines = detail.lines
    spread = float(moments.beam.velocity_spread_m_s[0])
    mass = 3.0235 * 1.66053906660e-27
    sigma = math.sqrt(
        (1 / (setting.resolving_power * 2.35482)) ** 2 + (k * temperature / mass + spread**2) / c**2
    )
    f = 0.5 if made.operation.nod == "off-slit" else 1.0
    sky = detail.sky_e_s + detail.telescope_e_s + detail.dark_e_s
    reads = seconds / detail.plan.integration_s[0]  # integrations of each spectral pixel
    read_e2 = detail.readout_e2_s * seconds / reads  # in one integration, all its pixels
    level_e_s = detail.efficiency * np.diff(edges) * CONTINUUM_UNIT * float(moments.beam.solid_angle_sr[0])
    level_e_s *= math.pi / 4 * made.telescope.aperture_m**2 * (1 - made.telescope.obstruction**2)

    def part(shift):
        centre = np.log(lines.wavelength_m) + (float(moments.range_rate_m_s[0]) + shift) / c
        return np.diff(norm.cdf((np.log(edges) - centre[:, None]) / sigma), axis=1)

    still, right, left = part(0.0), part(100.0), part(-100.0)
    first, second = (right - left) / 200.0, (right + left - 2 * still) / 100.0**2

    def rates(theta):
        """ndarray[trial, pixel]; the place of the lines to second order in their shift."""
        log_n, warmer, level, shift = theta.T[:, :, None]
        t = temperature + warmer
        ratio = np.exp(log_n + C2 * lines.upper_energy_m1 * (1 / temperature - 1 / t))
        ratio *= float(partition_function(temperature)) / partition_function(t)
        flux = detail.line_signal_e_s * np.where(detail.wanted, ratio, 1.0)
        moved = flux @ still + shift * (flux @ first) + 0.5 * shift**2 * (flux @ second)
        return moved + detail.continuum_e_s + level * level_e_s

    truth = np.zeros(4)
    steps = np.array([1e-3, 0.05, 1e-3, 1.0])
    mean = rates(truth[None, :])[0]
    # on-slit: all the time on target, as much on the sky beside it
    on_s, off_s = (seconds * f, seconds * (1 - f)) if f < 1 else (seconds, seconds)
    shape = (TRIALS, mean.size)
    on = rng.poisson((mean + sky) * on_s, shape) + rng.normal(
        0, np.sqrt(read_e2 * reads * on_s / seconds), shape
    )
    off = rng.poisson(sky * off_s, shape) + rng.normal(0, np.sqrt(read_e2 * reads * off_s / seconds), shape)
    data = (on - off * on_s / off_s) / seconds

    def model(theta):
        values = f * rates(theta)
        slopes = []
        for i in free:
            up, down = theta.copy(), theta.copy()
            up[:, i] += steps[i]
            down[:, i] -= steps[i]
            plus, minus = f * rates(up), f * rates(down)
            slopes.append((plus - minus) / (2 * steps[i]))
        return values, np.stack(slopes, axis=1)

    if math.isclose(f, 1.0):
        variance = (mean + 2 * sky + 2 * detail.readout_e2_s) / seconds
    else:
        variance = (f * mean + f / (1 - f) * (sky + detail.readout_e2_s)) / seconds
    # one linearisation for all trials: the model is straight over the errors of an SNR of 20 or more,
    # the second step from each trial's own place takes out what is left
    value, slope = model(truth[None, :])
    scores = (data - value[0]) / variance @ slope[0].T
    matrix = (slope[0] / variance) @ slope[0].T
    estimate = np.zeros((TRIALS, 4))
    estimate[:, free] = np.linalg.solve(matrix, scores.T).T
    value, slope = model(estimate)
    scores = np.einsum("tk,tik->ti", (data - value) / variance, slope)
    own = np.einsum("tik,tjk->tij", slope / variance, slope)
    estimate[:, free] += np.linalg.solve(own, scores[:, :, None])[:, :, 0]
    return estimate[:, free]


CASES = {
    # kind, setting, goal lines, free parameters, seconds, column
    "slit": ("slit", {"band_m": (3.94e-6, 4.00e-6)}, (), [0, 1, 2, 3], 3600.0, 2e15),
    "ifu": ("ifu", {"band_m": (3.6e-6, 4.0e-6), "resolving_power": 4500.0}, (), [0, 1, 2, 3], 1200.0, 2e15),
    "one line": (
        "slit",
        {"band_m": (3.950e-6, 3.9545e-6), "resolving_power": 30000.0},
        ("Q(1,0)",),
        [0, 2, 3],
        3600.0,
        5e14,
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_scatter_of_estimates_is_what_the_matrix_says(make, case):
    kind, setting, goal, free, seconds, column = CASES[case]
    made = make.instrument(kind, settings=setting, detector={"full_well_e": 1e9})
    moments = make.moments_of(made, range_rate_m_s=(6e3,))
    detail = expose_one(moments, Glow(LINES, 600.0, column, make.grey), AIR, made, made.settings[0], goal)
    estimates = simulated_estimates(made, moments, detail, 600.0, seconds, free, np.random.default_rng(20))
    matrix = detail.matrix * seconds
    promised = np.linalg.inv(matrix[np.ix_(free, free)])
    assert 20.0 < math.sqrt(marginalise(matrix)[0, 0]) < 1000.0
    own_error = 4.0 / math.sqrt(2 * TRIALS)  # four sigma of a standard deviation from that many trials
    for i in range(len(free)):
        assert estimates[:, i].std() == pytest.approx(math.sqrt(promised[i, i]), rel=own_error)
        assert abs(estimates[:, i].mean()) < 4 * math.sqrt(promised[i, i] / TRIALS) + 0.02 * math.sqrt(
            promised[i, i]
        )
    rest = marginalise(matrix)
    if 1 in free:
        assert column_error(rest) == pytest.approx(math.sqrt(promised[0, 0]), rel=1e-6)
        assert temperature_error(rest) == pytest.approx(math.sqrt(promised[1, 1]), rel=1e-6)
        measured = np.corrcoef(estimates[:, 0], estimates[:, 1])[0, 1]
        assert measured == pytest.approx(float(correlation(rest)), abs=0.05)
    else:
        assert temperature_error(rest) == math.inf


def test_two_line_thermometer(make):
    """sigma_T = T²/(c2 dE) sqrt(1/SNR1² + 1/SNR2²): Boltzmann's law for the ratio of two lines."""
    made = make.instrument("ifu", detector={"full_well_e": 1e9}, settings={"resolving_power": 60000.0})
    moments = make.moments_of(made)
    pair = ("Q(1,0)", "Q(3,0)")

    def matrix(*names):
        exposure = expose_moments(
            moments, Glow(LINES, 600.0, 1e14, make.grey), AIR, made, made.settings[0], names
        )
        return exposure.matrix[0, :2, :2]  # continuum and zero known

    snr = [math.sqrt(matrix(name)[0, 0]) for name in pair]
    energy = [LINES.upper_energy_m1[LINES.find(name)] for name in pair]
    expected = 600.0**2 / (C2 * abs(energy[0] - energy[1])) * math.hypot(1 / snr[0], 1 / snr[1])
    assert temperature_error(matrix(*pair)) == pytest.approx(expected, rel=2e-3)


def test_one_line_gives_no_temperature(make):
    made = make.instrument()
    moments = make.moments_of(made)
    exposure = expose_moments(
        moments, Glow(LINES, 600.0, 1e15, make.grey), AIR, made, made.settings[0], ("Q(1,0)",)
    )
    rest = marginalise(exposure.matrix[0] * 3600.0)
    assert rest[0, 0] > 0.0
    assert temperature_error(rest) == math.inf
    assert column_error(rest) == math.inf


def test_shares_of_the_temperature_information(make):
    made = make.instrument("ifu", settings={"resolving_power": 60000.0}, detector={"full_well_e": 1e9})
    moments = make.moments_of(made)
    detail = expose_one(moments, Glow(LINES, 600.0, 1e14, make.grey), AIR, made, made.settings[0])
    assert detail.temperature_share.sum() == pytest.approx(1.0)
    # what the shares are shares of: the information on T when N is free and the rest known
    slope, weight = detail.temperature_slope, detail.line_information
    whole = np.sum(weight * (slope - weight @ slope / weight.sum()) ** 2)
    assert 1 / math.sqrt(whole) == pytest.approx(float(temperature_error(detail.matrix[:2, :2])), rel=0.02)
    assert temperature_shares(np.array([3.0]), np.array([0.1])) == pytest.approx([0.0])
    assert temperature_shares(np.array([0.0]), np.array([0.1])) == pytest.approx([0.0])
