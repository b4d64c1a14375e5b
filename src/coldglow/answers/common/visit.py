"""One visit at one moment: what it yields against time, and how long it must last for each goal."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

from coldglow.describe.records import Goal, Operation
from coldglow.detect.integration import clock_time, open_shutter_time
from coldglow.detect.systematics import SystematicErrors
from coldglow.plan.goal import (
    column_error,
    demanded_information,
    marginalise,
    required_snr,
    snr,
    temperature_error,
    without_floor,
)
from coldglow.report import words

Array = NDArray[np.float64]

LONGEST_S = 1e15  # open shutter; what a prior alone holds back for so long is never reached


@dataclass(frozen=True, slots=True)
class Visit:
    """`matrix` ndarray[4, 4] per second of open shutter, `prior` ndarray[4, 4] known beforehand."""

    matrix: Array
    prior: Array
    shutter_share: float  # open shutter per second of clock time
    operation: Operation
    shortest_s: float = 0.0  # open shutter of the shortest visit: the cycle of exposures that makes sense

    def yields(self, open_s: ArrayLike) -> Array:
        """Return the information on (ln N, T) after times of open shutter, ndarray[..., 2, 2]."""
        return marginalise(np.asarray(open_s, dtype=float)[..., None, None] * self.matrix + self.prior)

    def snr(self, open_s: ArrayLike) -> Array:
        """Return SNR = 1/sigma(ln N) at fixed temperature, floors applied."""
        return snr(self.yields(open_s)[..., 0, 0], self.operation.visit_floor, self.operation.common_floor)

    def clock_s(self, open_s: ArrayLike) -> Array:
        """Return the time on the clock, overheads included."""
        return clock_time(np.asarray(open_s), np.array(self.shutter_share), self.operation)

    def open_s(self, clock_s: ArrayLike) -> Array:
        """Return the open shutter that a time on the clock leaves, 0 if it is all overhead."""
        return open_shutter_time(np.asarray(clock_s), np.array(self.shutter_share), self.operation)

    def demanded(self, snr: float) -> float:
        """Return the information on ln N that an SNR asks of one visit; inf where the floors forbid it."""
        common = demanded_information(snr, self.operation.common_floor)
        return float(without_floor(common, self.operation.visit_floor))

    def time_to(self, measure: Callable[[Array], Array], wanted: float) -> float:
        """Return the open shutter after which `measure` of what is yielded reaches `wanted`.

        `measure` takes ndarray[2, 2] and grows in proportion to it. Without a prior that is a proportion in
        time as well. No visit is shorter than the shortest one.
        """
        return max(self._time_to(measure, wanted), self.shortest_s)

    def _time_to(self, measure: Callable[[Array], Array], wanted: float) -> float:
        if not np.isfinite(wanted) or not float(measure(self.yields(1.0))) > 0.0:
            return np.inf
        if not self.prior.any():
            return float(wanted / measure(self.yields(1.0)))
        if float(measure(self.yields(LONGEST_S))) < wanted:
            return np.inf

        def lacking(log_s: float) -> float:
            return float(measure(self.yields(np.exp(log_s)))) / wanted - 1.0

        begin, end = np.log(1e-6), np.log(LONGEST_S)
        return float(np.exp(brentq(lacking, begin, end, xtol=1e-12))) if lacking(begin) < 0.0 else 0.0


@dataclass(frozen=True, slots=True)
class Need:
    """Time of one visit that reaches one goal, open shutter and clock (inf: never), and that in words."""

    name: str
    open_s: float
    clock_s: float
    text: str


def told_after_s(wanted: Sequence[Need]) -> float:
    """Return the open shutter after which errors are told: when all that can be reached is, or an hour."""
    return max((need.open_s for need in wanted if np.isfinite(need.open_s)), default=3600.0)


def needs(goal: Goal, visit: Visit, systematic: Callable[[float], SystematicErrors]) -> tuple[Need, ...]:
    """Return what each goal of a request needs; goals in errors are on the random error.

    `systematic` gives the errors from elsewhere for a time of open shutter.
    """
    found = []
    if goal.snr is not None:
        found.append(_snr_need(goal.snr, goal.probability, visit))
    if goal.temperature_error_k is not None:
        wanted = goal.temperature_error_k
        open_s = visit.time_to(lambda matrix: temperature_error(matrix) ** -2.0, wanted**-2.0)
        fixed = systematic(open_s).temperature_total_k
        beyond = f"{words.number(fixed, 2)} K" if fixed > wanted else ""
        found.append(_error_need("temperature", f"{words.short(wanted)} K", beyond, open_s, visit))
    if goal.column_error is not None:
        wanted = goal.column_error
        open_s = visit.time_to(lambda matrix: column_error(matrix) ** -2.0, wanted**-2.0)
        fixed = systematic(open_s).column_total
        beyond = words.percent(fixed) if fixed > wanted else ""
        found.append(_error_need("column", f"{words.short(100.0 * wanted)} %", beyond, open_s, visit))
    return tuple(found)


def _snr_need(goal: float, probability: float, visit: Visit) -> Need:
    wanted, shown = required_snr(goal, probability), f"SNR {words.short(goal)}"
    open_s = visit.time_to(lambda matrix: matrix[..., 0, 0], visit.demanded(wanted))
    clock_s = float(visit.clock_s(open_s))
    text = f"{shown} is reached in {words.duration(clock_s)}"
    if 0.0 < open_s <= visit.shortest_s:
        text += f", the shortest visit there is (expected SNR {words.number(float(visit.snr(open_s)))})"
    elif probability != 0.5:
        chance = words.probability(probability)
        text += f" with probability {chance} (expected SNR {words.number(wanted)})"
    if not np.isfinite(open_s):
        floor = float(np.hypot(visit.operation.visit_floor, visit.operation.common_floor))
        dark = not visit.matrix[0, 0] > 0.0
        why = (
            "no light of these lines arrives" if dark else f"the floors end at SNR {words.number(1 / floor)}"
        )
        text = f"{shown} is never reached: {why}"
    return Need("time_to_goal", open_s, clock_s, text)


def _error_need(kind: str, shown: str, beyond: str, open_s: float, visit: Visit) -> Need:
    clock_s = float(visit.clock_s(open_s))
    text = f"The {kind} is known to ± {shown} (random) in {words.duration(clock_s)}"
    if 0.0 < open_s <= visit.shortest_s:
        text += " (the shortest visit there is)"
    if not np.isfinite(open_s):
        text = f"The {kind} is never known to ± {shown}: these lines alone do not give it"
    elif beyond:
        text += (
            f", but the systematic error of ± {beyond} is larger than that, and more time lowers it little"
        )
    return Need(f"time_to_{kind}_error", open_s, clock_s, text)
