"""The requested set with the best chance, and the nights to add as insurance."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest

from coldglow.plan import insurance
from coldglow.plan.demand import Amount
from coldglow.plan.insurance import robust_set
from coldglow.plan.multicover import Candidates, Rules
from coldglow.plan.nights import Weather, success

WEATHER = Weather(0.6, 0.3, 3000, 5)


def nights(count: int) -> Candidates:
    day = np.arange(count)
    start = day * 86400.0
    return Candidates(day, start, start + 3e4, np.ones(count), np.zeros(count, dtype=np.int64))


@pytest.mark.parametrize("seed", range(5))
def test_small_case_is_the_best_of_all_sets(seed):
    rng = np.random.default_rng(seed)
    gain = rng.random((8, 2))
    demand = Amount(np.full(2, 1.2))
    found = robust_set(nights(8), gain, demand, Rules(cost_max=4.0), WEATHER)
    every = [
        success(gain[list(some)], demand, np.array(some), WEATHER)[0] for some in combinations(range(8), 4)
    ]
    assert found.method == "all sets compared"
    assert found.probability == pytest.approx(max(every), abs=1e-12)
    assert found.probability_error == 0.0


@pytest.mark.parametrize("seed", range(8))
def test_heuristic_comes_near_the_best_and_never_claims_more(monkeypatch, seed):
    rng = np.random.default_rng(seed)
    gain, demand = rng.random((10, 3)), Amount(np.full(3, 1.5))
    best = robust_set(nights(10), gain, demand, Rules(cost_max=5.0), WEATHER)
    monkeypatch.setattr(insurance, "BRUTE_SETS", 0)
    found = robust_set(nights(10), gain, demand, Rules(cost_max=5.0), WEATHER)
    assert found.method == "greedy with exchanges"
    assert found.probability <= best.probability + 1e-12
    assert found.probability >= 0.95 * best.probability


def test_insurance_keeps_the_base_and_raises_the_chance():
    gain = np.tile(np.eye(3), (7, 1))  # 21 nights, three kinds
    demand, base = Amount(np.ones(3)), np.array([0, 1, 2])
    alone = success(gain[base], demand, base, WEATHER)[0]
    chances = [alone]
    for more in (1.0, 3.0, 6.0):
        found = robust_set(nights(21), gain, demand, Rules(cost_max=3.0 + more), WEATHER, base)
        assert set(base) <= set(found.chosen.tolist())
        assert found.added.size == more
        assert found.cost == 3.0 + more
        chances.append(found.probability)
    assert np.all(np.diff(chances) > 0.0)
    kinds = np.bincount(found.chosen % 3)
    assert kinds.tolist() == [3, 3, 3]  # insurance is spread over what can fail


def test_the_best_per_cost_are_tried_first(monkeypatch):
    monkeypatch.setattr(insurance, "BRUTE_SETS", 0)
    gain = np.linspace(0.05, 1.0, 20)[:, None]
    candidates = replace(nights(20), cost=np.where(np.arange(20) < 18, 1.0, 2.0))
    rules, certain = Rules(cost_max=2.0), Weather(1.0, 0.0, 100, 5)
    found = robust_set(candidates, gain, Amount(np.array([1.74])), rules, certain)
    assert found.chosen.tolist() == [16, 17]  # 0.85 and 0.9 for one each; the two brightest cost two each
    assert found.probability == 1.0


def test_no_more_is_added_than_is_enough(monkeypatch):
    monkeypatch.setattr(insurance, "BRUTE_SETS", 0)
    gain, demand, rules = np.ones((12, 1)), Amount(np.ones(1)), Rules(cost_max=8.0)
    found = robust_set(nights(12), gain, demand, rules, WEATHER, enough=0.8)
    one_less = success(gain[found.added[:-1]], demand, np.sort(found.added[:-1]), WEATHER)[0]
    assert one_less < 0.8 <= found.probability


def test_under_persistent_weather_insurance_is_put_far_away():
    gain = np.ones((12, 1))
    lasting = Weather(0.6, 0.8, 3000, 5)
    found = robust_set(nights(12), gain, Amount(np.ones(1)), Rules(cost_max=2.0), lasting)
    assert found.chosen.tolist() == [0, 11]


def test_forbidden_nights_and_halves_are_respected():
    day = np.repeat(np.arange(4), 3)
    start = day * 86400.0 + np.tile([0.0, 0.0, 2e4], 4)
    end = day * 86400.0 + np.tile([4e4, 2e4, 4e4], 4)
    candidates = Candidates(day, start, end, np.tile([1.0, 0.5, 0.5], 4), np.zeros(12, dtype=np.int64))
    gain = np.tile([1.0, 0.5, 0.5], 4)[:, None]
    found = robust_set(
        candidates, gain, Amount(np.ones(1)), Rules(cost_max=2.0, forbidden_nights=(0,)), WEATHER
    )
    assert found.cost <= 2.0
    assert not np.isin(day[found.chosen], 0).any()
    assert np.unique(day[found.chosen]).size == 2


def test_a_set_without_a_limit_is_refused():
    with pytest.raises(ValueError, match="limit on its cost"):
        robust_set(nights(2), np.ones((2, 1)), Amount(np.ones(1)), Rules(), WEATHER)


@pytest.mark.parametrize("sets", [0, 3000])
def test_fixed_nights_are_in_the_set(monkeypatch, sets):
    monkeypatch.setattr(insurance, "BRUTE_SETS", sets)
    gain = np.array([[0.1], [1.0], [1.0], [0.2], [1.0], [1.0]])
    rules = Rules(cost_max=4.0, fixed_nights=(3,), fixed_sets=((0, 1),))
    found = robust_set(nights(6), gain, Amount(np.ones(1)), rules, WEATHER)
    assert found.chosen.tolist() == [1, 2, 3, 5]  # far apart, as weather lasts
