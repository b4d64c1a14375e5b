"""How a planet's rotation meets the day: advance of the central longitude, and resonances.

A fixed window of each day sees the central longitude advance by 360 deg * day/period from one day to the
next, less whole turns; where n days are close to m turns, n nights show n stretches and then the same
again. Rotation periods: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22 (tests work with them).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.constants import day as DAY_S

TURN = 2.0 * np.pi


@dataclass(frozen=True, slots=True)
class Resonance:
    """Days that are nearly whole turns; the central longitude lands `drift_rad` ahead of where it was."""

    nights: int
    turns: int
    drift_rad: float


def advance_per_day_rad(period_s: float) -> float:
    """Advance of the central longitude at the same clock time from one day to the next, 0 ... 2 pi."""
    return float(TURN * np.mod(DAY_S / abs(period_s), 1.0))


def closest_resonance(period_s: float, nights_max: int) -> Resonance:
    """Find the number of days up to `nights_max` that is closest to whole turns, the smallest of equal ones.

    The drift is how far the central longitude lands from where it was, -pi ... pi, positive ahead.
    """
    nights = np.arange(1, nights_max + 1)
    turns = nights * DAY_S / abs(period_s)
    whole = np.round(turns)
    miss = turns - whole
    best = int(np.argmin(np.round(np.abs(miss), 12)))
    return Resonance(int(nights[best]), int(whole[best]), float(TURN * miss[best]))
