"""From Fisher matrices to what an observer asks: SNR, errors of T and N, and what goals demand.

A matrix holds the information on theta = (ln N, T, continuum level, wavelength zero). The last two are
nuisances of one *visit* (one night in one setting): matrices of time steps add up to the matrix of their
visit, the visit is marginalised, and only then do visits add. Floors enter when a visit is evaluated,
never inside a matrix.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtri

Array: TypeAlias = NDArray[np.float64]

LOST = 1e-12  # a pivot below this share of its diagonal is rounding error: that parameter is not measured


def marginalise(matrix: ArrayLike, keep: int = 2) -> Array:
    """Remove the nuisances of each visit from its matrix by the Schur complement.

    The nuisances are eliminated one at a time, F <- F - F[:,k] F[k,:] / F[k,k]. A nuisance without
    information of its own is dropped (its row is zero then, as the matrix is positive semidefinite). What
    elimination leaves of a kept parameter, when it is rounding error only, is set to zero: a parameter
    that cannot be told from a nuisance has no information, not a little.

    Args:
        matrix: ndarray[..., parameter, parameter], symmetric, nuisances last.
        keep: number of leading parameters that stay.

    Returns:
        ndarray[..., keep, keep].

    Source: Schur complement of the Fisher matrix, Tegmark, Taylor & Heavens 1997, ApJ 480, 22, section 2.

    """
    rest = np.array(matrix, dtype=float)
    whole = np.einsum("...ii->...i", rest).copy()
    for k in range(rest.shape[-1] - 1, keep - 1, -1):
        pivot = rest[..., k, k]
        inverse = np.where(pivot > LOST * whole[..., k], 1.0 / np.where(pivot > 0.0, pivot, 1.0), 0.0)
        row = rest[..., k, :k]
        rest = rest[..., :k, :k] - row[..., :, None] * row[..., None, :] * inverse[..., None, None]
    for i in range(keep):
        lost = rest[..., i, i] <= LOST * whole[..., i]
        rest[..., i, :] = np.where(lost[..., None], 0.0, rest[..., i, :])
        rest[..., :, i] = np.where(lost[..., None], 0.0, rest[..., :, i])
    return rest


def with_floor(information: ArrayLike, floor: ArrayLike) -> Array:
    """Limit an information 1/sigma² by a relative error that does not average down: 1/(1/I + f²)."""
    information = np.asarray(information, dtype=float)
    return np.asarray(information / (1.0 + information * np.square(floor)))


def without_floor(information: ArrayLike, floor: ArrayLike) -> Array:
    """Return the information that gives `information` after the floor; inf where nothing can."""
    information = np.asarray(information, dtype=float)
    finite = np.isfinite(information)
    rest = np.where(finite, 1.0 - np.where(finite, information, 0.0) * np.square(floor), 0.0)
    return np.where(rest > 0.0, information / np.where(rest > 0.0, rest, 1.0), np.inf)


def snr(information: ArrayLike, visit_floor: ArrayLike = 0.0, common_floor: ArrayLike = 0.0) -> Array:
    """SNR = 1/sigma(ln N) at fixed temperature of one visit, 1/SNR² = 1/I + f_visit² + f_common².

    Independent visits average their own floors, sum of I_v' = 1/(1/I_v + f_visit²); nothing averages the
    common one.

    Args:
        information: ndarray[...], of ln N, marginalised.
        visit_floor: relative error of one visit.
        common_floor: relative error common to all visits.

    Returns:
        ndarray[...].

    """
    return np.asarray(np.sqrt(with_floor(with_floor(information, visit_floor), common_floor)))


def _error(matrix: ArrayLike, wanted: int) -> Array:
    matrix = np.asarray(matrix, dtype=float)
    own, other = matrix[..., wanted, wanted], matrix[..., 1 - wanted, 1 - wanted]
    shared = np.square(matrix[..., 0, 1])
    rest = own - np.where(other > 0.0, shared / np.where(other > 0.0, other, 1.0), 0.0)
    good = rest > LOST * own
    return np.where(good, 1.0 / np.sqrt(np.where(good, rest, 1.0)), np.inf)


def temperature_error(matrix: ArrayLike) -> Array:
    """1-sigma error of T in K, column free, from ndarray[..., 2, 2]; inf where T is not measured."""
    return _error(matrix, 1)


def column_error(matrix: ArrayLike) -> Array:
    """1-sigma error of ln N (a fraction), temperature free; inf where N is not measured."""
    return _error(matrix, 0)


def correlation(matrix: ArrayLike) -> Array:
    """Correlation of the errors of ln N and T, -F01/sqrt(F00 F11); nan where one has no information."""
    matrix = np.asarray(matrix, dtype=float)
    scale = np.sqrt(matrix[..., 0, 0] * matrix[..., 1, 1])
    return np.where(scale > 0.0, -matrix[..., 0, 1] / np.where(scale > 0.0, scale, 1.0), np.nan)


def required_snr(goal: float, probability: float) -> float:
    """Return the expected SNR at which the *measured* one reaches the goal with the wanted probability.

    The measured SNR scatters by 1 about its expectation, so this is goal + z(probability) with z the
    standard normal quantile: with expectation = goal the measurement reaches it half of the time. Where
    a small probability would ask for less than nothing, 0.
    """
    return max(goal + float(ndtri(probability)), 0.0)


def demanded_information(goal_snr: ArrayLike, common_floor: ArrayLike = 0.0) -> Array:
    """Sum of the visits' information that an SNR asks for; inf above the asymptote 1/f_common."""
    return without_floor(np.square(np.asarray(goal_snr, dtype=float)), common_floor)
