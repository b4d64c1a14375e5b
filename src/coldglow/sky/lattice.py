"""Interpolation between nodes that lie on a fixed lattice in time.

The polynomials are local (cubic Hermite: value and rate at the two nodes around an instant) and the lattice
does not depend on the instants asked for, so a piece of a grid gives the same numbers as the whole.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.sky.clock import Floats

_AROUND = 2  # nodes on either side that the derivative at a node needs


@dataclass(frozen=True, slots=True)
class Lattice:
    """Nodes around given instants, at whole multiples of the step."""

    step_s: float
    tt_s: Floats  # ndarray[node]
    left: NDArray[np.int64]  # ndarray[time]: node before the instant
    part: Floats  # ndarray[time]: 0 .. 1 from that node to the next

    def value(self, values: Floats, rates: Floats) -> Floats:
        """Return the cubic Hermite value at the instants of quantities ndarray[node, ...]."""
        return self._horner(self._coefficients(values, rates))

    def rate(self, values: Floats, rates: Floats) -> Floats:
        """Return the derivative per second at the instants of the same polynomials."""
        _, b, c, d = self._coefficients(values, rates)
        return self._horner((b / self.step_s, 2 * c / self.step_s, 3 * d / self.step_s))

    def slope(self, values: Floats) -> Floats:
        """Return the derivative per second at the nodes from five nodes each (not at the outer ones)."""
        return (
            8 * (np.roll(values, -1, 0) - np.roll(values, 1, 0))
            - (np.roll(values, -2, 0) - np.roll(values, 2, 0))
        ) / (12 * self.step_s)

    def _horner(self, coefficients: tuple[Floats, ...]) -> Floats:
        """Return the polynomials at the instants, coefficients ndarray[node, ...] from the lowest power."""
        part = self.part.reshape(-1, *(1,) * (coefficients[0].ndim - 1))
        result: Floats = coefficients[-1].take(self.left, axis=0)
        for coefficient in coefficients[-2::-1]:
            result *= part
            result += coefficient.take(self.left, axis=0)
        return result

    def _coefficients(self, values: Floats, rates: Floats) -> tuple[Floats, Floats, Floats, Floats]:
        """Return the four coefficients of the polynomial that begins at each node."""
        change = np.roll(values, -1, 0) - values
        begin, end = self.step_s * rates, self.step_s * np.roll(rates, -1, 0)
        return values, begin, 3 * change - 2 * begin - end, begin + end - 2 * change


def lattice(tt_s: Floats, step_s: float) -> Lattice:
    """Return the nodes around the instants ndarray[time]; gaps between distant instants hold none."""
    number = np.floor(tt_s / step_s)
    first = int(number.min()) - _AROUND
    offset = (number - first).astype(np.int64)
    used = np.zeros(int(offset.max()) + _AROUND + 2, dtype=bool)
    for shift in range(-_AROUND, _AROUND + 2):
        used[offset + shift] = True
    position = np.cumsum(used) - 1
    nodes = step_s * (first + np.flatnonzero(used)).astype(np.float64)
    return Lattice(step_s, nodes, position[offset], tt_s / step_s - number)
