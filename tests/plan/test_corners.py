"""Corners of the planner that ordinary questions do not reach."""

import numpy as np
import pytest

from coldglow.plan.cover import cover
from coldglow.plan.demand import Amount
from coldglow.plan.multicover import Candidates, Model, Rules, obeys
from coldglow.plan.reach import greedy
from coldglow.plan.stretches import Steps, longitude_rate
from coldglow.plan.weather import count_distribution

DAY_S, HALF_S = 86400.0, 18000.0


def nights(count):
    day = np.arange(count)
    return Candidates(day, day * DAY_S, day * DAY_S + HALF_S, np.ones(count), np.zeros(count, dtype=np.int64))


def halved(count):
    """Each night as a whole, and its halves at 0.6 each."""
    day = np.repeat(np.arange(count), 3)
    kind = np.tile([0, 1, 2], count)
    start = day * DAY_S + np.where(kind == 2, HALF_S, 0.0)
    end = day * DAY_S + np.where(kind == 1, HALF_S, 2.0 * HALF_S)
    return Candidates(day, start, end, np.where(kind == 0, 1.0, 0.6), np.zeros(day.size, dtype=np.int64))


def test_no_night_asked_for_is_no_clear_night():
    assert count_distribution([], 0.7).tolist() == [1.0]


def test_a_single_step_knows_no_rate_of_longitude():
    one = np.ones(1)
    steps = Steps(one, 60.0, one > 0, np.zeros(1, dtype=np.int64), np.zeros((1, 4, 4)), *[one] * 5)
    assert longitude_rate(steps).tolist() == [0.0]


def test_a_question_without_rules_or_goals_chooses_nothing():
    model = Model(nights(3), Rules(), 0)
    empty = np.zeros(0)
    answer = model.solve(np.ones(3), [], (empty, empty), empty, 5.0)
    assert answer.chosen.tolist() == [0.0, 0.0, 0.0]


@pytest.mark.parametrize("rules", [Rules(consecutive=True), Rules(block_nights=2), Rules(nights_max=2.0)])
def test_the_quick_answer_knows_no_runs_and_numbers_of_nights(rules):
    gain = np.eye(3)
    assert greedy(nights(3), gain, Amount(np.ones(3)), rules, np.ones(3, dtype=bool)) is None


def test_the_quick_answer_gives_up_where_nothing_helps_or_it_costs_too_much():
    gain, wanted = np.eye(3), np.ones(3, dtype=bool)
    assert greedy(nights(3), gain, Amount(np.array([1.0, 1.0, 2.0])), Rules(), wanted) is None
    assert greedy(nights(3), gain, Amount(np.ones(3)), Rules(cost_max=2.0), wanted) is None


def test_the_quick_answer_takes_fixed_nights_and_never_a_night_with_its_halves():
    candidates = halved(3)
    gain = np.tile([[1.0], [0.5], [0.5]], (3, 1))
    rules = Rules(fixed_nights=(2,), fixed_sets=((0, 1),))
    chosen = greedy(candidates, gain, Amount(np.array([2.0])), rules, np.ones(1, dtype=bool))
    assert obeys(candidates, rules, chosen)
    assert float(chosen @ gain[:, 0]) >= 2.0


def test_the_quick_answer_drops_what_turned_out_not_to_be_needed():
    # the first choice (most per cost) is made superfluous by the two that follow
    gain = np.array([[0.6, 0.6, 0.0], [1.0, 0.0, 0.5], [0.0, 1.0, 0.5]])
    chosen = greedy(nights(3), gain, Amount(np.ones(3)), Rules(), np.ones(3, dtype=bool))
    assert chosen.tolist() == [0.0, 1.0, 1.0]


def test_out_of_time_the_quick_answer_stands_with_an_honest_gap():
    rng = np.random.default_rng(5)
    count, bins = 120, 24
    gain = np.where(rng.random((count, bins)) < 0.3, rng.random((count, bins)), 0.0)
    found = cover(nights(count), gain, Amount(np.full(bins, 4.0)), seconds=1e-6)
    assert found.kind == "full"
    assert found.covered.all()
    assert not found.proven
    assert found.gap > 0.0
    assert found.cost_bound <= found.cost
