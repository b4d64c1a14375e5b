"""`sky`: where is it, which longitude faces us, how fast does it recede?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.constants import arcsec, au

from coldglow.answers.common.inputs import (
    BARE_LIMITS,
    NamePath,
    Quantity,
    as_instrument,
    as_target,
    in_si,
    place_errors,
)
from coldglow.answers.common.scenes import longitude_words
from coldglow.describe.records import Instrument, LongitudeSystem, Orbit, Rotation, Site, Target
from coldglow.errors import NotFoundError, RangeError
from coldglow.report import words
from coldglow.report.results import Column, Entry, Result, column, table
from coldglow.sky.clock import iso_from_tt, span_grid, tdb_from_tt, times_grid
from coldglow.sky.track import Track, make_track


def longitude_system(rotation: Rotation, name: str | None) -> LongitudeSystem:
    """Return the longitude system of that name, the target's default for none.

    Raises:
        NotFoundError: the target has no such system; the sentence lists those it has.

    """
    if not name:
        return rotation.systems[0]
    for system in rotation.systems:
        if system.name == name:
            return system
    listed = words.listing([system.name for system in rotation.systems])
    raise NotFoundError(f"no longitude system `{name}`; this target has {listed}")


def sky(
    target: NamePath | Target,
    instrument: NamePath | Instrument | None = None,
    site: Sequence[Quantity] | Site | None = None,
    first: str | None = None,
    last: str | None = None,
    step: Quantity = "1h",
    at: Sequence[str] | None = None,
    longitudes: str | None = None,
    ephemeris: str = "",
) -> Result:
    """Return place, orientation and motion of a target against time.

    Args:
        target: name, path or record.
        instrument: from whose place and within whose limits it is seen; or
        site: longitude (east positive), latitude and height, or a `Site`.
        first: first instant, ISO, UTC.
        last: last instant.
        step: between instants (text without a unit: minutes).
        at: instants instead of `first`, `last` and `step`.
        longitudes: name of the longitude system; default: the target's first.
        ephemeris: '' for the packaged kernel, 'builtin', or the path of an SPK file.

    Returns:
        A result with table ``sky``, one row an instant.

    Raises:
        RangeError: no times, or times out of order; DateError outside the ephemeris.
        NotFoundError: no such longitude system.

    >>> result = sky("uranus", site=("-65 deg", "-20 deg", "4200 m"), at=["2027-12-20T02:00"])
    >>> bool(result["observable"][0]), round(float(result["airmass"][0]), 2)
    (True, 1.37)

    """
    record = as_target(target)
    system = longitude_system(record.rotation, longitudes)
    with place_errors(record):
        if at:
            if first or last:
                raise RangeError("give either --at or --from and --to, not both")
            grid = times_grid(at)
        elif first and last:
            grid = span_grid(first, last, in_si(step, "time", "step", "min"))
        else:
            raise RangeError("give --from and --to, or --at with one or more times")
        if instrument is not None:
            seen_from = as_instrument(instrument)
            place, limits, name = seen_from.place, seen_from.limits, seen_from.name
            meaning = f"within the limits of {seen_from.name}"
        elif site is not None:
            place, limits, name = site_of(site), BARE_LIMITS, "a bare site"
            meaning = "above the horizon with the Sun more than 12° below it"
        else:
            raise RangeError("give an instrument or a site")
        track = make_track(record, place, limits, grid, system, ephemeris)
    tdb_s = tdb_from_tt(grid.tt_s)
    sentences = [f"`observable` means {meaning}. Altitudes are airless, airmass is that of Young 1994."]
    if not track.observable.any():
        sentences.append(f"The target is never observable at these times: {track.why_not}.")
    sentences.append(longitude_words(system, tdb_s))
    return Result(
        "sky",
        {"sky": table(*_columns(track, isinstance(place, Orbit)), caption=f"{record.name} from {name}")},
        {
            "target": Entry(record.name),
            "place": Entry(place_words(place)),
            "longitudes": Entry(system.name, text=f"{system.name} ({system.source})"),
            "ephemeris": Entry(ephemeris or "DE421 (packaged); planet-system barycentres"),
        },
        sentences,
        feasible=bool(track.observable.any()),
    )


def site_of(site: Sequence[Quantity] | Site) -> Site:
    """Return a place on the Earth from its record or from longitude, latitude and height.

    Raises:
        RangeError: a number that no place has.

    """
    if isinstance(site, Site):
        return site
    lon, lat, height = site
    place = Site(
        in_si(lon, "angle", "site longitude", "deg"),
        in_si(lat, "angle", "site latitude", "deg"),
        in_si(height, "length", "site height", "m"),
    )
    if abs(place.latitude_rad) > np.pi / 2 + 1e-12:
        raise RangeError(f"a site latitude of {np.degrees(place.latitude_rad):g} deg; it must lie in -90..90")
    if abs(place.longitude_rad) > 2 * np.pi + 1e-12:
        raise RangeError(
            f"a site longitude of {np.degrees(place.longitude_rad):g} deg; it must lie in -360..360"
        )
    if not -500.0 <= place.height_m <= 9000.0:
        raise RangeError(f"a site height of {place.height_m:g} m; it must lie in -500..9000 m")
    return place


def place_words(place: Site | Orbit) -> str:
    """Return a place in words."""
    if isinstance(place, Orbit):
        return "space, Sun-Earth L2"
    longitude, latitude = np.degrees(place.longitude_rad), np.degrees(place.latitude_rad)
    return f"longitude {longitude:.4f}°, latitude {latitude:.4f}°, {place.height_m:.0f} m"


def _columns(track: Track, in_space: bool) -> list[Column]:
    """Return the columns in display units; those that mean nothing in space are kept for files only."""
    ground = not in_space

    def angle(name: str, value: np.ndarray, decimals: int = 2, shown: bool = True) -> Column:
        return column(name, np.degrees(value), "deg", decimals=decimals, shown=shown)

    return [
        column("time", iso_from_tt(track.grid.tt_s), description="UTC"),
        column("observable", track.observable),
        column("airmass", track.airmass, decimals=3, shown=ground),
        angle("altitude", track.altitude_rad, shown=ground),
        angle("azimuth", track.azimuth_rad, shown=ground),
        angle("sub_observer_longitude", track.sub_observer_longitude_rad),
        angle("sub_observer_latitude", track.sub_observer_latitude_rad),
        angle("sub_solar_longitude", track.sub_solar_longitude_rad, shown=False),
        angle("sub_solar_latitude", track.sub_solar_latitude_rad),
        angle("pole_angle", track.pole_angle_rad),
        column("diameter", track.equatorial_diameter_rad / arcsec, "arcsec", decimals=3),
        angle("phase_angle", track.phase_angle_rad, 3),
        column("range_rate", 1e-3 * track.range_rate_m_s, "km s-1", decimals=3),
        column("distance", track.distance_m / au, "AU", decimals=5),
        column("sun_distance", track.sun_distance_m / au, "AU", decimals=5, shown=False),
        angle("ra", track.ra_rad, 5),
        angle("dec", track.dec_rad, 5),
        angle("ra_icrs", track.ra_icrs_rad, 5),
        angle("dec_icrs", track.dec_icrs_rad, 5),
        column("ra_rate", track.ra_rate_rad_s * 3600.0 / arcsec, "arcsec h-1", decimals=3),
        column("dec_rate", track.dec_rate_rad_s * 3600.0 / arcsec, "arcsec h-1", decimals=3),
        angle("parallactic_angle", track.parallactic_angle_rad, 1, shown=False),
        angle("sun_altitude", track.sun_altitude_rad, shown=ground),
        angle("solar_elongation", track.solar_elongation_rad),
        angle("moon_separation", track.moon_separation_rad),
    ]
