"""Corners of the planner that ordinary questions do not reach."""

from dataclasses import replace

import numpy as np
import pytest

from coldglow.plan import insurance, reach
from coldglow.plan.cover import cover
from coldglow.plan.demand import Amount, TemperatureError
from coldglow.plan.insurance import robust_set
from coldglow.plan.limits import smallest_column
from coldglow.plan.multicover import Answer, Candidates, Model, Rules, obeys
from coldglow.plan.nights import Weather
from coldglow.plan.reach import greedy, reachable_share
from coldglow.plan.stretches import Steps, longitude_rate
from coldglow.plan.weather import count_distribution

DAY_S, HALF_S = 86400.0, 18000.0
SOMETIMES = Weather(0.6, 0.3, 300, 5)


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


def test_the_quick_answer_takes_no_forbidden_night_however_good():
    gain = np.array([[9.0], [1.0], [1.0]])
    rules = Rules(forbidden_nights=(0,), fixed_sets=((0, 1),))
    chosen = greedy(nights(3), gain, Amount(np.array([2.0])), rules, np.ones(1, dtype=bool))
    assert chosen.tolist() == [0.0, 1.0, 1.0]


def test_the_quick_answer_drops_what_turned_out_not_to_be_needed():
    # the first choice (most per cost) is made superfluous by the two that follow
    gain = np.array([[0.8, 0.8, 0.0], [1.0, 0.0, 0.5], [0.0, 1.0, 0.5]])
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


def test_out_of_time_without_a_quick_answer_nothing_is_claimed():
    rng = np.random.default_rng(5)
    gain = np.where(rng.random((120, 24)) < 0.3, rng.random((120, 24)), 0.0)
    found = cover(nights(120), gain, Amount(np.full(24, 4.0)), Rules(nights_max=100.0), seconds=1e-6)
    assert found.kind == "full"
    assert found.gap == np.inf or found.covered.all()
    assert not found.proven


class Hasty(Model):
    """A solver that is always stopped by its time with the choice of its first candidate at hand."""

    def solve(self, objective, goals, share, share_value, seconds, integral=True):
        answer = super().solve(objective, goals, share, share_value, seconds, integral)
        return replace(
            answer, chosen=np.eye(self.size)[0], share=share[1], bound=answer.bound - 1.0, ended=False
        )


class Mute(Model):
    """A solver that is stopped by its time before it finds anything."""

    def solve(self, objective, goals, share, share_value, seconds, integral=True):
        return Answer(None, np.zeros(0), -np.inf, False, False)


def test_a_choice_that_does_not_stand_up_when_time_is_out_is_dropped(monkeypatch):
    monkeypatch.setattr("coldglow.plan.cover.Model", Hasty)
    matrices = np.tile(np.diag([1.0, 0.01]), (3, 1, 1, 1))
    found = cover(nights(3), matrices, TemperatureError(np.array([6.0])), Rules(nights_max=3.0))
    assert found.chosen.size == 0
    assert found.gap == np.inf
    quick = cover(nights(3), matrices, TemperatureError(np.array([6.0])))
    assert quick.chosen.size == 3  # the quick answer in its place, unproven
    assert quick.covered.all()
    assert not quick.proven


def test_the_largest_share_out_of_time_carries_its_gap(monkeypatch):
    monkeypatch.setattr("coldglow.plan.cover.Model", Hasty)
    found = cover(nights(3), np.eye(3), Amount(np.full(3, 2.0)), Rules(cost_max=2.0))
    assert found.kind == "most"
    assert found.chosen.tolist() == [0]
    assert found.gap > 0.0
    assert not found.proven


def test_of_two_free_candidates_that_do_the_same_one_is_left_out():
    candidates = replace(nights(4), cost=np.array([0.0, 0.0, 1.0, 1.0]))
    gain = np.array([[1.0, 0.0], [1.0, 0.0], [0.0, 1.0], [0.0, 1.0]])
    found = cover(candidates, gain, Amount(np.array([1.0, 2.0])), Rules(cost_max=1.0))
    assert found.kind == "most"
    assert found.chosen.tolist() == [0, 2]
    assert found.share.tolist() == [1.0, 0.5]


def test_what_can_be_reached_of_nothing_and_of_everything():
    most = reachable_share(halved(2), np.ones((6, 3)), Amount(np.array([np.inf, 0.0, 4.0])), Rules())
    assert most.tolist() == [0.0, np.inf, pytest.approx(1.0)]  # the halves of both nights


def test_what_can_be_reached_is_never_put_too_low(monkeypatch):
    rng = np.random.default_rng(3)
    root = rng.normal(size=(9, 1, 2, 2))
    matrices = np.einsum("nbij,nbkj->nbik", root, root)
    demand = TemperatureError(np.array([1.5]))
    exact = reachable_share(halved(3), matrices, demand, Rules())
    monkeypatch.setattr(reach, "ROUNDS", 1)
    rough = reachable_share(halved(3), matrices, demand, Rules())
    monkeypatch.setattr(reach, "Model", Mute)
    unsolved = reachable_share(halved(3), matrices, demand, Rules())
    assert exact[0] < rough[0] < unsolved[0]
    assert unsolved[0] == pytest.approx(demand.share(matrices.sum(axis=0))[0])


def test_the_edge_at_a_node_is_found_whichever_way_it_is_rounded():
    nodes = np.geomspace(1e10, 1e20, 41)[1:-1]
    above = nodes[np.exp(np.log(nodes)) > nodes]
    below = nodes[np.exp(np.log(nodes)) < nodes]
    assert above.size
    assert below.size
    for node in above:  # not yet enough at the node, but at what its logarithm gives back
        edge = smallest_column(lambda column, node=node: np.where(column > node, 9.0, 1.0), 5.0)
        assert edge.value == pytest.approx(node, rel=1e-12)
    for node in below:  # just enough at the node, and no longer at what its logarithm gives back
        edge = smallest_column(lambda column, node=node: np.where(column >= node, 9.0, 1.0), 5.0)
        assert edge.value == pytest.approx(node, rel=1e-12)


def test_an_insurance_that_costs_more_than_is_left_is_no_set():
    found = robust_set(nights(2), np.ones((2, 1)), Amount(np.ones(1)), Rules(cost_max=0.5), SOMETIMES)
    assert found.chosen.size == 0
    assert (found.cost, found.probability, found.probability_error) == (0.0, 0.0, 0.0)


def test_a_fixed_night_of_the_base_is_not_taken_twice(monkeypatch):
    monkeypatch.setattr(insurance, "BRUTE_SETS", 0)
    rules = Rules(cost_max=2.0, fixed_nights=(1,))
    base = np.array([1])
    found = robust_set(nights(3), np.ones((3, 1)), Amount(np.ones(1)), rules, SOMETIMES, base)
    assert found.chosen.size == 2
    assert 1 in found.chosen
    assert found.added.size == 1
