"""Where a body stands in the sky of an observer: light time, deflection, aberration, the turning Earth.

Everything slow (bodies, precession and nutation) is computed at the nodes of a lattice, one a day (for the
Moon every three hours), and interpolated; everything fast (the Earth's rotation with the observer on it) at
each instant. Measured interpolation error: 80 m in distance, 4e-3 m/s in rate, 0.002 arcsec in the frame
(``tests/sky/test_place.py``).

Left out: polar motion (0.5 arcsec in altitude), refraction, light deflection by planets.
"""

from __future__ import annotations

from dataclasses import dataclass

import erfa
import numpy as np

from coldglow.describe.records import Orbit, Site
from coldglow.sky.clock import DAY_S, Floats, tdb_from_tt, ut1_from_tt
from coldglow.sky.ephemeris import AU_M, Ephemeris, check_span
from coldglow.sky.lattice import Lattice, lattice
from coldglow.sky.vectors import dot, from_date, length, to_date

LIGHT_M_S = erfa.CMPS
L2_DISTANCE_M = 0.01 * AU_M
_EARTH_TURN_RAD_S = 2 * np.pi * 1.00273781191135448 / DAY_S  # ERFA era00: turns per UT1 day
_J2000_JD = 2451545.0
_NODE_S = DAY_S
_MOON_NODE_S = 3 * 3600.0  # 1 m in the Moon's place
_MARGIN_S = 3 * DAY_S + 6 * 3600.0  # nodes beyond the instants, and the light time to Neptune


@dataclass(frozen=True, slots=True)
class Observer:
    """Someone who looks, at every instant. Vectors are ndarray[time, xyz] in ICRS axes."""

    place: Site | Orbit
    ephemeris: Ephemeris
    tt_s: Floats
    nodes: Lattice
    offset_m: Floats  # from the Earth's centre
    offset_rate_m_s: Floats
    velocity_m_s: Floats  # relative to the barycentre of the solar system
    from_sun_m: Floats
    frame: Floats  # ndarray[time, 3, 3]: from ICRS axes to the true equator and equinox of date
    sidereal_rad: Floats  # local apparent sidereal time; nan in space


@dataclass(frozen=True, slots=True)
class Sight:
    """What an observer sees of one body. ndarray[time, xyz].

    `astrometric_m` and its rate are in ICRS axes, with light time only; `apparent` is a unit vector of the
    true equator and equinox of date, with light deflection by the Sun and aberration.
    `heliocentric_m` points to the body from where the Sun was when that light left it.
    """

    astrometric_m: Floats
    rate_m_s: Floats
    heliocentric_m: Floats
    apparent: Floats

    @property
    def distance_m(self) -> Floats:
        """Return the distance that the light has come, ndarray[time]."""
        return length(self.astrometric_m)


def observe(place: Site | Orbit, tt_s: Floats, ephemeris: Ephemeris) -> Observer:
    """Return the observer at a place at instants ndarray[time] (TT seconds from J2000).

    In space (`Orbit`) the observer stands 0.01 au beyond the Earth on the line from the Sun, a stand-in for
    an orbit around that point: the true place differs by up to 800 000 km (0.1 arcmin for the giant planets).

    Raises:
        DateError: an instant outside the ephemeris.

    Source: IAU 2006/2000A precession-nutation and sidereal time as in ERFA (pnm06a, s06, eors, era00).

    """
    tt_s = np.atleast_1d(np.asarray(tt_s, dtype=float))
    for body in ("sun", "earth"):
        check_span(ephemeris, body, tt_s, _MARGIN_S)
    nodes = lattice(tt_s, _NODE_S)
    earth, earth_rate = ephemeris.state("earth", tdb_from_tt(nodes.tt_s))
    sun, sun_rate = ephemeris.state("sun", tdb_from_tt(nodes.tt_s))

    matrix = erfa.pnm06a(_J2000_JD, nodes.tt_s / DAY_S)
    x, y = erfa.bpn2xy(matrix)
    origins = erfa.eors(matrix, erfa.s06(_J2000_JD, nodes.tt_s / DAY_S, x, y))
    frame = nodes.value(matrix, nodes.slope(matrix))

    away, away_rate = earth - sun, earth_rate - sun_rate
    if isinstance(place, Site):
        origins = nodes.value(origins, nodes.slope(origins))
        turn = erfa.era00(_J2000_JD, ut1_from_tt(tt_s) / DAY_S) - origins
        offset, offset_rate = _on_the_ground(place, turn)
        offset, offset_rate = from_date(frame, offset), from_date(frame, offset_rate)
        sidereal = turn + place.longitude_rad
    else:
        sun_distance = length(away)[:, None]
        unit = away / sun_distance
        scale = L2_DISTANCE_M / sun_distance
        beyond, beyond_rate = L2_DISTANCE_M * unit, scale * (away_rate - unit * dot(unit, away_rate)[:, None])
        offset, offset_rate = nodes.value(beyond, beyond_rate), nodes.rate(beyond, beyond_rate)
        sidereal = np.full(tt_s.size, np.nan)
    return Observer(
        place,
        ephemeris,
        tt_s,
        nodes,
        offset,
        offset_rate,
        nodes.rate(earth, earth_rate) + offset_rate,
        nodes.value(away, away_rate) + offset,
        frame,
        sidereal,
    )


