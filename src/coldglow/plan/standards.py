"""Standard stars for the stretches: nearest in airmass and on the sky, before and after. Numbers only."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

# Common practice: the airmass of a telluric standard within 0.1 of the target's; 15 deg on the sky is as bad
# as 0.1 in airmass, because the air over two directions differs and the telescope has to slew.
AIRMASS_SCALE = 0.1
SEPARATION_SCALE_RAD = np.radians(15.0)


@dataclass(frozen=True, slots=True)
class Choice:
    """The best stars for each moment, best first: every array is ndarray[moment, rank].

    `star` is the index into the list of stars, -1 where no further star is up; then the airmass difference
    (star minus target) and the separation are nan.
    """

    star: Integers
    airmass_difference: Floats
    separation_rad: Floats


def separation_rad(altitude_a: Floats, azimuth_a: Floats, altitude_b: Floats, azimuth_b: Floats) -> Floats:
    """Return the angle between directions, in radians and of the broadcast shape.

    Source: Vincenty's formula for the sphere, accurate at all angles (Vincenty 1975, Survey Review 23, 88,
    with no flattening).
    """
    turn = azimuth_b - azimuth_a
    across = np.hypot(
        np.cos(altitude_b) * np.sin(turn),
        np.cos(altitude_a) * np.sin(altitude_b) - np.sin(altitude_a) * np.cos(altitude_b) * np.cos(turn),
    )
    along = np.sin(altitude_a) * np.sin(altitude_b) + np.cos(altitude_a) * np.cos(altitude_b) * np.cos(turn)
    return np.asarray(np.arctan2(across, along))


def nearest_standards(
    target_altitude_rad: Floats,
    target_azimuth_rad: Floats,
    target_airmass: Floats,
    star_altitude_rad: Floats,
    star_azimuth_rad: Floats,
    star_airmass: Floats,
    count: int = 1,
    altitude_min_rad: float = 0.0,
) -> Choice:
    """Return the stars nearest to the target in airmass and on the sky at each moment.

    Target arrays are ndarray[moment] (the starts and the ends of the stretches, say), star arrays
    ndarray[star, moment] with the airmass nan below the horizon. The measure is
    hypot(airmass difference / 0.1, separation / 15 deg); equal ones keep the order of the list.
    """
    difference = star_airmass - target_airmass
    apart = separation_rad(target_altitude_rad, target_azimuth_rad, star_altitude_rad, star_azimuth_rad)
    badness = np.hypot(difference / AIRMASS_SCALE, apart / SEPARATION_SCALE_RAD)
    barred = np.isnan(badness) | (star_altitude_rad <= altitude_min_rad)
    badness = np.where(barred, np.inf, badness)
    ranked = np.argsort(badness, axis=0, kind="stable")[:count]
    found = np.isfinite(np.take_along_axis(badness, ranked, axis=0))

    def chosen(values: Floats) -> Floats:
        return np.where(found, np.take_along_axis(values, ranked, axis=0), np.nan).T

    return Choice(
        star=np.where(found, ranked, -1).T,
        airmass_difference=chosen(difference),
        separation_rad=chosen(apart),
    )
