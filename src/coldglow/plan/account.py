"""The time account of a request: where its hours go."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike


@dataclass(frozen=True, slots=True)
class TimeAccount:
    """Clock time of a request by purpose; the four parts sum to `total_s`. Nights are in units of cost."""

    science_s: float  # open shutter on the units that the goal needs when all is clear
    overhead_s: float  # acquisition, readout, nods, standards on those
    calibration_s: float
    weather_s: float  # all time of the further units
    total_s: float
    nights_needed: float
    nights_weather: float
    nights_total: float


def time_account(
    clock_s: ArrayLike,
    shutter_s: ArrayLike,
    calibration_s: ArrayLike,
    cost: ArrayLike,
    needed: ArrayLike,
) -> TimeAccount:
    """Add up the units of a request.

    Args:
        clock_s: ndarray[unit], clock time of each requested unit.
        shutter_s: ndarray[unit], open shutter in it.
        calibration_s: ndarray[unit], calibration in it.
        cost: ndarray[unit], in nights.
        needed: ndarray[unit], True for the units that the goal needs when clear.

    """
    clock, shutter, calibration, nights = (
        np.asarray(each, dtype=float) for each in (clock_s, shutter_s, calibration_s, cost)
    )
    need = np.asarray(needed, dtype=bool)
    science, calibrating, needed_s = shutter[need].sum(), calibration[need].sum(), clock[need].sum()
    return TimeAccount(
        science_s=float(science),
        overhead_s=float(needed_s - science - calibrating),
        calibration_s=float(calibrating),
        weather_s=float(clock[~need].sum()),
        total_s=float(clock.sum()),
        nights_needed=float(nights[need].sum()),
        nights_weather=float(nights[~need].sum()),
        nights_total=float(nights.sum()),
    )
