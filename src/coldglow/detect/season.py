"""What the opening sees at every instant of a season, from a table over what it depends on."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.constants import c
from scipy.interpolate import RegularGridInterpolator

from coldglow.describe.records import Instrument, LongitudeSystem, Setting, Target
from coldglow.detect.beam import Beam, Disk, PointSpread, join_beams, point_spacing, point_spread, see_disk
from coldglow.light.shell import ShellPoints, view_of, visible_points
from coldglow.sky.clock import DAY_S, tdb_from_tt
from coldglow.sky.orientation import in_system_rad
from coldglow.sky.track import Track

Array = NDArray[np.float64]

DATE_SPACING_S = 25 * DAY_S
LONGITUDES = 72  # with spots
FEW = 100  # up to so many instants each is looked at by itself


@dataclass(frozen=True, slots=True)
class _Geometry:
    """What the beam depends on; arrays of any one shape."""

    diameter_rad: Array
    latitude_rad: Array
    longitude_rad: Array
    pole_rad: Array
    parallactic_rad: Array
    airmass: Array


def beams(
    target: Target, instrument: Instrument, setting: Setting, track: Track, airmass: Array, seeing_rad: float
) -> Beam:
    """Return what the opening sees at every instant of a track.

    For more than a hundred instants it is worked out on a grid over what it depends on (date, airmass; the
    parallactic angle or the longitude only where they matter) and interpolated; the error is below 0.3 %
    of the light (tests/detect/test_season.py), with spots below 2 %.
    """
    geometry = _Geometry(
        track.equatorial_diameter_rad,
        track.sub_observer_latitude_rad,
        longitude_for_spots_rad(target, track),
        track.pole_angle_rad,
        np.nan_to_num(track.parallactic_angle_rad),
        airmass,
    )
    if airmass.size <= FEW:
        return _look(target, instrument, setting, track, geometry, seeing_rad)
    time_s = track.grid.time_s
    dates = int(np.clip(np.ceil(np.ptp(time_s) / DATE_SPACING_S) + 1, 2, 8))
    axes = [_axis(time_s, dates), _axis(airmass, 3 if target.emission.spots else 5)]
    where = [time_s, airmass]
    turning = instrument.opening.angle == "parallactic"
    if turning:
        axes.append(np.linspace(-np.pi, np.pi, 37))
        where.append(np.angle(np.exp(1j * geometry.parallactic_rad)))
    if target.emission.spots:
        axes.append(np.linspace(0.0, 2.0 * np.pi, LONGITUDES + 1))
        where.append(np.mod(geometry.longitude_rad, 2.0 * np.pi))
    mesh = [part.ravel() for part in np.meshgrid(*axes, indexing="ij")]
    zero = np.zeros_like(mesh[0])
    at = _Geometry(
        np.interp(mesh[0], time_s, geometry.diameter_rad),
        np.interp(mesh[0], time_s, geometry.latitude_rad),
        mesh[-1] if target.emission.spots else zero,
        np.interp(mesh[0], time_s, np.unwrap(geometry.pole_rad)),
        mesh[2] if turning else zero,
        mesh[1],
    )
    table = _look(target, instrument, setting, track, at, seeing_rad)
    shape, place = [axis.size for axis in axes], np.stack(where, axis=1)
    return Beam(
        *(
            RegularGridInterpolator(axes, getattr(table, field.name).reshape(shape))(place)
            for field in fields(Beam)
        )
    )


def spot_system(target: Target, track: Track) -> LongitudeSystem:
    """Return the longitude system in which the target's spots are fixed (the track's own without spots)."""
    systems = {system.name: system for system in target.rotation.systems}
    return systems[target.emission.spots[0].system] if target.emission.spots else track.system


def longitude_for_spots_rad(target: Target, track: Track) -> Array:
    """Return the sub-observer longitude in the system of the spots, ndarray[time]."""
    tdb_s = tdb_from_tt(track.grid.tt_s) - track.distance_m / c
    return in_system_rad(track.sub_observer_longitude_rad, track.system, spot_system(target, track), tdb_s)


def _axis(value: Array, count: int) -> Array:
    low, high = float(value.min()), float(value.max())
    return np.linspace(low, high, count) if high > low else np.array([low, low + 1.0])


def _look(
    target: Target, instrument: Instrument, setting: Setting, track: Track, at: _Geometry, seeing_rad: float
) -> Beam:
    """Return the beam at each geometry, one by one."""
    system = spot_system(target, track)

    def spread(airmass: float) -> PointSpread:
        return point_spread(instrument.image, instrument.telescope, setting.middle_m, seeing_rad, airmass)

    @lru_cache(maxsize=256)  # the same points serve every airmass
    def points(latitude_rad: float, longitude_rad: float, spacing: float) -> ShellPoints:
        spots = target.emission.spots
        return visible_points(target.figure, spots, latitude_rad, longitude_rad, system, spacing)

    def one() -> Iterator[Beam]:
        sharpest = spread(1.0)
        for i in range(at.airmass.size):
            latitude_rad, radius_rad = float(at.latitude_rad[i]), 0.5 * float(at.diameter_rad[i])
            disk = Disk(
                radius_rad,
                radius_rad * view_of(target.figure, latitude_rad).outline_pole,
                float(at.pole_rad[i]),
                float(at.parallactic_rad[i]),
            )
            seen = points(
                latitude_rad, float(at.longitude_rad[i]), point_spacing(disk, instrument.opening, sharpest)
            )
            yield see_disk(seen, disk, instrument.opening, instrument.operation, spread(float(at.airmass[i])))

    return join_beams(list(one()))
