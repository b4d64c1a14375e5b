"""Faintest states that a visit detects: the coldest temperature, the smallest column, against time."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

from coldglow.answers.common.visit import Visit
from coldglow.errors import SaturationError
from coldglow.light.emission import COLDEST_K, HOTTEST_K
from coldglow.plan.limits import Edge, coldest_temperature, smallest_column

Array = NDArray[np.float64]

TEMPERATURES_K = 1.0 / np.linspace(1.0 / COLDEST_K, 1.0 / HOTTEST_K, 40)  # ascending
COLUMNS_M2 = np.geomspace(1e8, 1e19, 56)
NEAR = 0.02  # relative span about an interpolated edge in which the exact one lies
TINY = 1e-300


def tabulate(visit_in: Callable[[float], Visit], nodes: Array) -> tuple[Array, list[Visit]]:
    """Return the visits at the nodes (ascending in brightness) as far as the detector does not saturate.

    A state too bright for the detector is no faintest one.
    """
    found: list[Visit] = []
    for node in nodes:
        try:
            found.append(visit_in(float(node)))
        except SaturationError:
            if len(found) < 4:
                raise
            break
    return nodes[: len(found)], found


def coldest_temperatures(visit_in: Callable[[float], Visit], snr: float, open_s: ArrayLike) -> list[Edge]:
    """Return the coldest temperature detected after each time of open shutter.

    Args:
        visit_in: the visit at a temperature, the column given.
        snr: that counts as a detection.
        open_s: ndarray[time].

    """
    nodes, visits = tabulate(visit_in, TEMPERATURES_K)

    def find(measure: Callable[[Array], Array], needed: float) -> Edge:
        return coldest_temperature(measure, needed, float(nodes[0]), float(nodes[-1]))

    return _against_time(find, nodes, lambda kelvin: -1.0 / kelvin, visits, snr, open_s)


def smallest_columns(visit_in: Callable[[float], Visit], snr: float, open_s: ArrayLike) -> list[Edge]:
    """Return the smallest column detected after each time, the temperature given; arguments as above."""
    nodes, visits = tabulate(visit_in, COLUMNS_M2)

    def find(measure: Callable[[Array], Array], needed: float) -> Edge:
        return smallest_column(measure, needed, float(nodes[0]), float(nodes[-1]))

    return _against_time(find, nodes, np.log, visits, snr, open_s)


def _against_time(
    find: Callable[[Callable[[Array], Array], float], Edge],
    nodes: Array,
    abscissa: Callable[[Array], Array],
    visits: list[Visit],
    snr: float,
    open_s: ArrayLike,
) -> list[Edge]:
    """Return the edges from a spline of ln(information) over the nodes, one for each time."""
    needed, x = visits[0].demanded(snr), abscissa(nodes)
    edges = []
    for seconds in np.atleast_1d(np.asarray(open_s, dtype=float)):
        information = np.array([visit.yields(seconds)[0, 0] for visit in visits])
        spline = CubicSpline(x, np.log(np.maximum(information, TINY)))

        def measure(value: Array, spline: CubicSpline = spline) -> Array:
            return np.asarray(np.exp(spline(abscissa(value))))

        edges.append(find(measure, needed))
    return edges


def refined(edge: Edge, information: Callable[[float], float], needed: float) -> Edge:
    """Return an interpolated edge solved again with the information itself."""
    if edge.kind != "found":
        return edge

    def lacking(log_value: float) -> float:
        return float(np.log(information(float(np.exp(log_value))) / needed))

    middle = np.log(edge.value)
    root = brentq(lacking, middle - NEAR, middle + NEAR, xtol=1e-14, rtol=1e-13)
    return replace(edge, value=float(np.exp(root)))
