"""The two-state chain against the binomial law, an independent simulation, and its limits."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy.stats import binom

from coldglow.errors import RangeError
from coldglow.plan import weather
from coldglow.plan.weather import (
    count_distribution,
    history_probability,
    probability_of_sum,
    simulate,
    sum_distribution,
)


@given(st.integers(1, 40), st.floats(1e-3, 1.0))
def test_without_correlation_counts_are_binomial(nights, clear):
    found = count_distribution(np.arange(nights), clear)
    np.testing.assert_allclose(found, binom.pmf(np.arange(nights + 1), nights, clear), atol=1e-12)


def by_transition_matrix(day, clear, rho, trials, seed):
    """Simulate day by day with a plain 2 x 2 transition matrix, every day of the span."""
    rng = np.random.default_rng(seed)
    stay_clear, to_clear = clear + (1.0 - clear) * rho, clear * (1.0 - rho)
    state = rng.random(trials) < clear
    seen = []
    for today in range(day[-1] + 1):
        if today:
            state = rng.random(trials) < np.where(state, stay_clear, to_clear)
        seen += [state] * int(np.sum(np.asarray(day) == today))
    return np.array(seen).T


@pytest.mark.parametrize("rho", [0.0, 0.3, 0.8])
def test_counts_and_samples_against_an_independent_simulation(rho):
    day = np.array([0, 0, 1, 2, 5, 5, 9, 20])  # two nights in halves, gaps
    trials = 60_000
    histories = by_transition_matrix(day, 0.6, rho, trials, 3)
    expected = np.bincount(histories.sum(axis=1), minlength=9) / trials
    error = 5.0 * np.sqrt(0.25 / trials)
    np.testing.assert_allclose(count_distribution(day, 0.6, rho), expected, atol=error)
    drawn = simulate(day, 0.6, rho, trials, np.random.default_rng(4))
    np.testing.assert_allclose(np.bincount(drawn.sum(axis=1), minlength=9) / trials, expected, atol=2 * error)
    np.testing.assert_allclose(np.cov(drawn.T), np.cov(histories.T), atol=2 * error)
    assert np.array_equal(drawn[:, 0], drawn[:, 1])  # both halves of a night share its weather
    assert np.array_equal(drawn[:, 4], drawn[:, 5])


def test_gap_of_two_nights_is_two_steps_of_the_chain():
    # P(clear, clear) two days apart = c * (c + (1-c) rho**2), by hand for c = 0.5, rho = 0.5: 0.3125
    assert count_distribution([0, 2], 0.5, 0.5)[2] == pytest.approx(0.3125, abs=1e-15)


def test_certain_and_hopeless_weather():
    assert count_distribution(range(5), 1.0, 0.7).tolist() == [0, 0, 0, 0, 0, 1]
    assert count_distribution(range(5), 0.0, 0.7).tolist() == [1, 0, 0, 0, 0, 0]
    assert simulate(range(5), 1.0, 0.3, 10, np.random.default_rng(0)).all()
    one_state = count_distribution(range(5), 0.4, 1.0)
    np.testing.assert_allclose(one_state, [0.6, 0, 0, 0, 0, 0.4], atol=1e-15)


def test_histories_add_up_to_the_counts():
    day = np.array([0, 1, 3, 4])
    states = np.array(list(product([False, True], repeat=4)))
    chance = history_probability(states, day, 0.7, 0.4)
    assert chance.sum() == pytest.approx(1.0, abs=1e-14)
    counts = np.bincount(states.sum(axis=1), weights=chance)
    np.testing.assert_allclose(counts, count_distribution(day, 0.7, 0.4), atol=1e-14)


@given(
    st.lists(st.integers(0, 9), min_size=1, max_size=8),
    st.integers(1, 30),
    st.floats(0.0, 1.0),
    st.floats(0.0, 1.0),
)
def test_sums_against_enumeration(amounts, top, clear, rho):
    day = np.cumsum(np.arange(len(amounts)) % 3)
    states = np.array(list(product([False, True], repeat=len(amounts))))
    sums = np.minimum(states @ np.array(amounts), top)
    chance = history_probability(states, day, clear, rho)
    expected = np.bincount(sums, weights=chance, minlength=top + 1)
    np.testing.assert_allclose(
        sum_distribution(np.array(amounts), top, day, clear, rho), expected, atol=1e-12
    )


@pytest.mark.parametrize("exact_nights", [0, 12])
@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.floats(0.0, 3.0), min_size=1, max_size=9), st.floats(0.1, 9.0), st.floats(0.0, 0.9))
def test_bounds_hold_the_exact_probability(monkeypatch, exact_nights, information, demand, rho):
    monkeypatch.setattr(weather, "EXACT_NIGHTS", exact_nights)
    day = np.arange(len(information))
    states = np.array(list(product([False, True], repeat=len(information))))
    reached = states @ np.array(information) >= demand * (1.0 - 1e-9)
    exact = history_probability(states, day, 0.6, rho) @ reached
    low, high = probability_of_sum(information, demand, day, 0.6, rho)
    assert low - 1e-12 <= exact <= high + 1e-12


def test_bounds_are_close_for_a_season_of_unequal_nights():
    information = np.random.default_rng(2).uniform(0.5, 1.5, 40)
    low, high = probability_of_sum(information, 20.0, np.arange(40), 0.6, 0.3)
    assert high - low < 0.01
    drawn = simulate(np.arange(40), 0.6, 0.3, 50_000, np.random.default_rng(1)) @ information >= 20.0
    assert low - 0.01 < drawn.mean() < high + 0.01


def test_never_and_nothing():
    assert probability_of_sum([1.0, 2.0], np.inf, [0, 1], 0.5) == (0.0, 0.0)
    assert probability_of_sum([], 1.0, [], 0.5) == (0.0, 0.0)
    assert probability_of_sum([0.0, 0.0], 1.0, [0, 1], 0.5) == (0.0, 0.0)
    assert probability_of_sum([1.0], 0.0, [0], 0.5) == (1.0, 1.0)


@pytest.mark.parametrize(("clear", "rho", "key"), [(1.2, 0.0, "clear_fraction"), (0.5, -0.1, "correlation")])
def test_wrong_weather_is_refused(clear, rho, key):
    with pytest.raises(RangeError, match=r"is not in 0 \.\.\. 1") as caught:
        count_distribution([0, 1], clear, rho)
    assert caught.value.key == f"weather.{key}"


def test_units_out_of_order_are_refused():
    with pytest.raises(ValueError, match="order of time"):
        count_distribution([3, 1], 0.5)
