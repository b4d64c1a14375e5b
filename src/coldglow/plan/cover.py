"""The smallest choice of nights that covers a rotation, proven; or the choice that covers most.

The goals of the bins become rows of an integer programme (`multicover`), are solved with no gap allowed,
and the choice is then evaluated exactly: where rounding or a temperature error (which is not linear,
see `demand`) leaves a bin short, a row that forbids just this is added and the programme solved again.
Every programme solved on the way is a relaxation, so its bound holds for the whole question.

Among choices of equal cost an early one is taken: no chosen night can be exchanged for an earlier one of
the same cost without losing the cover.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from time import monotonic
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from coldglow.plan.demand import Amount, Demand
from coldglow.plan.multicover import Answer, Candidates, Model, Row, Rules, allowed, cost_unit, obeys
from coldglow.plan.reach import greedy, reachable_share, total_of

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]

NO_RULES = Rules()
REACHED = 1.0 - 1e-9  # share that counts as reached: only rounding may be missing
ROUNDING = 1e-5  # a share missing by less may be the solver's tolerance, no row of weights can mend it
GRID = 2.0**-19  # weights of a full cover are rounded up to it: wider than the solver's tolerance of 1e-6
GAP_ROUNDING = 1e-9  # relative difference of cost and bound that is rounding


@dataclass(frozen=True, slots=True)
class Cover:
    """The choice, its proof, and what it leaves undone; arrays over bins are ndarray[bin]."""

    kind: Literal["full", "most"]  # full: every reachable bin; most: largest covered share within the rules
    chosen: Index  # candidates in order of time
    cost: float
    cost_bound: float  # no full cover costs less
    gap: float  # of the cost, or of the covered share for kind "most"; 0 = proven
    proven: bool
    share: Array  # what the choice gathers, as share of the goal
    covered: NDArray[np.bool_]
    reachable: NDArray[np.bool_]
    most: Array  # share of the goal that all candidates together could gather
    seconds: float


class _Question:
    """One instance with the rows found so far."""

    def __init__(self, candidates: Candidates, gain: Array, demand: Demand, rules: Rules) -> None:
        self.gain, self.demand, self.size = gain, demand, candidates.night.size
        self.linear = isinstance(demand, Amount)
        self.model = Model(candidates, rules, gain.shape[1])
        self.goals: list[Row] = []  # hold for any share that is claimed
        self.cuts: list[Row] = []  # hold where the whole goal is claimed
        start = total_of(gain, np.ones(self.size))
        self.add_rows(start, np.ones(gain.shape[1], dtype=bool))
        if not self.linear:
            self.add_rows(np.zeros_like(start), np.ones(gain.shape[1], dtype=bool))

    def share(self, chosen: Array) -> Array:
        return self.demand.share(total_of(self.gain, chosen))

    def add_rows(self, total: Array, where: NDArray[np.bool_]) -> None:
        """Add the inequality that is tightest at a total; one candidate counts as the whole at most."""
        weights = np.minimum(self.demand.rows(self.gain, total), 1.0)
        for b in np.flatnonzero(where):
            columns = np.flatnonzero(weights[b] > 0.0)
            row = np.append(weights[b, columns], -1.0)
            self.goals.append((np.append(columns, self.size + b), row, 0.0, np.inf))

    def forbid(self, chosen: Array, where: NDArray[np.bool_]) -> None:
        """Ask for one more helper of each bin that the choice leaves short by rounding."""
        for b in np.flatnonzero(where):
            helps = self.gain[:, b] if self.linear else self.gain[:, b, 1, 1]
            columns = np.flatnonzero((helps > 0.0) & (chosen < 0.5))
            self.cuts.append((columns, np.ones(columns.size), 1.0, np.inf))

    def settle(self, objective: Array, aim: NDArray[np.bool_], full: bool, end: float) -> Answer:
        """Solve until the choice stands up to evaluation.

        `full` claims the whole goal of the bins aimed at; otherwise shares of them are claimed freely and
        their sum is maximised. A choice that does not stand up when a limit ends the search is dropped.
        """
        bounds = (aim.astype(float) * full, aim.astype(float))
        value = np.zeros(aim.size) if full else -aim.astype(float)
        while True:
            rows = [_rounded_up(row) for row in self.goals] + self.cuts if full else self.goals
            answer = self.model.solve(objective, rows, bounds, value, end - monotonic())
            if answer.chosen is None:
                return answer
            share = self.share(answer.chosen)
            missing = np.where(aim, answer.share - np.minimum(share, 1.0), 0.0)
            rounding = ROUNDING + GRID * float(answer.chosen.sum()) * full
            short = missing > (1.0 - REACHED if full else rounding)
            bend = short & (missing > rounding) & (not self.linear)
            if not full and self.linear:
                return answer
            if not short.any():
                return answer
            if not answer.ended:
                return replace(answer, chosen=None)
            self.add_rows(total_of(self.gain, answer.chosen), bend)
            self.forbid(answer.chosen, short & ~bend)


def _rounded_up(goal: Row) -> Row:
    """Write the row of a goal on the grid: sums are then equal or differ by more than the solver's tolerance.

    Sums that differ from the goal by less can lead the solver's presolve to call a dearer choice the cheapest
    (`test_what_misses_by_less_than_the_solver_sees_is_missed`). Rounded up, the row only promises more than
    there is; what does not stand up to evaluation is cut off.
    """
    columns, weights, low, high = goal
    return columns, np.append(np.ceil(weights[:-1] / GRID) * GRID, weights[-1]), low, high


def cover(
    candidates: Candidates,
    gain: Array,
    demand: Demand,
    rules: Rules = NO_RULES,
    seconds: float = 60.0,
    worth: Array | None = None,
) -> Cover:
    """Choose the cheapest candidates that reach the goal in every bin that can be reached.

    Of the full covers that cost no more, the one worth most is taken, and in any choice no candidate can be
    exchanged for one of the same cost that is worth more, or as much and earlier.

    Where the rules (a limit on nights, runs of nights) leave no full cover, the choice of the largest sum
    of those bins' shares min(got/goal, 1) is made instead. Where no bin can be reached at all, the shares
    of all bins count, if there is a limit on the cost; without one nothing is chosen.

    Args:
        candidates: what can be asked for.
        gain: ndarray[candidate, bin] for an amount, ndarray[candidate, bin, 2, 2] for a temperature error.
        demand: goal per bin.
        rules: limits on the choice.
        seconds: time limit; a choice that could not be proven by then carries its gap.
        worth: ndarray[candidate], decides between equally good choices; default: all are worth the same.

    Returns:
        The choice; `chosen` is empty where nothing helps or nothing was found.

    """
    begin = monotonic()
    question = _Question(candidates, gain, demand, rules)
    most = reachable_share(candidates, gain, demand, rules)
    reachable = most >= REACHED
    kind: Literal["full", "most"] = "full"
    hopeless = not reachable.any() and bool(np.isfinite(rules.cost_max))
    chosen, bound, gap = _full(question, reachable, begin + seconds)
    if bound == np.inf or hopeless:
        kind, bound = "most", np.inf
        chosen, gap = _most(question, reachable | hopeless, begin + seconds)
    if gap == 0.0:
        if worth is not None and kind == "full":
            chosen = _worthiest(question, chosen, worth, reachable, begin + seconds)
        chosen = _tidy(question, chosen, np.zeros(question.size) if worth is None else worth)
    share = question.share(chosen)
    taken = np.flatnonzero(chosen > 0.5)
    return Cover(
        kind=kind,
        chosen=taken[np.lexsort((candidates.place[taken], candidates.start_s[taken]))],
        cost=float(candidates.cost @ chosen),
        cost_bound=bound,
        gap=gap,
        proven=gap == 0.0,
        share=share,
        covered=share >= REACHED,
        reachable=reachable,
        most=most,
        seconds=monotonic() - begin,
    )


def _full(question: _Question, wanted: NDArray[np.bool_], end: float) -> tuple[Array, float, float]:
    """Cheapest full cover of the wanted bins, the bound of its cost (inf: there is none), and the gap."""
    cost = question.model.candidates.cost
    unit = cost_unit(cost)
    answer = question.settle(cost, wanted, True, end)
    if answer.infeasible:
        return np.zeros(cost.size), np.inf, 0.0
    bound = max(np.ceil(answer.bound / unit - 1e-6) * unit if unit else answer.bound, 0.0)
    chosen = answer.chosen
    if not answer.ended:
        quick = greedy(
            question.model.candidates, question.gain, question.demand, question.model.rules, wanted
        )
        if quick is not None and (chosen is None or cost @ quick < cost @ chosen):
            chosen = quick
    if chosen is None:
        return np.zeros(cost.size), bound, np.inf
    gap = max(1.0 - bound / float(cost @ chosen), 0.0) if cost @ chosen > 0.0 else 0.0
    gap = gap if gap > GAP_ROUNDING else 0.0
    return chosen, float(bound), float(gap)


def _worthiest(
    question: _Question, chosen: Array, worth: Array, wanted: NDArray[np.bool_], end: float
) -> Array:
    """Full cover of the largest worth that costs no more than the chosen one; that one if time runs out."""
    cost = question.model.candidates.cost
    most = float(cost @ chosen)
    question.cuts.append((np.arange(cost.size), cost, -np.inf, most + 1e-9 * most))
    answer = question.settle(-worth, wanted, True, end)
    return answer.chosen if answer.ended and answer.chosen is not None else chosen


def _most(question: _Question, aim: NDArray[np.bool_], end: float) -> tuple[Array, float]:
    """Choice of the largest covered share within the rules, and the relative gap of that share."""
    size = question.size
    answer = question.settle(np.zeros(size), aim, False, end)
    if answer.chosen is None:  # no choice obeys the rules (gap 0), or none was found in time
        return np.zeros(size), 0.0 if answer.infeasible else np.inf
    got = float(np.minimum(question.share(answer.chosen), 1.0)[aim].sum())
    gap = max(-answer.bound - got, 0.0) / got if got > 0.0 else float(-answer.bound > ROUNDING)
    return answer.chosen, gap if gap > ROUNDING else 0.0


def _tidy(question: _Question, chosen: Array, worth: Array) -> Array:
    """Leave out what adds nothing, exchange for what costs as much and is worth more (or is earlier).

    Neither lowers the covered share of any bin's goal below what it was (or 1), nor breaks a rule.
    """
    candidates, gain, rules = question.model.candidates, question.gain, question.model.rules
    least = np.minimum(question.share(chosen), REACHED)
    order = np.lexsort((candidates.place, candidates.start_s, -worth))
    position = np.empty(order.size)
    position[order] = np.arange(order.size)
    free = allowed(candidates, rules)
    now, before = chosen.copy(), np.zeros_like(chosen)
    while not np.array_equal(now, before):
        before = now.copy()
        for each in order[::-1][before[order[::-1]] > 0.5]:
            rest = total_of(gain, now) - gain[each]
            now[each] = 0.0
            if np.all(question.demand.share(rest) >= least) and obeys(candidates, rules, now):
                continue
            good = np.all(question.demand.share(rest + gain) >= least, axis=1) & free & (now < 0.5)
            good &= (candidates.cost == candidates.cost[each]) & (position < position[each])
            for other in order[good[order]]:
                now[other] = 1.0
                if obeys(candidates, rules, now):
                    break
                now[other] = 0.0
            else:
                now[each] = 1.0
    return now
