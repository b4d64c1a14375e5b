"""The glowing shell as a distant observer sees it: points with weights that stand for its light.

A thin, optically thin shell of vertical column N: an element dS of its surface sends N dS towards every
observer who sees it. So the integral runs over the *surface* of the shell instead of the plane of the sky,
where the column along the line of sight has a singularity at the limb that this never meets. Seen are the
whole near side and that part of the far side whose line of sight misses the opaque body.

Body and shell are spheroids with the same axis, the shell higher by h along both half-axes. In the frame of
the observer (x to the planet's celestial east, y along the projected north pole, z towards the observer) the
shell is an affine image of the unit sphere whose own outline is the circle z = 0, so nodes in (z, angle) of
that sphere follow the limb.

Senses: x grows towards position angle P + 90 deg, y towards position angle P, with P the position angle of
the north pole; east and north offsets on the sky are x cos P + y sin P and y cos P - x sin P.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.describe.records import Figure, LongitudeSystem, Spot
from coldglow.errors import RangeError
from coldglow.sky.orientation import planetocentric_rad

Floats = NDArray[np.float64]

SPACING = 0.08  # equatorial radii; about 1500 points, for beams and blurs not much smaller than the disk


@dataclass(frozen=True, slots=True)
class ShellPoints:
    """Points of the visible shell, ndarray[point].

    `x`, `y` in equatorial radii of the opaque body; `weight` is the column along the line of sight
    integrated over the projected area that the point stands for, per unit of the mean vertical column, in
    squared equatorial radii; `velocity_m_s` the rotation along the line of sight, positive receding.
    """

    x: Floats
    y: Floats
    weight: Floats
    velocity_m_s: Floats

    @property
    def total(self) -> float:
        """Return the visible light: sum of the weights."""
        return float(self.weight.sum())


@dataclass(frozen=True, slots=True)
class View:
    """Body and shell in units of the equatorial radius, seen from planetocentric latitude `tilt_rad`."""

    flattened: float  # polar over equatorial radius of the body
    shell_equator: float
    shell_pole: float
    tilt_rad: float
    outline_pole: float  # half-axis of the body's outline along y (that along x is 1)
    shell_outline_pole: float
    depth: tuple[float, float]  # z of the shell = depth[0] * u_y + depth[1] * u_z

    @property
    def shell_area(self) -> float:
        """Return the area of the whole shell (spheroid, numerically; squared equatorial radii)."""
        return _spheroid_area(self.shell_equator, self.shell_pole)


@lru_cache(maxsize=256)
def _spheroid_area(equator: float, pole: float) -> float:
    """Return the area of a spheroid by Gauss-Legendre integration over the cosine of the latitude circle."""
    mu, share = np.polynomial.legendre.leggauss(64)
    stretch = np.sqrt(pole**2 * (1.0 - mu**2) + equator**2 * mu**2)
    return float(2.0 * np.pi * equator * (share @ stretch))


def view_of(figure: Figure, sub_observer_latitude_rad: float) -> View:
    """Return the view from a *planetographic* sub-observer latitude."""
    a, c, h = figure.equatorial_radius_m, figure.polar_radius_m, figure.shell_height_m
    flattened, equator, pole = c / a, 1.0 + h / a, (c + h) / a
    tilt = float(planetocentric_rad(sub_observer_latitude_rad, figure))
    sin, cos = np.sin(tilt), np.cos(tilt)
    outline = float(np.hypot(flattened * cos, sin))
    shell_outline = float(np.hypot(pole * cos, equator * sin))
    depth = ((pole**2 - equator**2) * sin * cos / shell_outline, equator * pole / shell_outline)
    return View(flattened, equator, pole, tilt, outline, shell_outline, depth)


def _far_side_edge(view: View, ux: Floats, uy: Floats) -> Floats:
    """Return |u_z| on the far side below which a line of sight misses the body, for directions (ux, uy)."""
    reach2 = (view.shell_equator * ux) ** 2 + (view.shell_outline_pole / view.outline_pole * uy) ** 2
    return np.sqrt(np.maximum(1.0 - 1.0 / reach2, 0.0))


def _area_per_solid_angle(view: View, ux: Floats, uy: Floats, uz: Floats) -> Floats:
    """Return dS of the shell per solid angle of the unit sphere: det(M) |M^-T u| of the affine map M."""
    a, p = view.shell_equator, view.shell_outline_pole
    shear, depth = view.depth
    return a * p * depth * np.sqrt((ux / a) ** 2 + ((uy - shear / depth * uz) / p) ** 2 + (uz / depth) ** 2)


@lru_cache(maxsize=32)
def _nodes(count: int) -> tuple[Floats, Floats]:
    """Return Gauss-Legendre nodes and weights on 0..1."""
    node, share = np.polynomial.legendre.leggauss(count)
    return 0.5 * (node + 1.0), 0.5 * share


def uniform_points(view: View, spacing: float = SPACING) -> tuple[Floats, Floats, Floats]:
    """Return x, y and weight of a shell of vertical column 1 everywhere, points about `spacing` apart."""
    around = max(16, round(2.0 * np.pi / spacing))
    angle = 2.0 * np.pi * (np.arange(around) + 0.5) / around
    cos, sin = np.cos(angle)[:, np.newaxis], np.sin(angle)[:, np.newaxis]
    edge = _far_side_edge(view, cos, sin)
    near, near_share = _nodes(max(6, round(1.3 / spacing)))
    far, far_share = _nodes(max(3, round(0.5 / spacing)))
    uz = np.concatenate([np.broadcast_to(near, (around, near.size)), -edge * far], axis=1)
    share = np.concatenate([np.broadcast_to(near_share, (around, near.size)), edge * far_share], axis=1)
    radius = np.sqrt(1.0 - uz**2)
    ux, uy = radius * cos, radius * sin
    weight = share * (2.0 * np.pi / around) * _area_per_solid_angle(view, ux, uy, uz)
    return (view.shell_equator * ux).ravel(), (view.shell_outline_pole * uy).ravel(), weight.ravel()


@dataclass(frozen=True, slots=True)
class _SpotNodes:
    """Directions from the planet's centre that cover a spot, and the area of the shell each stands for.

    Axes: `right` (celestial west), `toward` the sub-observer meridian in the equator, `north` along the axis.
    """

    right: Floats
    toward: Floats
    north: Floats
    area: Floats
    size_rad: float


def _spot_nodes(
    view: View, latitude_rad: float, east_rad: float, outer_rad: float, inner_rad: float, count: int
) -> _SpotNodes:
    """Return points on the shell: Gauss-Legendre in the cosine of the distance, even steps around."""
    aspect = (outer_rad - inner_rad) / (np.pi * (outer_rad + inner_rad))
    rings = max(2, round(np.sqrt(count * aspect)))
    around = max(8, round(count / rings))
    node, share = _nodes(rings)
    depth = np.cos(inner_rad) - np.cos(outer_rad)
    cos_distance = (np.cos(inner_rad) - depth * node)[:, np.newaxis]
    sin_distance = np.sqrt(1.0 - cos_distance**2)
    turn = 2.0 * np.pi * np.arange(around) / around
    sin, cos = np.sin(latitude_rad), np.cos(latitude_rad)
    outward = cos_distance * cos - sin_distance * np.cos(turn) * sin
    north = cos_distance * sin + sin_distance * np.cos(turn) * cos
    sideways = sin_distance * np.sin(turn)
    toward = outward * np.cos(east_rad) - sideways * np.sin(east_rad)
    right = outward * np.sin(east_rad) + sideways * np.cos(east_rad)
    a, c = view.shell_equator, view.shell_pole
    across2 = outward**2 + sideways**2
    radius = 1.0 / np.sqrt(across2 / a**2 + north**2 / c**2)
    # area per solid angle of the direction: radius^2 over the cosine between radius and normal
    area = radius**4 * np.sqrt(across2 / a**4 + north**2 / c**4)
    area *= share[:, np.newaxis] * depth * 2.0 * np.pi / around
    return _SpotNodes(radius * right, radius * toward, radius * north, area, (outer_rad - inner_rad) / rings)


def spot_points(
    view: View, latitude_rad: float, east_rad: float, outer_rad: float, inner_rad: float, count: int = 300
) -> tuple[Floats, Floats, Floats]:
    """Return x, y and weight of a spot that holds all ions of the shell, evenly spread over its area.

    Args:
        view: the view.
        latitude_rad: *planetocentric* latitude of the middle.
        east_rad: longitude of the middle from the sub-observer meridian, right-handed about the north pole.
        outer_rad: radius of the spot, seen from the planet's centre.
        inner_rad: inner radius (an oval), 0 for a full spot.
        count: about how many points cover the spot.

    """
    spot = _spot_nodes(view, latitude_rad, east_rad, outer_rad, inner_rad, count)
    sin, cos = np.sin(view.tilt_rad), np.cos(view.tilt_rad)
    x = -spot.right
    y = spot.north * cos - spot.toward * sin
    z = spot.north * sin + spot.toward * cos
    ux, uy = x / view.shell_equator, y / view.shell_outline_pole
    uz = (z - view.depth[0] * uy) / view.depth[1]
    # a point on the far side fades over its own size where the body begins to hide it
    flat = np.maximum(np.hypot(ux, uy), 1e-12)
    seen = np.clip(0.5 + (uz + _far_side_edge(view, ux / flat, uy / flat)) / spot.size_rad, 0.0, 1.0)
    weight = view.shell_area * spot.area / spot.area.sum() * seen
    return x.ravel(), y.ravel(), weight.ravel()


def _east_of_meridian_rad(
    system: LongitudeSystem, longitude_rad: ArrayLike, sub_observer_longitude_rad: ArrayLike
) -> Floats:
    """Return how far a longitude lies from the sub-observer meridian, right-handed about the north pole."""
    sense = 1.0 if system.grows == "east" else -1.0
    ahead: Floats = sense * np.subtract(longitude_rad, sub_observer_longitude_rad, dtype=np.float64)
    return ahead


def visible_points(
    figure: Figure,
    spots: Sequence[Spot],
    sub_observer_latitude_rad: float,
    sub_observer_longitude_rad: float,
    system: LongitudeSystem,
    spacing: float = SPACING,
) -> ShellPoints:
    """Return the points of the visible shell at one moment.

    Args:
        figure: radii and height of the shell.
        spots: what turns with the body; the rest of the ions lies evenly over the shell.
        sub_observer_latitude_rad: planetographic.
        sub_observer_longitude_rad: in `system`.
        system: longitude system of the spots, and the rate of rotation.
        spacing: distance between points in equatorial radii. The total is exact with any; a beam or blur
            finer than the points is not: half an arcsecond on Jupiter wants 0.02.

    Raises:
        RangeError: a spot is given in another longitude system.

    """
    view = view_of(figure, sub_observer_latitude_rad)
    x, y, weight = uniform_points(view, spacing)
    parts = [(x, y, weight * (1.0 - sum(spot.share for spot in spots)))]
    for spot in spots:
        if spot.system not in ("", system.name):
            raise RangeError(
                f"the spot {spot.name!r} has its longitude in the system {spot.system!r} but the view is in "
                f"{system.name!r}; turn the longitude into that system first",
                "emission.spots",
            )
        east = _east_of_meridian_rad(system, spot.longitude_rad, sub_observer_longitude_rad)
        middle = float(planetocentric_rad(spot.latitude_rad, figure))
        solid_angle = 2.0 * np.pi * (np.cos(spot.inner_radius_rad) - np.cos(spot.radius_rad))
        count = max(300, round(solid_angle / spacing**2))
        x, y, weight = spot_points(view, middle, float(east), spot.radius_rad, spot.inner_radius_rad, count)
        seen = weight > 0.0
        parts.append((x[seen], y[seen], spot.share * weight[seen]))
    x, y, weight = (np.concatenate(column) for column in zip(*parts, strict=True))
    speed = rotation_speed_m_s(figure, system, view.tilt_rad)
    return ShellPoints(x, y, weight, -speed * x)


def rotation_speed_m_s(figure: Figure, system: LongitudeSystem, tilt_rad: float) -> float:
    """Return by how much the line-of-sight velocity falls per equatorial radius of x (positive receding).

    Rigid rotation: velocity = -rate * cos(sub-observer latitude) * x * radius; the celestial east limb of a
    planet that turns with its north pole (positive rate) approaches.
    """
    return system.rate_rad_s * figure.equatorial_radius_m * float(np.cos(tilt_rad))


def path_factor(figure: Figure, sub_observer_latitude_rad: float) -> float:
    """Return the mean column along the line of sight over the disk, per vertical column of an even shell.

    For the spheroid, all light of the visible shell over the area of the opaque disk. The closed form for
    the sphere (`describe.column`) differs by up to 1.6 % for Uranus and Neptune; for Saturn the spheroid has
    5 % more in the plane of the equator and 7 % less over the pole.

    Args:
        figure: radii and height of the shell.
        sub_observer_latitude_rad: planetographic.

    """
    view = view_of(figure, sub_observer_latitude_rad)
    return float(uniform_points(view)[2].sum() / (np.pi * view.outline_pole))
