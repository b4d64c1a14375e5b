"""The integer programme of a cover: which candidates, under which rules.

Variables are x (candidate chosen), y (share of a bin's goal that is claimed), and, where the rules speak
of runs of nights, z (night used), s (a block starts) and r (a run starts). The rows of the goals are
handed in by the caller.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]
Row: TypeAlias = tuple[Index, Array, float, float]  # columns, weights, lowest and highest sum


@dataclass(frozen=True, slots=True)
class Candidates:
    """What can be asked for: nights, halves or stretches; every array is ndarray[candidate].

    Candidates of one place whose times overlap exclude each other (a night and its halves).
    """

    night: Index  # day number, the same scale for all places
    start_s: Array
    end_s: Array
    cost: Array
    place: Index


@dataclass(frozen=True, slots=True)
class Rules:
    """Limits on the choice. A fixed night or set has at least one chosen candidate, a forbidden one none."""

    cost_max: float = np.inf
    consecutive: bool = False  # the nights used are a single run of days
    block_nights: int = 1  # the nights used fall into runs of exactly this many
    fixed_nights: tuple[int, ...] = ()
    forbidden_nights: tuple[int, ...] = ()
    fixed_sets: tuple[tuple[int, ...], ...] = ()  # of candidates
    nights_max: float = np.inf  # different nights used


@dataclass(frozen=True, slots=True)
class Answer:
    """What the solver said; `chosen` is None where it found nothing within its limits."""

    chosen: Array | None  # ndarray[candidate], 0 or 1 (anything between in the relaxation)
    share: Array  # ndarray[bin]
    bound: float  # no choice has a lower objective
    infeasible: bool
    ended: bool  # False: stopped by a limit


def allowed(candidates: Candidates, rules: Rules) -> NDArray[np.bool_]:
    """Candidates outside the forbidden nights, ndarray[candidate]."""
    return ~np.isin(candidates.night, rules.forbidden_nights)


def cost_unit(cost: Array) -> float:
    """Largest amount of which every cost is a whole multiple; 0 where there is none above 1/1000."""
    parts = [Fraction(float(c)).limit_denominator(1000) for c in np.unique(cost)]
    if any(abs(float(part) - c) > 1e-12 for part, c in zip(parts, np.unique(cost), strict=True)):
        return 0.0
    below = lcm(*(part.denominator for part in parts))
    return gcd(*(int(part * below) for part in parts)) / below


def overlaps(candidates: Candidates) -> list[Index]:
    """Find the sets of candidates of which at most one can be chosen: all at one place at one moment.

    In sets of intervals these cliques describe the exclusions completely (the matrix is totally
    unimodular), so the continuous relaxation loses nothing by them.
    """
    found: set[tuple[int, ...]] = set()
    for place in np.unique(candidates.place):
        here = np.flatnonzero(candidates.place == place)
        start, end = candidates.start_s[here], candidates.end_s[here]
        for moment in np.unique(start):
            running = here[(start <= moment) & (moment < end)]
            if running.size > 1:
                found.add(tuple(running.tolist()))
    return [np.array(each) for each in sorted(found)]


def obeys(candidates: Candidates, rules: Rules, chosen: Array) -> bool:
    """Check a choice against the rules directly, without the integer programme."""
    taken = np.asarray(chosen) > 0.5
    used = np.unique(candidates.night[taken])
    length = np.diff(np.flatnonzero(np.concatenate(([True], np.diff(used) != 1, [True]))))  # of each run
    for place in np.unique(candidates.place[taken]):
        here = np.flatnonzero(taken & (candidates.place == place))
        here = here[np.argsort(candidates.start_s[here], kind="stable")]
        if np.any(candidates.start_s[here][1:] < candidates.end_s[here][:-1]):
            return False
    return bool(
        candidates.cost[taken].sum() <= rules.cost_max + 1e-9 * abs(rules.cost_max)
        and np.isin(rules.fixed_nights, used).all()
        and not np.isin(used, rules.forbidden_nights).any()
        and all(taken[list(some)].any() for some in rules.fixed_sets)
        and used.size <= rules.nights_max
        and (used.size == 0 or not rules.consecutive or length.size == 1)
        and (used.size == 0 or np.all(length % rules.block_nights == 0))
    )


class Model:
    """Variables x, y, z, s, r in this order, the rows that the rules put on them, and the solver call.

    r marks the rise of z (first night of a run). z, s and r exist only where the rules speak of runs or
    count nights.
    """

    def __init__(self, candidates: Candidates, rules: Rules, bins: int) -> None:
        """Write the rules down; goals come with `solve`."""
        self.candidates, self.rules, self.bins = candidates, rules, bins
        self.size = candidates.night.size
        self.nights = np.arange(candidates.night.min(), candidates.night.max() + 1)
        runs = rules.consecutive or rules.block_nights > 1 or bool(np.isfinite(rules.nights_max))
        self.width = self.size + bins + (3 * self.nights.size if runs else 0)
        self.rows: list[Row] = []
        for together in overlaps(candidates):
            self.rows.append((together, np.ones(together.size), -np.inf, 1.0))
        for night in rules.fixed_nights:
            here = np.flatnonzero(candidates.night == night)
            self.rows.append((here, np.ones(here.size), 1.0, np.inf))
        for some in rules.fixed_sets:
            self.rows.append((np.array(some), np.ones(len(some)), 1.0, np.inf))
        if np.isfinite(rules.cost_max):
            most = rules.cost_max + 1e-9 * abs(rules.cost_max)
            self.rows.append((np.arange(self.size), candidates.cost, -np.inf, most))
        if runs:
            self._run_rows()

    def _run_rows(self) -> None:
        """Tie nights used to their candidates, to blocks, to a single rise, and to their number."""
        length, count = self.rules.block_nights, self.nights.size
        z, s, r = self.size + self.bins + np.arange(3 * count).reshape(3, count)
        for i, night in enumerate(self.nights):
            here = np.flatnonzero(self.candidates.night == night)
            minus = np.append(np.ones(here.size), -1.0)
            self.rows.append((np.append(here, z[i]), minus, 0.0, np.inf))  # z <= sum of x
            for each in here:
                self.rows.append((np.array([each, z[i]]), np.array([1.0, -1.0]), -np.inf, 0.0))  # x <= z
            if length > 1:  # used exactly when one block that holds the night starts
                starts = s[max(i - length + 1, 0) : i + 1]
                equal = np.append(np.ones(starts.size), -1.0)
                self.rows.append((np.append(starts, z[i]), equal, 0.0, 0.0))
                if i + length > count:
                    self.rows.append((s[i : i + 1], np.ones(1), 0.0, 0.0))  # no block beyond the end
            if self.rules.consecutive:
                before = z[i - 1 : i] if i else z[:0]
                columns = np.concatenate((z[i : i + 1], r[i : i + 1], before))
                weights = np.array([1.0, -1.0, -1.0])[: columns.size]
                self.rows.append((columns, weights, -np.inf, 0.0))  # z rises only where r says so
        if self.rules.consecutive:
            self.rows.append((r, np.ones(count), -np.inf, 1.0))
        if np.isfinite(self.rules.nights_max):
            self.rows.append((z, np.ones(count), -np.inf, self.rules.nights_max))

    def solve(
        self,
        objective: Array,
        goals: list[Row],
        share: tuple[Array, Array],
        share_value: Array,
        seconds: float,
        integral: bool = True,
    ) -> Answer:
        """Minimise objective . x + share_value . y.

        Args:
            objective: ndarray[candidate].
            goals: rows over x and y of the goals met so far.
            share: lower and upper bound ndarray[bin] of y.
            share_value: ndarray[bin].
            seconds: time limit.
            integral: False solves the continuous relaxation.

        """
        value = np.zeros(self.width)
        value[: self.size + self.bins] = np.concatenate((objective, share_value))
        low, high = np.zeros(self.width), np.ones(self.width)
        high[: self.size] = allowed(self.candidates, self.rules)
        low[self.size : self.size + self.bins], high[self.size : self.size + self.bins] = share
        whole = np.ones(self.width)
        whole[self.size : self.size + self.bins] = 0.0
        options: dict[str, Any] = {"mip_rel_gap": 0.0, "time_limit": max(seconds, 0.1)}
        found = milp(
            value,
            integrality=whole if integral else None,
            bounds=Bounds(low, high),
            constraints=_constraint(self.rows + goals, self.width),
            options=options,
        )
        bound = found.mip_dual_bound if integral and found.mip_dual_bound is not None else found.fun
        chosen = None
        if found.x is not None:
            chosen = np.asarray(found.x[: self.size])
        return Answer(
            chosen=np.round(chosen) if chosen is not None and integral else chosen,
            share=np.zeros(0) if chosen is None else found.x[self.size : self.size + self.bins],
            bound=-np.inf if bound is None else float(bound),
            infeasible=found.status == 2,
            ended=found.status in (0, 2),
        )


def _constraint(rows: list[Row], width: int) -> LinearConstraint | tuple[()]:
    if not rows:
        return ()
    columns = np.concatenate([row[0] for row in rows])
    weights = np.concatenate([row[1] for row in rows])
    begin = np.cumsum([0] + [row[0].size for row in rows])
    # HiGHS counts in 32 bits; older releases of SciPy do not convert
    indices, starts = np.asarray(columns, dtype=np.int32), np.asarray(begin, dtype=np.int32)
    matrix = csr_array((weights, indices, starts), shape=(len(rows), width))
    return LinearConstraint(matrix, [row[2] for row in rows], [row[3] for row in rows])
