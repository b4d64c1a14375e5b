"""Probability against nights requested, for every kind of goal."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import binom

from coldglow.plan.demand import Amount, TemperatureError, snr_gain
from coldglow.plan.goal import demanded_information, marginalise, with_floor
from coldglow.plan.nights import Weather, curve, joint_curve, scatter_factors, success

PLAIN = Weather(clear_fraction=0.6, correlation=0.0, trials=4000, seed=11)


def one(values) -> np.ndarray:
    return np.asarray(values, dtype=float)[:, None]


def test_equal_nights_are_binomial():
    # SNR 3 per night, goal 6: four clear nights
    demand = Amount(np.atleast_1d(demanded_information(6.0)))
    found = curve(one(np.full(15, 9.0)), demand, np.arange(15), np.ones(15), np.arange(15), PLAIN)
    np.testing.assert_allclose(found.probability, binom.sf(3, np.arange(1, 16), 0.6), atol=1e-12)
    assert np.all(found.probability_error == 0.0)
    chosen = found.smallest(0.9)
    assert found.units[chosen] == 9  # binom.sf(3, 8, 0.6) = 0.826, binom.sf(3, 9, 0.6) = 0.9006
    assert found.smallest(0.9999999) is None


def test_exact_chances_of_correlated_nights_have_no_error_at_all():
    weather = replace(PLAIN, clear_fraction=0.7, correlation=0.3)
    demand = Amount(np.atleast_1d(demanded_information(6.28)))
    found = curve(one(np.full(40, 2.1)), demand, np.arange(40), np.ones(40), np.arange(40), weather)
    assert 0.0 < found.probability[28] < 1.0
    assert np.all(found.probability_error == 0.0)


def test_floors_ask_for_more_nights():
    # each night SNR 5 with a floor of 10 %: I' = 25/1.25 = 20; goal SNR 9 with 5 % common: 81/(1-0.2025)
    clear = replace(PLAIN, clear_fraction=1.0)

    def needed(gain, information):
        nights = np.arange(8)
        found = curve(one(gain), Amount(np.atleast_1d(information)), nights, np.ones(8), nights, clear)
        return found.smallest(0.5)

    gain = with_floor(np.full(8, 25.0), 0.1)
    assert needed(gain, demanded_information(9.0, 0.05)) == 6 - 1
    assert needed(np.full(8, 25.0), 81.0) == 4 - 1
    assert needed(gain, demanded_information(20.0, 0.05)) is None


def test_certain_weather_is_certain():
    clear = replace(PLAIN, clear_fraction=1.0, correlation=0.5)
    found = curve(one([4.0, 3.0, 2.0]), Amount(np.array([7.0])), [0, 1, 2], np.ones(3), [0, 1, 2], clear)
    assert found.probability.tolist() == [0.0, 1.0, 1.0]


def test_half_nights_cost_half_and_share_their_weather():
    found = curve(
        one([1.0, 1.0, 1.0, 1.0]), Amount(np.array([2.0])), [0, 0, 1, 1], np.full(4, 0.5), np.arange(4), PLAIN
    )
    assert found.cost.tolist() == [0.5, 1.0, 1.5, 2.0]
    np.testing.assert_allclose(found.probability, [0.0, 0.6, 0.6, 1.0 - 0.4**2], atol=1e-12)


@settings(max_examples=40)
@given(st.integers(0, 10**6), st.floats(0.0, 0.9), st.integers(2, 20))
def test_one_more_night_never_lowers_probability(seed, rho, count):
    rng = np.random.default_rng(seed)
    weather = Weather(0.6, rho, 300, seed)
    day, order = np.sort(rng.integers(0, 30, count)), rng.permutation(count)
    bins = curve(rng.random((count, 3)), Amount(np.full(3, 1.5)), day, np.ones(count), order, weather)
    single = curve(one(rng.random(count)), Amount(np.array([1.5])), day, np.ones(count), order, weather)
    assert np.all(np.diff(bins.probability) >= 0.0)
    assert np.all(np.diff(single.probability) >= 0.0)


def test_sampled_coverage_agrees_with_the_exact_answer():
    # two bins of their own nights: P = P(>= 2 of 8 clear)², independent nights
    gain = np.kron(np.eye(2), np.ones((8, 1)))
    probability, error = success(gain, Amount(np.array([2.0, 2.0])), np.arange(16), PLAIN)
    exact = binom.sf(1, 8, 0.6) ** 2
    assert 0.0 < error < 0.01
    assert probability == pytest.approx(exact, abs=4.0 * error)
    few, none = success(gain[[0, 1, 2, 8, 9, 10]], Amount(np.array([2.0, 2.0])), np.arange(6), PLAIN)
    assert few == pytest.approx(binom.sf(1, 3, 0.6) ** 2, abs=1e-12)  # enumerated
    assert none == 0.0


def test_same_seed_same_answer_and_streams_differ():
    gain, demand = np.random.default_rng(0).random((20, 4)), Amount(np.full(4, 4.0))
    first = success(gain, demand, np.arange(20), PLAIN, 1)
    assert first == success(gain, demand, np.arange(20), PLAIN, 1)
    assert first != success(gain, demand, np.arange(20), PLAIN, 2)


def test_order_of_the_units_does_not_matter():
    gain, day = np.random.default_rng(0).random((8, 2)), np.array([5, 0, 9, 2, 2, 7, 1, 4])
    demand, weather = Amount(np.array([1.5, 1.5])), replace(PLAIN, correlation=0.4)
    mixed = success(gain, demand, day, weather)
    order = np.argsort(day, kind="stable")
    assert mixed == success(gain[order], demand, day[order], weather)


def test_persistence_hurts_a_long_request_and_helps_a_hopeless_one():
    gain, day = one(np.ones(10)), np.arange(10)
    lasting = replace(PLAIN, correlation=0.7)
    easy, hard = Amount(np.array([3.0])), Amount(np.array([9.0]))
    assert success(gain, easy, day, lasting)[0] < success(gain, easy, day, PLAIN)[0]
    assert success(gain, hard, day, lasting)[0] > success(gain, hard, day, PLAIN)[0]


def test_temperature_error_needs_both_lines():
    cold, hot = (100.0 * np.outer(v, v) for v in (np.array([1.0, 0.002]), np.array([1.0, 0.012])))
    gain = np.array([cold, hot, cold, hot])[:, None]
    found = curve(gain, TemperatureError(np.array([15.0])), np.arange(4), np.ones(4), np.arange(4), PLAIN)
    # at least one clear night of each kind: 0.6², then (1-0.4²)·0.6, then (1-0.4²)²
    np.testing.assert_allclose(found.probability, [0.0, 0.36, 0.84 * 0.6, 0.84**2], atol=1e-12)


def test_goals_fail_together_under_one_sky():
    gain, demand = one(np.ones(6)), Amount(np.array([3.0]))
    alone = curve(gain, demand, np.arange(6), np.ones(6), np.arange(6), PLAIN)
    alone = joint_curve([(gain, demand)], np.arange(6), np.ones(6), np.arange(6), PLAIN)
    assert alone.units.tolist() == [1, 2, 3, 4, 5, 6]
    assert alone.cost.tolist() == [1.0, 2.0, 3.0, 4.0, 5.0, 6.0]
    twice = joint_curve([(gain, demand), (2 * gain, demand)], np.arange(6), np.ones(6), np.arange(6), PLAIN)
    np.testing.assert_allclose(twice.probability, alone.probability, atol=1e-12)


def test_scatter_has_the_stated_size():
    rng = np.random.default_rng(3)
    drawn = scatter_factors(
        (4000, 10), rng, column_scatter=0.2, temperature_scatter_k=30.0, signal_slope_k=0.01
    )
    # I goes with the square of the signal: sigma(ln I) = 2 sqrt(0.2² + 0.3²)
    assert np.log(drawn).std() == pytest.approx(2.0 * np.hypot(0.2, 0.3), rel=0.02)
    sky = scatter_factors((4000, 10), rng, quartile_information=((1.5, 0.8, 0.4),))
    np.testing.assert_allclose(np.quantile(sky, [0.25, 0.5, 0.75]), [0.4, 0.8, 1.5], rtol=0.03)
    assert np.all(scatter_factors((5, 3), rng) == 1.0)


def test_no_scatter_is_the_plan_and_scatter_blurs_the_step():
    gain, demand, day = one(np.full(20, 1.0)), Amount(np.array([9.0])), np.arange(20)
    exact = success(gain, demand, day, PLAIN)[0]
    flat, error = success(gain, demand, day, PLAIN, factors=np.ones((4000, 20)))
    assert flat == pytest.approx(exact, abs=4.0 * error)
    wide = scatter_factors((4000, 20), np.random.default_rng(1), column_scatter=0.5)
    assert success(gain, Amount(np.array([21.0])), day, PLAIN)[0] == 0.0
    assert success(gain, Amount(np.array([21.0])), day, PLAIN, factors=wide)[0] > 0.01


def test_gain_of_bins_marginalises_each_visit():
    slopes = np.random.default_rng(0).normal(size=(3, 2, 7, 4))
    matrix = np.einsum("cbki,cbkj->cbij", slopes, slopes)
    np.testing.assert_allclose(snr_gain(matrix, 0.1), with_floor(marginalise(matrix)[..., 0, 0], 0.1))
