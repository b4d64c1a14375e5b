"""An ephemeris table of one body for one place, as ``fetch`` stores it, read back and used as an ephemeris.

Each row says where the light comes from; with the observer's own place added it is a point of the body's
way through the solar system, at the moment the light left. A spline through these points answers like any
other ephemeris for that one body; every other body is that of the ephemeris beneath.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from astropy import units as u
from astropy.table import QTable
from scipy.interpolate import CubicSpline

from coldglow.describe.records import Orbit, Site
from coldglow.errors import NotFoundError, RangeError
from coldglow.sky.clock import Floats, tdb_from_tt, tt_from_utc
from coldglow.sky.ephemeris import Ephemeris, check_span
from coldglow.sky.place import LIGHT_M_S, observe

FORMAT = "coldglow-ephemeris/1"
SAME_PLACE_M = 100.0  # moves a planet by less than 4e-5 arcsec


@dataclass(frozen=True, slots=True)
class StoredTable:
    """Direction and distance of one body from one place; every array is ndarray[time], ascending.

    Astrometric place (ICRS axes, light time only) and the distance at the moment the light left; `query`
    and `answered` say what was asked of the service and when.
    """

    name: str
    body: str
    place: Site | Orbit
    query: str
    answered: str
    tt_s: Floats
    ra_icrs_rad: Floats
    dec_icrs_rad: Floats
    ra_rate_rad_s: Floats  # times cos dec
    dec_rate_rad_s: Floats
    distance_m: Floats
    range_rate_m_s: Floats
    sun_distance_m: Floats


def load_stored(path: str, place: Site | Orbit | None = None) -> StoredTable:
    """Return a table that ``fetch`` wrote.

    Raises: NotFoundError without such a file; RangeError for a file of another kind, and for a table made
    for another place than `place` (None = any).
    """
    if not Path(path).is_file():
        raise NotFoundError(f"There is no stored ephemeris {path!r}; make one with coldglow fetch.")
    try:
        table = QTable.read(path, format="ascii.ecsv")
        kind = table.meta.get("format")
    except (ValueError, OSError, TypeError) as error:
        raise RangeError(f"{path} is no stored ephemeris: {error}", "body") from error
    if kind != FORMAT:
        raise RangeError(f"{path} is no stored ephemeris: its format is {kind!r}, not {FORMAT!r}.", "body")
    try:
        stored = _from_table(path, table)
    except (KeyError, ValueError, TypeError, u.UnitsError) as error:
        raise RangeError(f"{path} is a damaged ephemeris: {error}", "body") from error
    if stored.tt_s.size < 2 or not np.all(np.diff(stored.tt_s) > 0.0):
        raise RangeError(f"{path} is a damaged ephemeris: it needs at least two ascending times.", "body")
    if place is not None and not _same(stored.place, place):
        raise RangeError(
            f"The ephemeris {path} was made for {_words(stored.place)} and cannot be used for "
            f"{_words(place)}; fetch it again for this place.",
            "body",
        )
    return stored


@dataclass(frozen=True, slots=True)
class StoredEphemeris:
    """An ephemeris in which one body, called `body`, follows a stored table."""

    name: str
    body: str
    base: Ephemeris = field(repr=False)
    way: CubicSpline = field(repr=False)  # TDB second -> barycentric metres, ICRS axes

    def span(self, body: str) -> tuple[float, float]:
        """Return the first and last TDB second from J2000 that `state` answers for this body."""
        return (float(self.way.x[0]), float(self.way.x[-1])) if body == self.body else self.base.span(body)

    def state(self, body: str, tdb_s: Floats) -> tuple[Floats, Floats]:
        """Return barycentric position (m) and velocity (m/s), ndarray[time, xyz]; DateError outside."""
        if body != self.body:
            return self.base.state(body, tdb_s)
        check_span(self, body, tdb_s)
        return self.way(tdb_s), self.way(tdb_s, 1)


def with_stored(base: Ephemeris, path: str, place: Site | Orbit) -> StoredEphemeris:
    """Return an ephemeris in which the body called `path` follows the table stored there.

    Raises: as `load_stored`; DateError where the ephemeris beneath does not reach over the table.
    """
    table = load_stored(path, place)
    seen_from = observe(table.place, table.tt_s, base)
    tdb_s = tdb_from_tt(table.tt_s)
    toward = np.stack(
        [
            np.cos(table.dec_icrs_rad) * np.cos(table.ra_icrs_rad),
            np.cos(table.dec_icrs_rad) * np.sin(table.ra_icrs_rad),
            np.sin(table.dec_icrs_rad),
        ],
        axis=1,
    )
    here = base.state("earth", tdb_s)[0] + seen_from.offset_m
    left_s = tdb_s - table.distance_m / LIGHT_M_S
    way = CubicSpline(left_s, here + table.distance_m[:, None] * toward)
    return StoredEphemeris(name=table.name, body=path, base=base, way=way)


def _from_table(path: str, table: Any) -> StoredTable:
    def column(name: str, unit: u.UnitBase) -> Floats:
        values = np.asarray(table[name].to_value(unit), dtype=float)
        if not np.isfinite(values).all():
            raise ValueError(f"the column {name} has gaps")
        return values

    moments = np.array([str(text) for text in table["time"]], dtype="datetime64[ms]")
    utc_s = (moments - np.datetime64("2000-01-01T12:00:00", "ms")) / np.timedelta64(1, "s")
    return StoredTable(
        name=Path(path).name,
        body=str(table.meta["body"]),
        place=_place(table.meta["place"]),
        query=str(table.meta["query"]),
        answered=str(table.meta["answered"]),
        tt_s=tt_from_utc(utc_s),
        ra_icrs_rad=column("ra_icrs", u.rad),
        dec_icrs_rad=column("dec_icrs", u.rad),
        ra_rate_rad_s=column("ra_rate", u.rad / u.s),
        dec_rate_rad_s=column("dec_rate", u.rad / u.s),
        distance_m=column("distance", u.m),
        range_rate_m_s=column("range_rate", u.m / u.s),
        sun_distance_m=column("sun_distance", u.m),
    )


def _place(words: Mapping[str, Any]) -> Site | Orbit:
    if "orbit" in words:
        return Orbit(words["orbit"])
    return Site(
        longitude_rad=float(np.radians(words["longitude_deg"])),
        latitude_rad=float(np.radians(words["latitude_deg"])),
        height_m=float(words["height_m"]),
    )


def _same(one: Site | Orbit, other: Site | Orbit) -> bool:
    if isinstance(one, Orbit) or isinstance(other, Orbit):
        return one == other
    turn = np.remainder(one.longitude_rad - other.longitude_rad + np.pi, 2.0 * np.pi) - np.pi
    east = turn * np.cos(one.latitude_rad)
    north = one.latitude_rad - other.latitude_rad
    return bool(
        np.hypot(east, north) * 6.4e6 < SAME_PLACE_M and abs(one.height_m - other.height_m) < SAME_PLACE_M
    )


def _words(place: Site | Orbit) -> str:
    if isinstance(place, Orbit):
        return place.kind
    return (
        f"the site at longitude {np.degrees(place.longitude_rad):.4f} deg, latitude "
        f"{np.degrees(place.latitude_rad):.4f} deg, height {place.height_m:.0f} m"
    )
