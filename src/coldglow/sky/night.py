"""When a telescope may look: airmass, the limits as masks, and why a target cannot be observed.

The limits are those of the description; the observatory's own rules come first, above all near the Sun.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.describe.records import Limits, Orbit, Site
from coldglow.sky.clock import Floats

Mask = NDArray[np.bool_]

_WORDS = {
    "daylight": "it is not dark",
    "altitude": "the target is too low",
    "airmass": "the airmass is too large",
    "sun": "the Sun is too near",
    "moon": "the Moon is too near",
    "zenith": "the target is too near the zenith",
    "elongation": "its angle from the Sun is outside the range that the spacecraft may point to",
}


def airmass(altitude_rad: ArrayLike) -> Floats:
    """Return the relative airmass at a true (airless) altitude; nan below the horizon.

    Source: Young 1994, Appl. Opt. 33, 1108 (true zenith angle).
    """
    c = np.sin(np.asarray(altitude_rad, dtype=float))
    up = np.where(c >= 0, c, np.nan)
    return ((1.002432 * up + 0.148386) * up + 0.0096467) / (
        ((up + 0.149864) * up + 0.0102963) * up + 0.000303978
    )


def limiting_masks(
    place: Site | Orbit,
    limits: Limits,
    altitude_rad: Floats,
    sun_altitude_rad: Floats,
    solar_elongation_rad: Floats,
    moon_separation_rad: Floats,
) -> dict[str, Mask]:
    """Return for each kind of limit where it forbids, ndarray[time]; the arguments likewise."""
    never = np.zeros(solar_elongation_rad.size, dtype=bool)
    masks = dict.fromkeys(_WORDS, never)
    masks["sun"] = solar_elongation_rad < limits.sun_separation_min_rad
    masks["moon"] = moon_separation_rad < limits.moon_separation_min_rad
    if isinstance(place, Site):
        if not limits.daytime:
            masks["daylight"] = sun_altitude_rad > limits.sun_altitude_max_rad
        masks["altitude"] = altitude_rad < max(limits.altitude_min_rad, 0.0)
        masks["airmass"] = ~(airmass(altitude_rad) <= limits.airmass_max)
        masks["zenith"] = altitude_rad > limits.altitude_max_rad
    else:
        masks["elongation"] = (solar_elongation_rad < limits.elongation_min_rad) | (
            solar_elongation_rad > limits.elongation_max_rad
        )
    return masks


def allowed(masks: Mapping[str, Mask]) -> Mask:
    """Return where no limit forbids, ndarray[time]."""
    forbidden: Mask = np.logical_or.reduce(list(masks.values()))
    return ~forbidden


def why_not(masks: Mapping[str, Mask]) -> str:
    """Return in words what forbids, most frequent limit first; empty if nothing ever does.

    The shares may add up to more than 100 %, because limits overlap.
    """
    shares = {name: float(mask.mean()) for name, mask in masks.items() if mask.any()}
    if not shares:
        return ""
    names = sorted(shares, key=lambda name: -shares[name])
    return ", ".join(f"{_WORDS.get(name, name)} ({100 * shares[name]:.0f} % of the time)" for name in names)
