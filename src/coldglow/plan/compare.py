"""Which instrument does it best: a plain ranking of results."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

Index: TypeAlias = NDArray[np.int64]

DIGITS = 9  # values that agree to so many digits are equal: the next criterion decides


def ranking(*criteria: ArrayLike) -> Index:
    """Order of results, best first, by criteria of falling weight, smaller is better.

    `inf` ("never") and nan (not known) come last; results equal in everything keep their order.

    Args:
        criteria: each ndarray[result], for instance nights needed, time to the goal, -SNR of one night.

    Returns:
        ndarray[result] of indices.

    """
    if not criteria:
        raise ValueError("a ranking needs at least one criterion")
    keys = []
    for criterion in criteria:
        value = np.asarray(criterion, dtype=float)
        value = np.where(np.isnan(value), np.inf, value)
        keys.append(np.array([float(f"{each:.{DIGITS}g}") for each in value]))
    return np.asarray(np.lexsort(tuple(reversed(keys))), dtype=np.int64)
