"""Averages of a sampled curve under a Gaussian that moves over it, tabulated for interpolation.

Places are counted in samples; each sample is the middle of a cell in which the curve is constant.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.lib.stride_tricks import as_strided
from numpy.typing import NDArray
from scipy.special import ndtr

Floats = NDArray[np.float64]

FWHM_PER_SIGMA = 2.0 * np.sqrt(2.0 * np.log(2.0))  # of a Gaussian
REACH = 5.0  # of the Gaussian, standard deviations; beyond it lie 6e-7 of its area


@dataclass(frozen=True, slots=True)
class Shifts:
    """Evenly spaced shifts: `per_sample` of them go on one sample, `samples` samples are covered."""

    first: float
    per_sample: int
    samples: int

    @property
    def nodes(self) -> Floats:
        """Return all shifts, ndarray[shift]."""
        return self.first + np.arange(self.samples * self.per_sample) / self.per_sample


def shift_nodes(shift: Floats, width: float) -> Shifts:
    """Return nodes that cover the given shifts, at most half the width of the narrowest line apart.

    The average over the line is smooth on that scale: a cubic spline through the nodes is good to 1e-4.
    """
    per_sample = int(np.clip(np.ceil(2.0 / width), 1, 8))
    low, high = float(shift.min()) - 1.0 / per_sample, float(shift.max()) + 1.0 / per_sample
    nodes = max(int(np.ceil((high - low) * per_sample)) + 1, 4)
    return Shifts(low, per_sample, -(-nodes // per_sample))


def nodes_and_weights(value: Floats, count: int) -> tuple[Floats, Floats]:
    """Return nodes and Lagrange weights ndarray[value, node]; few distinct values are nodes themselves."""
    distinct, which = np.unique(value, return_inverse=True)
    if distinct.size <= count:
        return distinct, np.eye(distinct.size)[which]
    angle = np.pi * (np.arange(count) + 0.5) / count
    middle, half = 0.5 * (distinct[0] + distinct[-1]), 0.5 * (distinct[-1] - distinct[0])
    node = middle - half * np.cos(angle)
    return node, lagrange_weights(node, value)


def lagrange_weights(node: Floats, value: Floats) -> Floats:
    """Return the weights ndarray[value, node] of the polynomial through the nodes, by Lagrange's formula.

    (The interpolator of the large library orders its nodes by chance, so its last digits change from run to
    run; at a handful of nodes the plain products are as good.)
    """
    apart = node[:, np.newaxis] - node
    np.fill_diagonal(apart, 1.0)
    factors = (value[:, np.newaxis, np.newaxis] - node) / apart  # [value, node j, node k]
    own = np.arange(node.size)
    factors[:, own, own] = 1.0
    weights: Floats = factors.prod(axis=2)
    return weights


def window(start: float, width: float, shifts: Shifts) -> NDArray[np.int_]:
    """Return the samples that a Gaussian of that width needs from place `start` over all shifts."""
    reach = int(REACH * width) + 2
    first = int(np.floor(start)) - reach
    return np.arange(first, first + shifts.samples + 2 * reach + 1)


def moving_average(sample: Floats, start: float, width: float, shifts: Shifts) -> Floats:
    """Return the averages at `start` and every further shift, ndarray[shift, curve].

    The weights of the cells repeat from sample to sample, so they are computed once and laid out along the
    diagonal of a matrix.

    Args:
        sample: the curves at the samples of `window`, ndarray[sample, curve].
        start: place of the middle of the Gaussian at the first shift.
        width: standard deviation.
        shifts: how it moves on.

    """
    reach = int(REACH * width) + 2
    place = start - np.floor(start) + np.arange(shifts.per_sample)[:, np.newaxis] / shifts.per_sample
    edge = np.arange(-reach, reach + 3) - 0.5
    share = np.diff(ndtr((edge - place) / width), axis=1)
    matrix = np.zeros((shifts.samples, shifts.per_sample, sample.shape[0]))
    along, across, item = matrix.strides
    as_strided(matrix, (shifts.samples, *share.shape), (along + item, across, item))[:] = share
    average: Floats = matrix.reshape(-1, sample.shape[0]) @ sample
    return average
