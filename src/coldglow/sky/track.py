"""The path of a target over a grid of instants: everything about the sky that the other layers ask for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike

from coldglow.describe.records import Limits, LongitudeSystem, Orbit, Site, Target
from coldglow.sky.clock import Floats, TimeGrid, date_of, night_numbers, tdb_from_tt
from coldglow.sky.ephemeris import Ephemeris, load_ephemeris
from coldglow.sky.night import Mask, airmass, allowed, limiting_masks, why_not
from coldglow.sky.orientation import body_axes, position_angle_rad, sub_point
from coldglow.sky.place import LIGHT_M_S, altitude_azimuth, observe, parallactic_angle_rad, see
from coldglow.sky.vectors import dot, length, longitude_latitude, separation_rad, to_date


@dataclass(frozen=True, slots=True)
class Track:
    """A target in the sky of a place. Every array is ndarray[time].

    In space altitude, azimuth, airmass, parallactic angle and the Sun's altitude are nan.
    """

    grid: TimeGrid
    place: Site | Orbit
    system: LongitudeSystem
    altitude_rad: Floats  # airless
    azimuth_rad: Floats  # from north through east
    airmass: Floats  # Young 1994; nan below the horizon
    sub_observer_longitude_rad: Floats  # planetographic, 0 .. 2 pi, in the sense of the system
    sub_observer_latitude_rad: Floats  # planetographic, at the centre of the disk
    sub_solar_longitude_rad: Floats
    sub_solar_latitude_rad: Floats
    pole_angle_rad: Floats  # position angle of the north pole from true north of date through east
    parallactic_angle_rad: Floats  # position angle of the zenith
    equatorial_diameter_rad: Floats
    phase_angle_rad: Floats  # Sun-planet-observer, without aberration
    range_rate_m_s: Floats  # d(distance)/dt, positive receding
    distance_m: Floats  # that the light has come
    sun_distance_m: Floats
    ra_rad: Floats  # apparent, topocentric, true equator and equinox of date
    dec_rad: Floats
    ra_icrs_rad: Floats  # astrometric, topocentric
    dec_icrs_rad: Floats
    ra_rate_rad_s: Floats  # of the astrometric place, relative to the stars; times cos(dec)
    dec_rate_rad_s: Floats
    sun_altitude_rad: Floats
    solar_elongation_rad: Floats
    moon_separation_rad: Floats
    observable: Mask  # no limit forbids
    night: np.ndarray  # index into night_dates
    night_dates: tuple[str, ...]  # evening dates (in space UTC days) that the grid touches
    limited_by: Mapping[str, Mask]  # where each kind of limit forbids

    def take(self, chosen: ArrayLike) -> Track:
        """Return the track at chosen instants (mask, index array or slice); nights keep their numbers."""
        index = np.atleast_1d(np.arange(self.observable.size)[chosen])  # type: ignore[index]

        def part(value: object) -> object:
            if isinstance(value, np.ndarray):
                return value[index]
            if isinstance(value, TimeGrid):
                return value.take(index)
            if isinstance(value, Mapping):
                return {name: mask[index] for name, mask in value.items()}
            return value

        return Track(**{field.name: part(getattr(self, field.name)) for field in fields(self)})  # type: ignore[arg-type]

    @property
    def why_not(self) -> str:
        """Return in words which limits forbid how often; empty if none ever does.

        Where nothing is observable on the ground, also how high the target gets when the Sun allows.
        """
        words = why_not(self.limited_by)
        allowing = ~self.limited_by["daylight"]
        if isinstance(self.place, Site) and allowing.any() and not self.observable.any():
            highest = np.degrees(self.altitude_rad[allowing].max())
            words += f"; when the Sun allows, the target is never higher than {highest:.0f} deg"
        return words


def make_track(
    target: Target,
    place: Site | Orbit,
    limits: Limits,
    grid: TimeGrid,
    system: LongitudeSystem,
    ephemeris: str | Ephemeris = "",
) -> Track:
    """Return the track of a target over a grid.

    `ephemeris` is a name for `load_ephemeris`, or an ephemeris itself. A body that ends with ``.ecsv`` is the
    path of a table that ``fetch`` stored for this place; all other bodies still come from the ephemeris.

    Raises:
        DateError: the grid leaves the ephemeris.
        NotFoundError: there is no such ephemeris or stored table, or it has no such body.
        RangeError: the stored table was made for another place.

    """
    kernel = load_ephemeris(ephemeris) if isinstance(ephemeris, str) else ephemeris
    if target.body.endswith(".ecsv"):
        from coldglow.sky.stored import with_stored  # astropy's tables are slow to import and seldom needed

        kernel = with_stored(kernel, target.body, place)
    tt_s = grid.tt_s
    observer = observe(place, tt_s, kernel)
    planet, sun, moon = (see(observer, body) for body in (target.body, "sun", "moon"))

    distance = planet.distance_m
    direction = planet.astrometric_m / distance[:, None]
    sun_distance = length(planet.heliocentric_m)
    from_sun = planet.heliocentric_m / sun_distance[:, None]
    axes = body_axes(target.rotation, system, tdb_from_tt(tt_s) - distance / LIGHT_M_S)
    longitude, latitude = sub_point(axes, -direction, target.figure, system)
    sun_longitude, sun_latitude = sub_point(axes, -from_sun, target.figure, system)

    altitude, azimuth = altitude_azimuth(observer, planet.apparent)
    sun_altitude, _ = altitude_azimuth(observer, sun.apparent)
    elongation = separation_rad(planet.apparent, sun.apparent)
    moon_separation = separation_rad(planet.apparent, moon.apparent)
    masks = limiting_masks(place, limits, altitude, sun_altitude, elongation, moon_separation)

    ra, dec = longitude_latitude(planet.apparent)
    ra_icrs, dec_icrs = longitude_latitude(direction)
    east_rate, north_rate = _rates(direction, planet.rate_m_s / distance[:, None])
    number = night_numbers(place, tt_s)
    first, last = int(number.min()), int(number.max())
    used = np.unique(number) if last - first > number.size else np.arange(first, last + 1)
    return Track(
        grid=grid,
        place=place,
        system=system,
        altitude_rad=altitude,
        azimuth_rad=azimuth,
        airmass=airmass(altitude),
        sub_observer_longitude_rad=longitude,
        sub_observer_latitude_rad=latitude,
        sub_solar_longitude_rad=sun_longitude,
        sub_solar_latitude_rad=sun_latitude,
        pole_angle_rad=position_angle_rad(
            to_date(observer.frame, axes.pole), to_date(observer.frame, direction)
        ),
        parallactic_angle_rad=parallactic_angle_rad(observer, planet.apparent),
        equatorial_diameter_rad=2 * np.arcsin(target.figure.equatorial_radius_m / distance),
        phase_angle_rad=separation_rad(direction, from_sun),
        range_rate_m_s=dot(direction, planet.rate_m_s),
        distance_m=distance,
        sun_distance_m=sun_distance,
        ra_rad=ra,
        dec_rad=dec,
        ra_icrs_rad=ra_icrs,
        dec_icrs_rad=dec_icrs,
        ra_rate_rad_s=east_rate,
        dec_rate_rad_s=north_rate,
        sun_altitude_rad=sun_altitude,
        solar_elongation_rad=elongation,
        moon_separation_rad=moon_separation,
        observable=allowed(masks),
        night=np.searchsorted(used, number),
        night_dates=tuple(date_of(day) for day in used),
        limited_by=masks,
    )


def _rates(direction: Floats, turn: Floats) -> tuple[Floats, Floats]:
    """Return the rates (rad/s) toward east and north, from the rate of the vector over its length."""
    cos_dec = np.hypot(direction[:, 0], direction[:, 1])
    east = (direction[:, 0] * turn[:, 1] - direction[:, 1] * turn[:, 0]) / cos_dec
    return east, (turn[:, 2] - dot(direction, turn) * direction[:, 2]) / cos_dec
