"""What a longitude bin (or a whole target) must gather, and how far a sum of visits has come.

Two kinds: an amount (information for an SNR goal, seconds for a goal in minutes), which is linear, and a
temperature error, which is not. Both answer with a share: 1 = reached. `rows` writes "share >= 1" as
linear inequalities over candidates: one for an amount; for a temperature error one of infinitely many.
With F the sum of the marginalised 2 x 2 matrices, the information on T with N free is

    J(F) = F11 - F01**2/F00 = min over a of (F11 - 2 a F01 + a**2 F00),

so J >= d means that the linear inequality holds for *every* a; the tightest at F has a = F01/F00. Adding
those inequalities where a choice breaks them solves the non-linear goal exactly. (The sum of what each visit
knows of T by itself would be a safe bound, but two visits can be worth far more together than apart.)

Source: the minimum over a is the generalised Schur complement as a variational problem, Boyd &
Vandenberghe 2004, Convex Optimization, appendix A.5.5; the method is the cutting-plane method of Kelley
1960, J. Soc. Indust. Appl. Math. 8, 703.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.plan.goal import marginalise, temperature_error, with_floor

Array: TypeAlias = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Amount:
    """A sum to be reached in each bin: `demand` ndarray[bin], in the unit of the gains; inf = never.

    `by_clock` marks time: a clear night yields all of it, however good or poor its conditions.
    """

    demand: Array
    by_clock: bool = False

    def share(self, total: Array) -> Array:
        """Share of the demand that ndarray[..., bin] reaches; 1 and more is reached."""
        some = self.demand > 0.0
        return np.where(some, total / np.where(some, self.demand, 1.0), np.inf)

    def rows(self, gain: Array, total: Array) -> Array:
        """Weights ndarray[bin, candidate] whose sum over the chosen must be at least 1."""
        return self.share(gain).T


@dataclass(frozen=True, slots=True)
class TemperatureError:
    """A 1-sigma error of T to be reached in each bin: `goal_k` ndarray[bin]; gains are 2 x 2 matrices."""

    goal_k: Array

    def share(self, total: Array) -> Array:
        """Share of the information on T that ndarray[..., bin, 2, 2] reaches, N free."""
        return np.asarray(np.square(self.goal_k / temperature_error(total)))

    def rows(self, gain: Array, total: Array) -> Array:
        """Weights ndarray[bin, candidate] of the inequality that is tightest at the total of the bins."""
        known = total[:, 0, 0] > 0.0
        a = np.where(known, total[:, 0, 1] / np.where(known, total[:, 0, 0], 1.0), 0.0)
        weight = gain[..., 1, 1] - 2.0 * a * gain[..., 0, 1] + a * a * gain[..., 0, 0]
        return np.maximum(weight * np.square(self.goal_k), 0.0).T


Demand: TypeAlias = Amount | TemperatureError


def snr_gain(matrix: ArrayLike, visit_floor: ArrayLike = 0.0) -> Array:
    """Gain ndarray[candidate, bin] toward an SNR goal: information on ln N of each visit, with its floor.

    Args:
        matrix: ndarray[candidate, bin, 4, 4] per visit and bin, nuisances still in it.
        visit_floor: relative error of one visit, a number or ndarray[candidate, 1].

    """
    return with_floor(marginalise(matrix)[..., 0, 0], visit_floor)
