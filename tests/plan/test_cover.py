"""The exact cover against all subsets, its rules, its bounds, and what it says when there is none."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations, product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from coldglow.plan.cover import cover
from coldglow.plan.demand import Amount, TemperatureError
from coldglow.plan.goal import temperature_error
from coldglow.plan.multicover import Candidates, Rules, cost_unit, obeys, overlaps
from coldglow.plan.reach import greedy, reachable_share

HALF_S = 18000.0


def nights(count: int, cost: float = 1.0) -> Candidates:
    day = np.arange(count)
    start = day * 86400.0
    return Candidates(day, start, start + HALF_S, np.full(count, cost), np.zeros(count, dtype=np.int64))


def with_halves(count: int) -> Candidates:
    """Every night as a whole (cost 1), and its two halves (cost 0.5 and 0.6)."""
    day = np.repeat(np.arange(count), 3)
    kind = np.tile([0, 1, 2], count)
    start = day * 86400.0 + np.where(kind == 2, HALF_S, 0.0)
    end = day * 86400.0 + np.where(kind == 1, HALF_S, 2.0 * HALF_S)
    return Candidates(day, start, end, np.array([1.0, 0.5, 0.6])[kind], np.zeros(day.size, dtype=np.int64))


def by_all_subsets(candidates, gain, demand, rules, wanted):
    """Cheapest cost of a full cover of the wanted bins (inf: none), and their largest covered share."""
    cheapest, most = np.inf, 0.0
    for bits in product((0.0, 1.0), repeat=candidates.night.size):
        chosen = np.array(bits)
        if not obeys(candidates, rules, chosen):
            continue
        share = demand.share(np.tensordot(chosen, gain, axes=1))
        if np.all(share[wanted] >= 1.0 - 1e-9):
            cheapest = min(cheapest, float(candidates.cost @ chosen))
        most = max(most, float(np.minimum(share, 1.0)[wanted | ~wanted.any()].sum()))
    return cheapest, most


def check(candidates, gain, demand, rules):
    found = cover(candidates, gain, demand, rules)
    chosen = np.isin(np.arange(candidates.night.size), found.chosen).astype(float)
    cheapest, most = by_all_subsets(candidates, gain, demand, rules, found.reachable)
    np.testing.assert_allclose(found.share, demand.share(np.tensordot(chosen, gain, axes=1)))
    assert found.proven
    assert found.gap == 0.0
    aim = found.reachable | ~found.reachable.any()
    if np.isfinite(cheapest) and (found.reachable.any() or np.isinf(rules.cost_max)):
        assert found.kind == "full"
        assert obeys(candidates, rules, chosen)
        assert np.all(found.covered[found.reachable])
        assert found.cost == pytest.approx(cheapest, abs=1e-9)
        assert found.cost_bound == pytest.approx(cheapest, abs=1e-6)
    else:
        assert found.kind == "most"
        assert np.minimum(found.share, 1.0)[aim].sum() == pytest.approx(most, abs=3e-5 * gain.shape[1])
        assert found.chosen.size == 0 or obeys(candidates, rules, chosen)


AMOUNT = st.integers(0, 6).map(lambda whole: whole / 4.0)
RULES = st.builds(
    Rules,
    cost_max=st.sampled_from([np.inf, np.inf, 3.0, 2.0]),
    consecutive=st.booleans(),
    block_nights=st.sampled_from([1, 1, 2, 3]),
    fixed_nights=st.sampled_from([(), (), (1,), (0, 2)]),
    forbidden_nights=st.sampled_from([(), (), (3,), (4, 0)]),
    fixed_sets=st.sampled_from([(), (), ((1, 5),)]),
    nights_max=st.sampled_from([np.inf, np.inf, 3.0, 2.0]),
).filter(lambda rules: not set(rules.fixed_nights) & set(rules.forbidden_nights))


@settings(max_examples=250)
@given(st.integers(1, 8), st.integers(1, 4), st.data())
def test_free_nights_against_all_subsets(count, bins, data):
    rows = data.draw(st.lists(st.lists(AMOUNT, min_size=bins, max_size=bins), min_size=count, max_size=count))
    demand = data.draw(st.lists(st.sampled_from([0.5, 1.0, 1.75, 3.0]), min_size=bins, max_size=bins))
    check(nights(count), np.array(rows), Amount(np.array(demand)), Rules())


@settings(max_examples=200)
@given(st.integers(0, 10**6), RULES)
def test_rules_against_all_subsets(seed, rules):
    rng = np.random.default_rng(seed)
    gain = np.where(rng.random((7, 3)) < 0.5, rng.uniform(0.2, 1.2, (7, 3)), 0.0)
    check(nights(7), gain, Amount(np.array([1.0, 1.0, 1.5])), rules)


@settings(max_examples=40)
@given(st.integers(0, 10**6), RULES)
def test_halves_and_whole_nights_against_all_subsets(seed, rules):
    rng = np.random.default_rng(seed)
    parts = np.where(rng.random((3, 2, 3)) < 0.6, rng.uniform(0.2, 1.2, (3, 2, 3)), 0.0)
    gain = np.stack((1.1 * parts.sum(axis=1), parts[:, 0], parts[:, 1]), axis=1).reshape(9, 3)
    check(with_halves(3), gain, Amount(np.full(3, 1.5)), rules)


@pytest.mark.parametrize("kind", ["amount", "temperature"])
@pytest.mark.parametrize("seed", range(40, 80))
def test_what_misses_by_less_than_the_solver_sees_is_missed(kind, seed):
    # gains in tenths less a few ten-millionths: sums that look like 1.3 lack less than the solver's tolerance
    rng = np.random.default_rng(seed)
    gain = np.round(rng.random((7, 2)), 1) * (1.0 - 3e-7 * rng.random((7, 2)))
    candidates = replace(nights(7), cost=np.round(rng.random(7) + 0.5, 1))
    if kind == "amount":
        check(candidates, gain, Amount(np.full(2, 1.3)), Rules())
    else:  # independent of the column: 0.01 of information on T each, 1.3 of which is the goal
        matrices = gain[..., None, None] * np.diag([1.0, 0.01])
        check(candidates, matrices, TemperatureError(np.full(2, np.sqrt(1.0 / 0.013))), Rules())


def visit_matrices(rng, candidates: int, bins: int) -> np.ndarray:
    """Visits with a strong and differing correlation of ln N and T: worth more together than apart."""
    slope = rng.uniform(-0.02, 0.05, (candidates, bins, 2))
    weight = rng.uniform(0.0, 40.0, (candidates, bins, 2)) * (rng.random((candidates, bins, 1)) < 0.7)
    vector = np.stack((np.ones_like(slope), slope), axis=-1)
    return np.einsum("cbk,cbki,cbkj->cbij", weight, vector, vector)


@settings(max_examples=80)
@given(st.integers(0, 10**6), st.sampled_from([np.inf, 2.0]))
def test_temperature_errors_against_all_subsets(seed, cost_max):
    gain = visit_matrices(np.random.default_rng(seed), 7, 2)
    check(nights(7), gain, TemperatureError(np.array([9.0, 14.0])), Rules(cost_max=cost_max))


def test_two_visits_far_better_together_than_apart():
    # One visit in a cold line, one in a hot line: alone neither gives T, together they do.
    cold, hot = (np.outer(v, v)[None] * 100.0 for v in (np.array([1.0, 0.002]), np.array([1.0, 0.012])))
    gain = np.stack((cold, hot))
    assert temperature_error(cold)[0] == np.inf
    assert temperature_error(hot)[0] == np.inf
    # by hand: information on T = 100 (0.002² + 0.012²) - 100² (0.014)² / 200 = 0.005
    found = cover(nights(2), gain, TemperatureError(np.array([15.0])))
    assert found.cost == 2.0
    assert found.covered.all()
    assert temperature_error(gain.sum(axis=0))[0] == pytest.approx(np.sqrt(1.0 / 0.005), rel=1e-9)


@given(st.integers(0, 10**6))
def test_visits_know_of_temperature_at_least_the_sum_of_what_each_knows(seed):
    gain = visit_matrices(np.random.default_rng(seed), 5, 1)[:, 0]
    together = np.square(1.0 / temperature_error(gain.sum(axis=0)))
    assert np.square(1.0 / temperature_error(gain)).sum() <= together * (1.0 + 1e-9)


def test_relaxation_and_greedy_both_miss_the_optimum():
    # Three bins, each pair of nights shares one bin: half of each night covers in the relaxation (1.5),
    # two whole nights are needed.
    odd = np.array([[1.0, 1.0, 0.0], [0.0, 1.0, 1.0], [1.0, 0.0, 1.0]])
    relaxed = linprog(np.ones(3), A_ub=-odd.T, b_ub=-np.ones(3), bounds=(0, 1)).fun
    assert relaxed == pytest.approx(1.5)
    assert cover(nights(3), odd, Amount(np.ones(3))).cost == 2.0
    # Greedy takes the bait (four of six bins) and then needs two more; the last two nights do it alone.
    served = [(0, 1, 2, 3), (4,), (5,), (0, 1, 4), (2, 3, 5)]
    bait = np.array([[float(b in bins) for b in range(6)] for bins in served])
    quick = greedy(nights(5), bait, Amount(np.ones(6)), Rules(), np.ones(6, dtype=bool))
    assert quick.tolist() == [1.0, 1.0, 1.0, 0.0, 0.0]
    assert cover(nights(5), bait, Amount(np.ones(6))).chosen.tolist() == [3, 4]


def season_instance(count: int = 60, bins: int = 12, depth: float = 2.0) -> tuple[Candidates, np.ndarray]:
    """Halves of nights of 10 h, rotation 17.24 h, worth falling off from the middle of the season."""
    candidates = Candidates(
        np.repeat(np.arange(count), 2),
        np.arange(2 * count) * 43200.0,
        np.arange(2 * count) * 43200.0 + HALF_S,
        np.full(2 * count, 0.5),
        np.zeros(2 * count, dtype=np.int64),
    )
    hour = 24.0 * np.arange(count)[:, None, None] + 5.0 * np.arange(2)[:, None] + np.arange(60) / 12.0
    worth = 1.0 - 0.5 * ((np.arange(count) - count / 2) / (count / 2)) ** 2
    index = np.floor(np.mod(hour / 17.24, 1.0) * bins).astype(int).reshape(2 * count, 60)
    gain = np.array([np.bincount(row, minlength=bins) for row in index]) / 12.0
    return candidates, gain * np.repeat(worth, 2)[:, None] / depth


def test_greedy_is_worse_than_the_proven_cover_of_a_season():
    candidates, gain = season_instance(depth=1.5)
    demand = Amount(np.ones(12))
    found = cover(candidates, gain, demand)
    quick = greedy(candidates, gain, demand, Rules(), np.ones(12, dtype=bool))
    relaxed = linprog(candidates.cost, A_ub=-np.minimum(gain, 1.0).T, b_ub=-np.ones(12), bounds=(0, 1)).fun
    assert found.proven
    assert relaxed + 1e-6 < found.cost < float(candidates.cost @ quick)


def test_same_answer_again_and_no_earlier_exchange():
    candidates, gain = season_instance()
    demand = Amount(np.ones(12))
    first, second = cover(candidates, gain, demand), cover(candidates, gain, demand)
    assert np.array_equal(first.chosen, second.chosen)
    for each in first.chosen:
        rest = gain[np.setdiff1d(first.chosen, each)].sum(axis=0)
        for other in np.setdiff1d(np.arange(each), first.chosen):
            assert np.any(demand.share(rest + gain[other]) < 1.0 - 1e-9)


def test_of_equally_cheap_covers_the_nights_worth_most_are_taken():
    candidates, gain = season_instance()
    worth = np.round(np.random.default_rng(2).random(gain.shape[0]), 2)
    demand = Amount(np.ones(12))
    found, plain = cover(candidates, gain, demand, worth=worth), cover(candidates, gain, demand)
    assert found.cost == plain.cost
    assert found.covered.all()
    assert worth[found.chosen].sum() > worth[plain.chosen].sum()
    for each in found.chosen:
        rest = gain[np.setdiff1d(found.chosen, each)].sum(axis=0)
        better = (worth > worth[each]) | ((worth == worth[each]) & (np.arange(worth.size) < each))
        for other in np.setdiff1d(np.flatnonzero(better), found.chosen):
            assert np.any(demand.share(rest + gain[other]) < 1.0 - 1e-9)


@pytest.mark.parametrize("seed", range(8))
def test_the_worthiest_of_the_cheapest_covers_against_all_subsets(seed):
    rng = np.random.default_rng(seed)
    gain, worth, demand = rng.random((9, 2)), rng.random(9), Amount(np.full(2, 1.7))
    found = cover(nights(9), gain, demand, worth=worth)
    alike = [list(each) for each in combinations(range(9), int(found.cost))]
    full = [each for each in alike if np.all(demand.share(gain[each].sum(axis=0)) >= 1.0)]
    assert len(full) > 1
    assert found.cost == cover(nights(9), gain, demand).cost
    assert worth[found.chosen].sum() == pytest.approx(max(worth[each].sum() for each in full), rel=1e-12)


def test_time_limit_ends_with_an_honest_gap():
    candidates, gain = season_instance(92, 36, 1.3)
    found = cover(candidates, gain, Amount(np.ones(36)), seconds=0.3)
    assert found.seconds < 5.0
    assert found.kind == "full"
    assert found.covered.all()
    assert found.cost_bound <= found.cost
    assert found.gap == pytest.approx(1.0 - found.cost_bound / found.cost)
    assert found.proven == (found.gap == 0.0)


@settings(max_examples=40)
@given(st.integers(0, 10**6))
def test_one_more_night_never_lowers_coverage(seed):
    rng = np.random.default_rng(seed)
    gain = rng.uniform(0.0, 1.0, (6, 4))
    demand, before = Amount(np.full(4, 1.2)), 0.0
    for limit in (1.0, 2.0, 3.0, 4.0):
        found = cover(nights(6), gain, demand, Rules(cost_max=limit))
        now = np.minimum(found.share, 1.0)[found.reachable].sum()
        assert now >= before - 1e-4
        before = now
    more, fewer = cover(nights(6), gain, demand), cover(nights(5), gain[:5], demand)
    assert more.reachable.sum() >= fewer.reachable.sum()
    assert more.cost <= fewer.cost or more.reachable.sum() > fewer.reachable.sum()


def test_a_resonant_planet_leaves_bins_that_no_request_reaches():
    gain = np.zeros((8, 4))
    gain[:, [0, 1]] = 1.0  # a period of one day: always the same side
    gain[:, 2] = 0.01
    found = cover(nights(8), gain, Amount(np.ones(4)))
    assert found.reachable.tolist() == [True, True, False, False]
    np.testing.assert_allclose(found.most, [8.0, 8.0, 0.08, 0.0])
    assert found.cost == 1.0
    assert found.proven


def test_a_goal_above_the_asymptote_is_never_reached():
    found = cover(nights(3), np.ones((3, 1)), Amount(np.array([np.inf])))
    assert not found.reachable.any()
    assert found.chosen.size == 0


def test_overlapping_candidates_count_once_for_what_can_be_reached():
    candidates = with_halves(1)
    gain = np.array([[1.0], [0.6], [0.6]])
    assert len(overlaps(candidates)) == 2
    assert reachable_share(candidates, gain, Amount(np.ones(1)), Rules())[0] == pytest.approx(1.2, abs=1e-9)
    matrices = gain[:, :, None, None] * np.diag([1.0, 0.01])
    most = reachable_share(candidates, matrices, TemperatureError(np.array([10.0])), Rules())
    assert most[0] == pytest.approx(1.2, rel=1e-6)


def test_two_places_may_run_at_the_same_time():
    start = np.zeros(2)
    both = Candidates(np.zeros(2, dtype=np.int64), start, start + HALF_S, np.ones(2), np.array([0, 1]))
    found = cover(both, np.eye(2), Amount(np.ones(2)))
    assert found.chosen.tolist() == [0, 1]


def test_rules_that_nothing_obeys():
    found = cover(nights(3), np.ones((3, 1)), Amount(np.ones(1)), Rules(cost_max=1.0, fixed_nights=(0, 2)))
    assert found.kind == "most"
    assert found.chosen.size == 0


@pytest.mark.parametrize(
    ("cost", "unit"), [([1.0, 0.5], 0.5), ([1.0, 1.0 / 3.0], 1.0 / 3.0), ([0.3, 0.45], 0.15), ([np.pi], 0.0)]
)
def test_unit_of_costs(cost, unit):
    assert cost_unit(np.array(cost)) == pytest.approx(unit, abs=1e-15)


def test_consecutive_and_blocks_as_words_say():
    candidates = nights(6)
    for rules, good in [
        (Rules(consecutive=True), lambda d: not d or d[-1] - d[0] == len(d) - 1),
        (Rules(block_nights=2), lambda d: d in [(), (0, 1), (2, 3), (1, 2, 3, 4), (0, 1, 4, 5)]),
    ]:
        for days in [(), (0, 1), (2, 3), (0, 2), (1, 2, 3), (1, 2, 3, 4), (0, 1, 4, 5), (5,)]:
            chosen = np.isin(np.arange(6), days).astype(float)
            assert obeys(candidates, rules, chosen) == good(days), (rules, days)


def test_every_pair_of_fixed_nights_is_kept():
    gain = np.eye(4)
    for pair in combinations(range(4), 2):
        found = cover(nights(4), gain, Amount(np.array([1.0, 0.0, 0.0, 0.0])), Rules(fixed_nights=pair))
        assert set(pair) <= set(found.chosen.tolist())
        assert found.cost == len({0, *pair})
