"""Marginalisation, floors, errors and times, against linear algebra done another way."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import norm

from coldglow.plan.goal import (
    column_error,
    correlation,
    demanded_information,
    marginalise,
    required_snr,
    snr,
    temperature_error,
    with_floor,
    without_floor,
)

FLOOR = st.just(0.0) | st.floats(1e-4, 0.2)
SCALE = np.array([1.0, 0.02, 3.0, 1e9])  # parameters of very different size, as in use


def random_matrix(seed: int, visits: int = 1) -> np.ndarray:
    slopes = np.random.default_rng(seed).normal(size=(visits, 9, 4)) * SCALE
    return np.einsum("vki,vkj->vij", slopes, slopes)


@given(st.integers(0, 10**6))
def test_marginal_errors_are_those_of_the_whole_inverse(seed):
    matrix = random_matrix(seed, 3)
    covariance = np.linalg.inv(matrix / np.outer(SCALE, SCALE)) / np.outer(SCALE, SCALE)
    rest = marginalise(matrix)
    np.testing.assert_allclose(column_error(rest), np.sqrt(covariance[:, 0, 0]), rtol=1e-6)
    np.testing.assert_allclose(temperature_error(rest), np.sqrt(covariance[:, 1, 1]), rtol=1e-6)
    expected = covariance[:, 0, 1] / np.sqrt(covariance[:, 0, 0] * covariance[:, 1, 1])
    np.testing.assert_allclose(correlation(rest), expected, atol=1e-6)


def test_snr_of_a_weighted_line_and_flat_continuum_by_hand():
    # Counts s(1 + c) in pixel 1 and c in pixel 2, unit variance: signal slope (10, 0), continuum (1, 1).
    # ln N after the free continuum: 100 - 10*10/2 = 50, the textbook difference of two equal pixels.
    slopes = np.array([[10.0, 0.0, 1.0, 0.0], [0.0, 0.0, 1.0, 0.0]])
    assert snr(marginalise(slopes.T @ slopes)[0, 0]) == pytest.approx(np.sqrt(50.0), rel=1e-12)


def test_a_nuisance_without_information_is_dropped():
    matrix = random_matrix(5)[0]
    matrix[3, :] = matrix[:, 3] = 0.0
    kept = np.linalg.inv(matrix[:3, :3])
    assert column_error(marginalise(matrix)) == pytest.approx(np.sqrt(kept[0, 0]), rel=1e-9)


def test_a_line_that_cannot_be_told_from_the_continuum_has_no_snr():
    slope = np.array([2.0, 0.0, 2.0, 0.0])  # an imager with one band
    rest = marginalise(np.outer(slope, slope))
    assert snr(rest[0, 0]) == 0.0
    assert column_error(rest) == np.inf
    assert np.isnan(correlation(rest))


def test_one_line_gives_no_temperature():
    slopes = np.random.default_rng(1).normal(size=(6, 1)) * np.array([1.0, 0.004, 0.0, 0.0])
    rest = marginalise(slopes.T @ slopes)
    assert snr(rest[0, 0]) > 0.0
    assert temperature_error(rest) == np.inf
    assert column_error(rest) == np.inf


@given(st.integers(0, 10**6))
def test_bins_add_before_marginalisation_and_visits_lose_by_it(seed):
    parts = random_matrix(seed, 2)
    together = marginalise(parts.sum(axis=0))
    apart = marginalise(parts).sum(axis=0)
    # two visits know less than one of the same matrices: each pays for nuisances of its own
    assert np.linalg.eigvalsh((together - apart) / np.outer(SCALE[:2], SCALE[:2])).min() >= -1e-9


def test_floors_of_visits_average_and_a_common_one_does_not():
    for visits in (1, 4, 100):
        many = np.full(visits, 1e12)
        assert snr(with_floor(many, 0.1).sum()) == pytest.approx(10.0 * np.sqrt(visits), rel=1e-6)
        assert snr(many.sum(), 0.0, 0.1) == pytest.approx(10.0, rel=1e-6)
    # both, one visit: 1/SNR**2 = 1/I + f**2 + g**2
    assert snr(25.0, 0.1, 0.2) == pytest.approx(1.0 / np.sqrt(0.04 + 0.01 + 0.04), rel=1e-12)


@given(st.floats(1e-6, 1e3), FLOOR, FLOOR, st.floats(1.0, 1e7), st.floats(1.001, 50))
def test_what_is_demanded_inverts_the_snr_below_the_asymptote(rate, visit_floor, common_floor, time_s, more):
    def reach(seconds):
        return float(snr(rate * seconds, visit_floor, common_floor))

    def demanded(wanted):
        return float(without_floor(demanded_information(wanted, common_floor), visit_floor))

    reached = reach(time_s)
    floors = np.hypot(visit_floor, common_floor)
    if floors * reached < 0.999:  # so near the asymptote the time is not well conditioned
        assert demanded(reached) / rate == pytest.approx(time_s, rel=1e-6)
    assert reach(more * time_s) >= reached
    if floors > 0.0:
        assert demanded(1.0001 / floors) == np.inf


@given(st.floats(0.0, 1e4), st.floats(0.0, 0.3))
def test_floor_and_its_inverse(information, floor):
    assert without_floor(with_floor(information, floor), floor) == pytest.approx(information, rel=1e-6)


def test_measured_snr_reaches_the_goal_with_the_wanted_probability():
    rng = np.random.default_rng(7)
    for probability in (0.5, 0.9, 0.2):
        expected = required_snr(5.0, probability)
        assert expected == pytest.approx(5.0 + norm.ppf(probability), abs=1e-12)
        measured = expected + rng.standard_normal(200_000)
        assert np.mean(measured >= 5.0) == pytest.approx(probability, abs=4e-3)
    assert required_snr(1.0, 0.01) == 0.0


def test_demand_above_the_common_floor_is_never():
    assert demanded_information(5.0) == 25.0
    assert demanded_information(11.0, 0.1) == np.inf
