"""A picture of the glowing disk: column along the line of sight on a grid of pixels, and a graticule over it.

The pixel holds the *mean* of the column, integrated analytically along x: at the limb the column has a
singularity 1/sqrt that is harmless in the mean (antiderivative: arcsine). Axes and senses as in `shell`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter

from coldglow.describe.records import Figure, LongitudeSystem, Spot
from coldglow.light.shell import (
    View,
    area_per_solid_angle,
    centric_latitude,
    east_of_meridian_rad,
    spot_area,
    view_of,
)

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class DiskImage:
    """`column` ndarray[y, x]: column along the line of sight over the mean vertical column.

    `edges` are those of the pixels along x and along y, equatorial radii; the image is square. x grows
    towards the planet's celestial east, which an astronomer draws to the left.
    """

    edges: Floats
    column: Floats


@dataclass(frozen=True, slots=True)
class Graticule:
    """Projected lines on the opaque body: (value in degrees, x, y), nan where they turn out of view."""

    meridians: tuple[tuple[float, Floats, Floats], ...]  # longitude in the system, in its own sense
    parallels: tuple[tuple[float, Floats, Floats], ...]  # planetographic latitude
    outline: tuple[Floats, Floats]


def disk_image(
    figure: Figure,
    spots: Sequence[Spot],
    sub_observer_latitude_rad: float,
    sub_observer_longitude_rad: float,
    system: LongitudeSystem,
    pixels: int = 200,
    half_width: float = 1.3,
    blur_fwhm: float = 0.0,
    oversample: int = 4,
) -> DiskImage:
    """Return the picture at one moment.

    Args:
        figure: radii and height of the shell.
        spots: as for `shell.visible_points`, with longitudes in `system`.
        sub_observer_latitude_rad: planetographic.
        sub_observer_longitude_rad: in `system`.
        system: longitude system.
        pixels: along one side.
        half_width: of the picture, equatorial radii.
        blur_fwhm: Gaussian blur afterwards, equatorial radii; 0 for none.
        oversample: rows and columns computed per pixel (spots have sharp edges).

    """
    view = view_of(figure, sub_observer_latitude_rad)
    fine = np.linspace(-half_width, half_width, pixels * oversample + 1)
    x, y = 0.5 * (fine[1:] + fine[:-1]), 0.5 * (fine[1:] + fine[:-1])[:, np.newaxis]
    ux, uy = x / view.shell_equator, y / view.shell_outline_pole
    half_chord = np.sqrt(np.maximum(1.0 - uy**2, 1e-30))
    body = np.sqrt(np.maximum(1.0 - (y / view.outline_pole) ** 2, 0.0))
    step = fine[1] - fine[0]

    def mean_depth(left: Floats, right: Floats) -> Floats:
        """Return the mean of 1/|u_z| over a fine pixel, of the part of it between `left` and `right`."""
        reach = half_chord * view.shell_equator
        rise = np.arcsin(np.clip(right / reach, -1.0, 1.0)) - np.arcsin(np.clip(left / reach, -1.0, 1.0))
        return np.where(np.abs(uy) < 1.0, rise * view.shell_equator / step, 0.0)

    everything = mean_depth(fine[:-1], fine[1:])
    hidden = mean_depth(np.clip(fine[:-1], -body, body), np.clip(fine[1:], -body, body))
    uz = np.sqrt(np.maximum(1.0 - np.minimum(ux**2, half_chord**2) - uy**2, 0.0))
    column = np.zeros((y.size, x.size))
    scale = view.shell_equator * view.shell_outline_pole
    for side, depth in ((uz, everything), (-uz, everything - hidden)):
        path = depth * area_per_solid_angle(view, ux, uy, side) / scale
        column += path * _ions(view, figure, spots, x, y, side, sub_observer_longitude_rad, system)
    column = column.reshape(pixels, oversample, pixels, oversample).mean(axis=(1, 3))
    edges = fine[::oversample]
    if blur_fwhm > 0.0:
        column = gaussian_filter(column, blur_fwhm / 2.354820045 / (edges[1] - edges[0]), mode="constant")
    return DiskImage(edges, column)


def _ions(
    view: View,
    figure: Figure,
    spots: Sequence[Spot],
    x: Floats,
    y: Floats,
    uz: Floats,
    sub_observer_longitude_rad: float,
    system: LongitudeSystem,
) -> Floats:
    """Return the vertical column over its mean where lines of sight meet one side of the shell."""
    density = np.full(uz.shape, 1.0 - sum(spot.share for spot in spots))
    sin, cos = np.sin(view.tilt_rad), np.cos(view.tilt_rad)
    z = view.depth[0] * y / view.shell_outline_pole + view.depth[1] * uz
    north, toward, right = y * cos + z * sin, z * cos - y * sin, -x
    radius = np.sqrt(north**2 + toward**2 + right**2)
    for spot in spots:
        latitude = centric_latitude(figure, spot.latitude_rad)
        east = float(east_of_meridian_rad(system, spot.longitude_rad, sub_observer_longitude_rad))
        cos_distance = (
            north * np.sin(latitude) + np.cos(latitude) * (toward * np.cos(east) + right * np.sin(east))
        ) / radius
        inside = (cos_distance >= np.cos(spot.radius_rad)) & (cos_distance <= np.cos(spot.inner_radius_rad))
        area = spot_area(view, latitude, spot.radius_rad, spot.inner_radius_rad)
        density += np.where(inside, spot.share * view.shell_area / area, 0.0)
    return density


def graticule(
    figure: Figure,
    sub_observer_latitude_rad: float,
    sub_observer_longitude_rad: float,
    system: LongitudeSystem,
    step_deg: float = 30.0,
) -> Graticule:
    """Return meridians and parallels every `step_deg` on the opaque body, and its outline."""
    view = view_of(figure, sub_observer_latitude_rad)

    def project(latitude_rad: Floats, longitude_rad: Floats) -> tuple[Floats, Floats]:
        east = east_of_meridian_rad(system, longitude_rad, sub_observer_longitude_rad)
        # parametric latitude of the spheroid: tan(parametric) = (c/a) tan(graphic)
        sin, cos = view.flattened * np.sin(latitude_rad), np.cos(latitude_rad)
        across, up = cos / np.hypot(sin, cos), view.flattened * sin / np.hypot(sin, cos)
        x = -across * np.sin(east)
        y = up * np.cos(view.tilt_rad) - across * np.cos(east) * np.sin(view.tilt_rad)
        facing = cos * np.cos(east) * np.cos(view.tilt_rad) + np.sin(latitude_rad) * np.sin(view.tilt_rad)
        return np.where(facing >= 0.0, x, np.nan), np.where(facing >= 0.0, y, np.nan)

    along, around = np.linspace(-0.5 * np.pi, 0.5 * np.pi, 181), np.linspace(0.0, 2.0 * np.pi, 361)
    meridians = np.arange(0.0, 360.0, step_deg)
    parallels = np.arange(step_deg * np.ceil(-89.999 / step_deg), 90.0, step_deg)
    return Graticule(
        tuple((float(d), *project(along, np.full_like(along, np.radians(d)))) for d in meridians),
        tuple((float(d), *project(np.full_like(around, np.radians(d)), around)) for d in parallels),
        (np.cos(around), view.outline_pole * np.sin(around)),
    )
