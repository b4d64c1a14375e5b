"""Systematic errors against refits of disturbed line fluxes."""

import math

import numpy as np
import pytest

from coldglow.detect.systematics import CAUSES, systematic_errors

RNG = np.random.default_rng(9)
WAVELENGTH_M = np.sort(RNG.uniform(3.5e-6, 4.0e-6, 12))
INFORMATION = RNG.uniform(100.0, 5000.0, 12)
SLOPE = RNG.uniform(0.005, 0.02, 12)
NO_AIR = np.zeros(12)


def refit(disturbance, scatter=0.0, seconds=1.0):
    """Least squares of (ln N, T) to changes of ln(flux), ndarray[..., line], with known weights."""
    design = np.stack([np.ones(12), SLOPE], axis=1)
    weighted = design / (1 / (seconds * INFORMATION) + scatter**2)[:, None]
    return np.linalg.solve(weighted.T @ design, weighted.T @ disturbance.T).T


def test_the_flux_scale_moves_the_column_only(make):
    operation = make.instrument(operation={"flux_error": 0.12, "relative_error": 0.0}).operation
    found = systematic_errors(WAVELENGTH_M, INFORMATION, SLOPE, NO_AIR, operation, einstein_a_error=0.0)
    assert found.fixed_total == pytest.approx(0.12)
    assert found.column_total == pytest.approx(0.12)
    assert found.temperature_total_k == pytest.approx(0.0, abs=1e-9)


def test_a_tilt_of_the_calibration_as_refitted(make):
    operation = make.instrument(operation={"flux_error": 0.0, "relative_error": 0.04}).operation
    found = systematic_errors(WAVELENGTH_M, INFORMATION, SLOPE, NO_AIR, operation, einstein_a_error=0.0)
    tilt = 0.04 * (WAVELENGTH_M - WAVELENGTH_M.mean()) / (WAVELENGTH_M[-1] - WAVELENGTH_M[0])
    log_n, warmer = refit(tilt)
    assert found.column_total == pytest.approx(abs(log_n))
    assert found.temperature_total_k == pytest.approx(abs(warmer))


@pytest.mark.parametrize("seconds", [0.1, 1.0, 100.0])
def test_independent_errors_of_lines_as_refitted(make, seconds):
    """Counting and independent errors together: the scatter of refits that know both."""
    operation = make.instrument(operation={"flux_error": 0.0, "relative_error": 0.0}).operation
    telluric = np.linspace(0.01, 0.1, 12)
    found = systematic_errors(
        WAVELENGTH_M,
        INFORMATION,
        SLOPE,
        telluric,
        operation,
        einstein_a_error=0.03,
        open_shutter_s=seconds,
    )
    trials = 20000
    rng = np.random.default_rng(4)
    counting = rng.normal(0, 1, (trials, 12)) / np.sqrt(seconds * INFORMATION)
    disturbed = counting + rng.normal(0, 0.03, (trials, 12)) + rng.normal(0, 1, (trials, 12)) * telluric
    log_n, warmer = refit(disturbed, np.hypot(0.03, telluric), seconds).T
    alone = refit(counting, 0.0, seconds)
    for total, random, systematic in (
        (log_n, alone[:, 0], found.column_total),
        (warmer, alone[:, 1], found.temperature_total_k),
    ):
        assert total.std() == pytest.approx(math.hypot(random.std(), systematic), rel=0.03)
    by_cause = dict(zip(CAUSES, found.temperature_k, strict=True))
    assert by_cause["Einstein A"] > 0
    assert by_cause["flux scale"] == pytest.approx(0.0, abs=1e-9)


def test_a_bright_line_is_worth_no_more_than_its_einstein_coefficient(make):
    """N lines known far better than their coefficients: 3 % / sqrt(N), however unequal their light."""
    operation = make.instrument(operation={"flux_error": 0.0, "relative_error": 0.0}).operation
    bright = 1e6 * INFORMATION**3
    found = systematic_errors(WAVELENGTH_M, bright, SLOPE, NO_AIR, operation, einstein_a_error=0.03)
    assert found.fixed_total == pytest.approx(0.03 / math.sqrt(12), rel=1e-3)
    expected = 0.03 / math.sqrt(np.sum((SLOPE - SLOPE.mean()) ** 2))
    assert found.temperature_total_k == pytest.approx(expected, rel=1e-3)


def test_both_floors_move_all_lines_alike(make):
    operation = make.instrument(
        operation={"flux_error": 0.0, "relative_error": 0.0, "visit_floor": 0.04, "common_floor": 0.01}
    ).operation
    found = systematic_errors(WAVELENGTH_M, INFORMATION, SLOPE, NO_AIR, operation, einstein_a_error=0.0)
    assert found.fixed_total == pytest.approx(math.hypot(0.04, 0.01))


def test_one_line_has_no_temperature_to_err_in(make):
    operation = make.instrument(operation={"flux_error": 0.1, "relative_error": 0.03}).operation
    one = np.zeros(12)
    one[4] = 3.0
    found = systematic_errors(WAVELENGTH_M, one, SLOPE, NO_AIR, operation, einstein_a_error=0.03)
    assert found.fixed_total == pytest.approx(math.hypot(0.1, 0.03))
    assert found.temperature_total_k == math.inf
    assert found.column_total == math.inf
    none = systematic_errors(WAVELENGTH_M, 0 * one, SLOPE, NO_AIR, operation)
    assert none.fixed_total == math.inf
