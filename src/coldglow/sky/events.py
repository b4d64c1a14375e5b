"""What happens in each night: sunset, dusk and dawn, sunrise, rise, transit and set of a body.

Every event is a root of a spline through the sine of the airless altitude (or the part of the direction
toward east) at steps of 20 minutes, so the refinement costs nothing and no event between two steps is lost,
however short the night of a polar site. Measured error of the spline: 0.02 s (``tests/sky/test_events.py``).
Left out: refraction beyond that in the conventional altitude of sunrise and sunset, and the dip of the
horizon, which from a summit makes the Sun set several minutes later.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.interpolate import CubicSpline, PPoly

from coldglow.describe.records import Site
from coldglow.sky.clock import DAY_S, Floats, night_start_tt
from coldglow.sky.ephemeris import Ephemeris, load_ephemeris
from coldglow.sky.place import altitude_azimuth, observe, see

# Altitude of the Sun's centre. Sunset: 34 arcmin of refraction and 16 of radius (Urban & Seidelmann 2013,
# Explanatory Supplement to the Astronomical Almanac, 3rd ed., section 12.2, from memory).
SUN_LEVELS_RAD = {
    "sunset": -0.8333 * np.pi / 180,
    "civil": -6 * np.pi / 180,
    "nautical": -12 * np.pi / 180,
    "astronomical": -18 * np.pi / 180,
}
_STEP_S = 1200.0
_BEYOND = 4  # steps beyond either end of the night, so that the ends of the spline do not matter


@dataclass(frozen=True, slots=True)
class NightEvents:
    """Events of nights; arrays are ndarray[night] in TT seconds from J2000, nan where nothing happens.

    A night is the 24 hours from local mean noon of its evening date. `dark_s` is how long the Sun is
    below -18 deg in them: 0 where it never gets dark.
    """

    dates: tuple[str, ...]
    sunset_tt_s: Floats
    civil_dusk_tt_s: Floats
    nautical_dusk_tt_s: Floats
    astronomical_dusk_tt_s: Floats
    astronomical_dawn_tt_s: Floats
    nautical_dawn_tt_s: Floats
    civil_dawn_tt_s: Floats
    sunrise_tt_s: Floats
    dark_s: Floats
    rise_tt_s: Floats  # of the body; nan without one
    transit_tt_s: Floats  # upper
    set_tt_s: Floats


@dataclass(frozen=True, slots=True)
class _Crossings:
    """When a curve passes a level in each night: seconds from the night's start, in order of time."""

    start_tt_s: Floats  # ndarray[night]
    up: list[Floats]
    down: list[Floats]
    begins_below: list[bool]

    def first_tt_s(self, way: list[Floats]) -> Floats:
        """Return the first of the upward or downward crossings of each night, nan without one."""
        return np.array(self.start_tt_s + [roots[0] if roots.size else np.nan for roots in way])

    def last_tt_s(self, way: list[Floats]) -> Floats:
        """Return the last of the upward or downward crossings of each night, nan without one."""
        return np.array(self.start_tt_s + [roots[-1] if roots.size else np.nan for roots in way])

    def below_s(self) -> Floats:
        """Return how many seconds of each night the curve is below the level."""
        # the time below begins at every downward crossing and ends at every upward one, or with the night
        nights = zip(self.begins_below, self.up, self.down, strict=True)
        return np.array(
            [up.sum() - down.sum() + DAY_S * (below + down.size - up.size) for below, up, down in nights]
        )


def _crossings(start_tt_s: Floats, since_s: Floats, values: Floats, level: float) -> _Crossings:
    """Return where a spline through values ndarray[step, night], at `since_s` from each start, passes."""
    spline = CubicSpline(since_s, values)
    up, down = [], []
    for night in range(start_tt_s.size):
        curve = PPoly.construct_fast(spline.c[:, :, night], spline.x)
        roots = curve.solve(level, extrapolate=False)
        roots = roots[(roots >= 0.0) & (roots < DAY_S)]
        rate = curve(roots, 1)
        up.append(roots[rate > 0])
        down.append(roots[rate < 0])
    return _Crossings(start_tt_s, up, down, list(spline(0.0) < level))


def night_events(
    site: Site, dates: Sequence[str], body: str = "", ephemeris: str | Ephemeris = ""
) -> NightEvents:
    """Return the events of the nights with these evening dates, of the Sun and of a body if one is named.

    Sunset and dusk, and all events of the body, are the first in the night; dawn and sunrise the last.

    Raises:
        DateError: a night outside the ephemeris.
        NotFoundError: the ephemeris has no such body.

    """
    kernel = load_ephemeris(ephemeris) if isinstance(ephemeris, str) else ephemeris
    start = np.array([night_start_tt(site, date) for date in dates])
    since = _STEP_S * np.arange(-_BEYOND, DAY_S / _STEP_S + _BEYOND + 1)
    observer = observe(site, (start + since[:, None]).ravel(), kernel)

    def crossings(values: Floats, level_rad: float) -> _Crossings:
        return _crossings(start, since, values.reshape(since.size, start.size), float(np.sin(level_rad)))

    sun_altitude, _ = altitude_azimuth(observer, see(observer, "sun").apparent)
    sun = {name: crossings(np.sin(sun_altitude), level) for name, level in SUN_LEVELS_RAD.items()}
    rise = transit = setting = np.full(start.size, np.nan)
    if body:
        altitude, azimuth = altitude_azimuth(observer, see(observer, body).apparent)
        horizon = crossings(np.sin(altitude), 0.0)
        meridian = crossings(np.cos(altitude) * np.sin(azimuth), 0.0)  # toward east
        rise, setting = horizon.first_tt_s(horizon.up), horizon.first_tt_s(horizon.down)
        transit = meridian.first_tt_s(meridian.down)
    return NightEvents(
        dates=tuple(dates),
        sunset_tt_s=sun["sunset"].first_tt_s(sun["sunset"].down),
        civil_dusk_tt_s=sun["civil"].first_tt_s(sun["civil"].down),
        nautical_dusk_tt_s=sun["nautical"].first_tt_s(sun["nautical"].down),
        astronomical_dusk_tt_s=sun["astronomical"].first_tt_s(sun["astronomical"].down),
        astronomical_dawn_tt_s=sun["astronomical"].last_tt_s(sun["astronomical"].up),
        nautical_dawn_tt_s=sun["nautical"].last_tt_s(sun["nautical"].up),
        civil_dawn_tt_s=sun["civil"].last_tt_s(sun["civil"].up),
        sunrise_tt_s=sun["sunset"].last_tt_s(sun["sunset"].up),
        dark_s=sun["astronomical"].below_s(),
        rise_tt_s=rise,
        transit_tt_s=transit,
        set_tt_s=setting,
    )
