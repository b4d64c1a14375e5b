"""Faintest things that can be detected: coldest temperature, smallest column.

Numbers only. A `measure` is any vectorised function that grows with what is detected (the SNR for a given
time, or the information per second), and `needed` the value of it that counts as a detection.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

Floats = NDArray[np.float64]
Measure = Callable[[Floats], Floats]

COLDEST_K, HOTTEST_K = 150.0, 1500.0  # the span of the line list
SMALLEST_M2, LARGEST_M2 = 1e10, 1e20


@dataclass(frozen=True, slots=True)
class Edge:
    """Where detection begins.

    `kind` is "found"; "below" when all of the span is detectable, `value` then being its lower end; or
    "none" when nothing of it is, `value` then being nan. `low` and `high` are the span that was searched.
    """

    value: float
    kind: Literal["found", "below", "none"]
    low: float
    high: float


def coldest_temperature(
    measure: Measure, needed: float, low_k: float = COLDEST_K, high_k: float = HOTTEST_K
) -> Edge:
    """Return the lowest temperature in K at which `measure` reaches `needed`.

    `measure` takes and returns ndarray[temperature]. At a fixed column a line grows with temperature only up
    to some 1000 K, where the partition function takes over; so the span is scanned from its cold end and
    the first rise to `needed` is the answer. Scanned and solved in 1/T, in which ln I is nearly straight.
    """
    nodes = 1.0 / np.linspace(1.0 / low_k, 1.0 / high_k, 64)
    nodes[0], nodes[-1] = low_k, high_k
    return _first_rise(measure, needed, nodes, lambda value: 1.0 / value)


def smallest_column(
    measure: Measure, needed: float, low_m2: float = SMALLEST_M2, high_m2: float = LARGEST_M2
) -> Edge:
    """Return the smallest column in m^-2 at which `measure` reaches `needed`.

    `measure` takes and returns ndarray[column]. The SNR is linear in N only while the background makes the
    noise, so this is a root in ln N, whatever the regime.
    """
    nodes = np.geomspace(low_m2, high_m2, 41)
    nodes[0], nodes[-1] = low_m2, high_m2
    return _first_rise(measure, needed, nodes, np.exp, np.log)


def _first_rise(
    measure: Measure,
    needed: float,
    nodes: Floats,
    back: Callable[[float], float],
    forth: Callable[[float], float] | None = None,
) -> Edge:
    """Return the first rise of `measure` to `needed` along the nodes, solved in the variable forth(value)."""
    forth = back if forth is None else forth
    low, high = float(nodes[0]), float(nodes[-1])
    enough = np.asarray(measure(nodes)) >= needed
    if not enough.any():
        return Edge(np.nan, "none", low, high)
    first = int(np.argmax(enough))
    if first == 0:
        return Edge(low, "below", low, high)

    def lacking(variable: float) -> float:
        value = float(np.asarray(measure(np.array([back(variable)])))[0])
        return value / needed - 1.0

    before, after = forth(nodes[first - 1]), forth(nodes[first])
    if lacking(before) >= 0.0:  # at a node, rounding may see from either side what is exactly needed
        return Edge(float(nodes[first - 1]), "found", low, high)
    if lacking(after) <= 0.0:
        return Edge(float(nodes[first]), "found", low, high)
    root = brentq(lacking, before, after, xtol=1e-300, rtol=1e-14, maxiter=200)
    return Edge(float(back(root)), "found", low, high)
