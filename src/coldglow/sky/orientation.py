"""How a planet is turned: pole, prime meridian, and the points below the observer and the Sun.

Directions are geometric at the time when the light left the planet's centre, without stellar aberration.
Latitudes are planetographic at the centre of the disk; longitudes grow in the sense of their system.

Source: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22 (form of the expressions, section 2).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from coldglow.describe.records import Figure, LongitudeSystem, Rotation
from coldglow.sky.clock import DAY_S, Floats
from coldglow.sky.vectors import dot

_CENTURY_S = 36525.0 * DAY_S


@dataclass(frozen=True, slots=True)
class Axes:
    """The body's pole, the node of its equator on the ICRF equator, and the meridian's angle from there."""

    pole: Floats  # ndarray[time, xyz], ICRS axes
    node: Floats  # ndarray[time, xyz]
    meridian_rad: Floats  # ndarray[time]: W, not reduced


def body_axes(rotation: Rotation, system: LongitudeSystem, tdb_s: Floats) -> Axes:
    """Return the axes of a body at instants ndarray[time], TDB seconds from J2000."""
    century = np.asarray(tdb_s, dtype=float) / _CENTURY_S
    ra = rotation.pole_ra_rad[0] + rotation.pole_ra_rad[1] * century
    dec = rotation.pole_dec_rad[0] + rotation.pole_dec_rad[1] * century
    meridian = system.prime_meridian_rad + system.rate_rad_s * np.asarray(tdb_s, dtype=float)
    for term in rotation.terms:
        angle = term.angle_rad + term.rate_rad_century * century
        sin = np.sin(angle)
        ra = ra + term.ra_rad * sin
        dec = dec + term.dec_rad * np.cos(angle)
        meridian = meridian + term.meridian_rad * sin
    cos_ra, sin_ra, cos_dec = np.cos(ra), np.sin(ra), np.cos(dec)
    pole = np.stack([cos_dec * cos_ra, cos_dec * sin_ra, np.sin(dec)], axis=-1)
    node = np.stack([-sin_ra, cos_ra, np.zeros_like(ra)], axis=-1)
    return Axes(pole, node, meridian)


def sub_point(
    axes: Axes, direction: Floats, figure: Figure, system: LongitudeSystem
) -> tuple[Floats, Floats]:
    """Return longitude (0 .. 2 pi) and planetographic latitude below a direction, ndarray[time].

    `direction` is ndarray[time, xyz] from the planet's centre, ICRS axes, any length.
    """
    along_node = dot(direction, axes.node)
    along_third = dot(direction, np.cross(axes.pole, axes.node))
    centric = np.arctan2(dot(direction, axes.pole), np.hypot(along_node, along_third))
    east = np.arctan2(along_third, along_node) - axes.meridian_rad
    longitude = -east if system.grows == "west" else east
    return longitude % (2 * np.pi), planetographic_rad(centric, figure)


def planetographic_rad(centric_rad: ArrayLike, figure: Figure) -> Floats:
    """Return the planetographic latitude g of a planetocentric one c: tan g = (a/c)^2 tan c."""
    a2, c2 = figure.equatorial_radius_m**2, figure.polar_radius_m**2
    return np.arctan2(a2 * np.sin(centric_rad), c2 * np.cos(centric_rad))


def planetocentric_rad(graphic_rad: ArrayLike, figure: Figure) -> Floats:
    """Return the planetocentric latitude: the inverse of `planetographic_rad`."""
    a2, c2 = figure.equatorial_radius_m**2, figure.polar_radius_m**2
    return np.arctan2(c2 * np.sin(graphic_rad), a2 * np.cos(graphic_rad))


def position_angle_rad(pole: Floats, direction: Floats) -> Floats:
    """Return the angle of a pole from north through east, 0 .. 2 pi, at a direction in the same axes.

    Both are ndarray[time, xyz]; the direction is a unit vector from observer to planet.
    """
    east = direction[:, 0] * pole[:, 1] - direction[:, 1] * pole[:, 0]
    north = pole[:, 2] - dot(pole, direction) * direction[:, 2]
    return np.arctan2(east, north) % (2 * np.pi)


def phase_uncertainty_rad(system: LongitudeSystem, interval_s: ArrayLike) -> Floats:
    """Return the 1-sigma uncertainty of a longitude after an interval: 2 pi dt sigma_P / P^2.

    For an absolute longitude the interval runs from the tie epoch of the system, for the difference of two
    visits from one to the other. Above half a turn the longitude is unknown.
    """
    return 2 * np.pi * np.abs(interval_s) * system.period_uncertainty_s / system.period_s**2


def absolute_phase_uncertainty_rad(system: LongitudeSystem, tdb_s: ArrayLike) -> Floats:
    """Return `phase_uncertainty_rad` from the tie epoch of the system to TDB seconds from J2000."""
    return phase_uncertainty_rad(system, np.asarray(tdb_s, dtype=float) - system.tie_epoch_s)


def in_system_rad(
    longitude_rad: ArrayLike, system: LongitudeSystem, other: LongitudeSystem, tdb_s: ArrayLike
) -> Floats:
    """Return longitudes of one system of a body in another of its systems, at TDB seconds from J2000.

    The pole is common to both, so only the meridians' angles differ.
    """
    tdb_s = np.asarray(tdb_s, dtype=float)
    ahead = (
        other.prime_meridian_rad - system.prime_meridian_rad + (other.rate_rad_s - system.rate_rad_s) * tdb_s
    )
    east = -np.asarray(longitude_rad) if system.grows == "west" else np.asarray(longitude_rad)
    east = east - ahead
    return np.asarray((-east if other.grows == "west" else east) % (2 * np.pi))
