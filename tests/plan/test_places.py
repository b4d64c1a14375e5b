"""Weather of several places: chains that know nothing of each other, and places without clouds."""

import numpy as np
import pytest
from scipy.stats import binom

from coldglow.plan.demand import Amount
from coldglow.plan.nights import Weather, curve, drawn, success
from coldglow.plan.weather import chain_day, count_distribution, probability_of_sum

CLEAR, RHO = 0.6, 0.5
WEATHER = Weather(CLEAR, RHO, 4000, 3)


def two_places(days, trials, seed):
    """Simulate two skies night by night with an explicit transition matrix for each."""
    rng = np.random.default_rng(seed)
    stay = np.array(
        [[1 - CLEAR * (1 - RHO), CLEAR * (1 - RHO)], [(1 - CLEAR) * (1 - RHO), CLEAR + (1 - CLEAR) * RHO]]
    )
    state = (rng.random((trials, 2)) < CLEAR).astype(int)
    rows = [state]
    for _ in range(1, days):
        state = (rng.random((trials, 2)) < stay[state, 1]).astype(int)
        rows.append(state)
    return np.stack(rows, axis=2)  # trial, place, day


def test_independent_nights_at_two_places_are_binomial_together():
    # number of successes in 5 + 7 independent trials: binomial law of 12
    day = chain_day(np.concatenate([np.arange(5), np.arange(7)]), np.repeat([0, 1], [5, 7]))
    found = count_distribution(day, CLEAR, 0.0)
    np.testing.assert_allclose(found, binom.pmf(np.arange(13), 12, CLEAR), atol=1e-14)


def test_two_correlated_places_add_by_convolution():
    days = np.arange(6)
    both = count_distribution(chain_day(np.tile(days, 2), np.repeat([0, 1], 6)), CLEAR, RHO)
    one = count_distribution(days, CLEAR, RHO)
    np.testing.assert_allclose(both, np.convolve(one, one), atol=1e-14)
    together = count_distribution(np.repeat(days, 2), CLEAR, RHO)  # the same sky over both
    assert np.abs(both - together).max() > 0.1


def test_unequal_nights_at_two_places_against_a_simulation():
    trials = 400_000
    history = two_places(10, trials, 8)
    gain = np.random.default_rng(9).uniform(0.5, 2.0, (2, 10))
    simulated = (np.einsum("tpd,pd->t", history, gain) >= 14.0).mean()
    day = chain_day(np.tile(np.arange(10), 2), np.repeat([0, 1], 10))
    low, high = probability_of_sum(gain.ravel(), 14.0, day, CLEAR, RHO)
    error = np.sqrt(simulated * (1 - simulated) / trials)
    assert low - 4 * error < simulated < high + 4 * error
    assert high - low < 0.005


def test_coverage_from_two_places_against_a_simulation():
    # the first place serves bins 0 and 1, the second bins 1 and 2; every bin wants two clear nights
    gain = np.zeros((12, 3))
    gain[:6, 0], gain[:6, 1], gain[6:, 1], gain[6:, 2] = 1.0, 1.0, 1.0, 1.0
    day = chain_day(np.tile(np.arange(6), 2), np.repeat([0, 1], 6))
    history = two_places(6, 400_000, 5).sum(axis=2)
    simulated = (history >= 2).all(axis=1).mean()  # bin 1 follows from the others
    exact, none = success(gain, Amount(np.full(3, 2.0)), day, WEATHER)
    assert none == 0.0
    assert exact == pytest.approx(simulated, abs=4 * np.sqrt(0.25 / 400_000))
    one = 1.0 - count_distribution(np.arange(6), CLEAR, RHO)[:2].sum()
    assert exact == pytest.approx(one**2, abs=1e-12)


def test_many_nights_at_two_places_are_sampled_independently():
    weight, _, exact = drawn(chain_day(np.tile(np.arange(20), 2), np.repeat([0, 1], 20)), WEATHER)
    assert not exact
    between = np.corrcoef(weight.T)[:20, 20:]
    assert np.abs(np.diag(between)).max() < 4 / np.sqrt(WEATHER.trials)
    assert np.corrcoef(weight[:, 0], weight[:, 1])[0, 1] == pytest.approx(RHO, abs=0.06)


def test_no_clouds_in_space():
    day = chain_day([5, 6, 7], [0, 1, 1], cloudless=[1])
    gain, demand = np.ones((3, 1)), Amount(np.array([2.0]))
    assert success(gain[1:], demand, day[1:], WEATHER) == (1.0, 0.0)
    assert success(gain, Amount(np.array([3.0])), day, WEATHER) == pytest.approx((CLEAR, 0.0))
    bins = np.ones((3, 2))
    assert success(bins, Amount(np.array([3.0, 3.0])), day, WEATHER)[0] == pytest.approx(CLEAR)
    found = curve(bins, Amount(np.array([2.0, 2.0])), day, np.ones(3), [0, 1, 2], WEATHER)
    np.testing.assert_allclose(found.probability, [0.0, CLEAR, 1.0])
    scattered = success(bins[1:], Amount(np.ones(2)), day[1:], WEATHER, factors=np.ones((50, 2)))
    assert scattered == (1.0, 0.02)