def see(observer: Observer, body: str) -> Sight:
    """Return what the observer sees of a body.

    Raises:
        NotFoundError: the ephemeris has no such body.
        DateError: an instant outside the ephemeris.

    Source: apparent places as in ERFA (ld, ab); Urban & Seidelmann 2013, Explanatory Supplement to the
    Astronomical Almanac, 3rd ed., chapter 7.

    """
    check_span(observer.ephemeris, body, observer.tt_s, _MARGIN_S)
    step_s = _MOON_NODE_S if body == "moon" else _NODE_S
    nodes = observer.nodes if step_s == observer.nodes.step_s else lattice(observer.tt_s, step_s)
    geocentric, geocentric_rate, heliocentric, heliocentric_rate = _with_light_time(
        observer.ephemeris, body, nodes
    )
    from_earth, from_earth_rate = (
        nodes.value(geocentric, geocentric_rate),
        nodes.rate(geocentric, geocentric_rate),
    )
    astrometric, rate = from_earth - observer.offset_m, from_earth_rate - observer.offset_rate_m_s
    # the light to the observer left at another moment than that to the Earth's centre: the body moved
    body_velocity = from_earth_rate + observer.velocity_m_s - observer.offset_rate_m_s
    longer_m = length(astrometric) - length(from_earth)
    longer_rate_m_s = dot(astrometric, rate) / length(astrometric) - dot(
        from_earth, from_earth_rate
    ) / length(from_earth)
    astrometric -= body_velocity * (longer_m / LIGHT_M_S)[:, None]
    rate -= body_velocity * (longer_rate_m_s / LIGHT_M_S)[:, None]
    from_sun = nodes.value(heliocentric, heliocentric_rate)

    direction = astrometric / length(astrometric)[:, None]
    if body not in ("sun", "moon"):
        away = length(observer.from_sun_m)
        direction = erfa.ld(
            1.0,
            direction,
            from_sun / length(from_sun)[:, None],
            observer.from_sun_m / away[:, None],
            away / AU_M,
            1e-6,
        )
    beta = observer.velocity_m_s / LIGHT_M_S
    direction = erfa.ab(direction, beta, length(observer.from_sun_m) / AU_M, np.sqrt(1 - dot(beta, beta)))
    return Sight(astrometric, rate, from_sun, to_date(observer.frame, direction))


def altitude_azimuth(observer: Observer, apparent: Floats) -> tuple[Floats, Floats]:
    """Return airless altitude and azimuth (from north through east), ndarray[time]; nan in space."""
    if not isinstance(observer.place, Site):
        nowhere = np.full(observer.tt_s.size, np.nan)
        return nowhere, nowhere
    south, east = _meridian_axes(observer, apparent)
    sin_lat, cos_lat = np.sin(observer.place.latitude_rad), np.cos(observer.place.latitude_rad)
    up = cos_lat * south + sin_lat * apparent[:, 2]
    north = cos_lat * apparent[:, 2] - sin_lat * south
    return np.arctan2(up, np.hypot(north, east)), np.arctan2(east, north) % (2 * np.pi)


def parallactic_angle_rad(observer: Observer, apparent: Floats) -> Floats:
    """Return the position angle of the zenith, from north through east, ndarray[time]; nan in space.

    Source: Urban & Seidelmann 2013, Explanatory Supplement, 3rd ed., section 7.1.3.
    """
    if not isinstance(observer.place, Site):
        return np.full(observer.tt_s.size, np.nan)
    south, east = _meridian_axes(observer, apparent)  # cos(dec) times cos and -sin of the hour angle
    cos_dec = np.hypot(apparent[:, 0], apparent[:, 1])
    tan_lat = np.tan(observer.place.latitude_rad)
    angle: Floats = np.arctan2(-east, tan_lat * cos_dec**2 - apparent[:, 2] * south)
    return angle


# ---------------------------------------------------------------- inside


def _meridian_axes(observer: Observer, apparent: Floats) -> tuple[Floats, Floats]:
    """Return the parts of a direction toward the equator's point on the meridian, and toward east."""
    cos, sin = np.cos(observer.sidereal_rad), np.sin(observer.sidereal_rad)
    return cos * apparent[:, 0] + sin * apparent[:, 1], cos * apparent[:, 1] - sin * apparent[:, 0]


def _on_the_ground(site: Site, turn_rad: Floats) -> tuple[Floats, Floats]:
    """Return place and velocity of a site from the Earth's centre, true equator and equinox of date."""
    x, y, z = erfa.gd2gc(1, site.longitude_rad, site.latitude_rad, site.height_m)
    cos, sin = np.cos(turn_rad), np.sin(turn_rad)
    east, north = cos * x - sin * y, sin * x + cos * y
    place = np.stack([east, north, np.full(turn_rad.size, z)], axis=1)
    rate = _EARTH_TURN_RAD_S * np.stack([-north, east, np.zeros(turn_rad.size)], axis=1)
    return place, rate


def _with_light_time(
    ephemeris: Ephemeris, body: str, nodes: Lattice
) -> tuple[Floats, Floats, Floats, Floats]:
    """Return geocentric place and rate, and heliocentric place and rate, of a body at light time.

    The rate is the derivative of the place against the time of the observer.
    """
    tdb_s = tdb_from_tt(nodes.tt_s)
    earth, earth_rate = ephemeris.state("earth", tdb_s)
    tau = np.zeros(nodes.tt_s.size)
    for _ in range(4):
        there, there_rate = ephemeris.state(body, tdb_s - tau)
        tau = length(there - earth) / LIGHT_M_S
    place = there - earth
    unit = place / length(place)[:, None]
    # d/dt of |P(t - tau) - E(t)| = c dtau/dt, solved for dtau/dt
    slower = dot(unit, there_rate - earth_rate) / (LIGHT_M_S + dot(unit, there_rate))
    there_rate = there_rate * (1 - slower)[:, None]

    sun_tau = np.zeros(tau.size)
    for _ in range(3):
        sun, sun_rate = ephemeris.state("sun", tdb_s - tau - sun_tau)
        sun_tau = length(there - sun) / LIGHT_M_S
    return place, there_rate - earth_rate, there - sun, there_rate - sun_rate
