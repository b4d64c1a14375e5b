"""Instants: UTC as people write it, and the time scales that the sky needs.

Inside the program an instant is ``tt_s``: seconds of Terrestrial Time from 2000-01-01T12:00 TT, one
float64 (2e-7 s near 2050). UTC comes from the leap-second table of ERFA, without leap seconds after its
last entry; UT1 from a packaged table whose last prediction (UT1-UTC) is held afterwards. Nobody can
predict either. From 1973 to 2026 UT1 drifted by +0.1 to -1.1 s a year from atomic time; each second that
the Earth is off the held value moves the sky by 15 arcsec and an event by about a second.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from functools import cache
from importlib.resources import files

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.describe.records import Orbit, Site
from coldglow.errors import DateError, RangeError

DAY_S = 86400.0
TT_MINUS_TAI_S = 32.184
_J2000_UTC = np.datetime64("2000-01-01T12:00:00", "ms")
_J2000_MJD = 51544.5

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class TimeGrid:
    """Instants: seconds (SI) from `start_utc`, in any order and spacing, each standing for `step_s`.

    `time_s` is ndarray[time]; `step_s` is 0 where the instants stand only for themselves.
    """

    start_utc: str
    time_s: Floats
    step_s: float

    @property
    def tt_s(self) -> Floats:
        """Return the instants as TT seconds from J2000, ndarray[time]."""
        return tt_from_iso(self.start_utc) + self.time_s

    def take(self, chosen: ArrayLike) -> TimeGrid:
        """Return the grid of the chosen instants (mask, index array or slice)."""
        return TimeGrid(self.start_utc, np.atleast_1d(self.time_s[chosen]), self.step_s)  # type: ignore[index]


# ---------------------------------------------------------------- time scales


@cache
def _leap_seconds() -> tuple[Floats, Floats]:
    """Return the UTC seconds from J2000 at which TAI-UTC changed, and its values since then (from 1972)."""
    table = erfa.leap_seconds.get()
    table = table[table["year"] >= 1972]
    months = [f"{row['year']:04d}-{row['month']:02d}-01T00:00:00" for row in table]
    since = (np.array(months, dtype="datetime64[ms]") - _J2000_UTC) / np.timedelta64(1, "s")
    return since, np.asarray(table["tai_utc"], dtype=float)


@cache
def _earth_orientation() -> tuple[Floats, Floats]:
    """Return TT seconds from J2000 and UT1-TAI in seconds, made by ``data/make_earth_orientation.py``."""
    with (files("coldglow.data") / "earth_orientation.npz").open("rb") as stream:
        table = np.load(stream)
        utc_s = (table["mjd_utc"] - _J2000_MJD) * DAY_S
        return tt_from_utc(utc_s), table["ut1_minus_tai_s"]


def tai_minus_utc_s(utc_s: ArrayLike) -> Floats:
    """Return TAI-UTC in seconds at UTC seconds from J2000 (days of 86400 s); 10 s before 1972."""
    since, value = _leap_seconds()
    return value[np.maximum(np.searchsorted(since, utc_s, side="right") - 1, 0)]


def tt_from_utc(utc_s: ArrayLike) -> Floats:
    """Return TT seconds from J2000 for UTC seconds from 2000-01-01T12:00 UTC (days of 86400 s)."""
    return np.asarray(utc_s, dtype=float) + tai_minus_utc_s(utc_s) + TT_MINUS_TAI_S


def utc_from_tt(tt_s: ArrayLike) -> Floats:
    """Return UTC seconds from 2000-01-01T12:00 UTC (days of 86400 s) for TT seconds from J2000."""
    since, value = _leap_seconds()
    change = since + value + TT_MINUS_TAI_S
    place = np.maximum(np.searchsorted(change, tt_s, side="right") - 1, 0)
    return np.asarray(tt_s, dtype=float) - value[place] - TT_MINUS_TAI_S


def ut1_from_tt(tt_s: ArrayLike) -> Floats:
    """Return UT1 seconds from 2000-01-01T12:00 UT1 for TT seconds from J2000."""
    when, ut1_minus_tai = _earth_orientation()
    tt_s = np.asarray(tt_s, dtype=float)
    ut1_s: Floats = tt_s - TT_MINUS_TAI_S + np.interp(tt_s, when, ut1_minus_tai)
    return ut1_s


def tdb_from_tt(tt_s: ArrayLike) -> Floats:
    """Return TDB seconds from J2000 TDB for TT seconds from J2000 TT, to 10 microseconds.

    Source: Kaplan 2005, US Naval Observatory Circular 179, eq. 2.6.
    """
    tt_s = np.asarray(tt_s, dtype=float)
    t = tt_s / (36525.0 * DAY_S)
    return (
        tt_s
        + 0.001657 * np.sin(628.3076 * t + 6.2401)
        + 0.000022 * np.sin(575.3385 * t + 4.2970)
        + 0.000014 * np.sin(1256.6152 * t + 6.1969)
        + 0.000005 * np.sin(606.9777 * t + 4.0212)
        + 0.000005 * np.sin(52.9691 * t + 0.4444)
        + 0.000010 * t * np.sin(628.3076 * t + 4.2490)
    )


# ---------------------------------------------------------------- as people write it


def utc_from_iso(text: str) -> float:
    """Return UTC seconds from J2000 of an ISO 8601 date or time (UTC unless it carries an offset).

    Raises:
        RangeError: the text is not an ISO date or time.
        DateError: it lies before the table of the Earth's rotation.

    """
    try:
        moment = datetime.fromisoformat(text.strip())
    except ValueError:
        raise RangeError(
            f"{text!r} is not a UTC date or time; write for example 2027-11-25 or 2027-11-25T05:30:00"
        ) from None
    if moment.tzinfo is not None:
        moment = moment.astimezone(UTC).replace(tzinfo=None)
    if moment.year < 1973:
        raise DateError(f"{text} lies before 1973-01-02, where the table of the Earth's rotation begins")
    return float((np.datetime64(moment, "us") - _J2000_UTC) / np.timedelta64(1, "s"))


def tt_from_iso(text: str) -> float:
    """Return TT seconds from J2000 of an ISO date or time; raises as `utc_from_iso`."""
    return float(tt_from_utc(utc_from_iso(text)))


def iso_from_tt(tt_s: ArrayLike, unit: str = "s") -> NDArray[np.str_]:
    """Return ISO UTC strings (``2027-11-25T05:30:00``), rounded to the unit: ``s``, ``ms`` or ``m``.

    An instant that is nan (an event that does not happen) gives an empty string.
    """
    utc_ms = np.rint(utc_from_tt(tt_s) * 1000.0)
    happens = np.isfinite(utc_ms)
    half_ms = {"ms": 0, "s": 500, "m": 30_000}[unit]
    moments = _J2000_UTC + (np.where(happens, utc_ms, 0.0) + half_ms).astype("timedelta64[ms]")
    return np.where(happens, np.datetime_as_string(moments.astype(f"datetime64[{unit}]")), "")


def iso(grid: TimeGrid, index: int) -> str:
    """Return one instant of a grid as ISO UTC, to the second."""
    return str(iso_from_tt(grid.tt_s[index]))


# ---------------------------------------------------------------- grids and nights


def wrapped_longitude_rad(site: Site) -> float:
    """Return the longitude of a site in -pi .. pi, which decides on which side of the date line it lies."""
    return float((site.longitude_rad + np.pi) % (2 * np.pi) - np.pi)


def night_numbers(place: Site | Orbit, tt_s: ArrayLike) -> NDArray[np.int64]:
    """Return for each instant the day number (from 1970-01-01) of the evening date of its night.

    A night is the 24 hours that begin at local *mean* noon of its evening date; in space it is a UTC day.
    """
    turn = wrapped_longitude_rad(place) / (2 * np.pi) - 0.5 if isinstance(place, Site) else 0.0
    days = utc_from_tt(tt_s) / DAY_S + 10957.5 + turn
    return np.floor(days + 1e-9).astype(np.int64)  # 0.1 ms, so that noon itself begins the night


def date_of(number: int | np.integer) -> str:
    """Return the ISO date of a day number from `night_numbers`."""
    return str(np.datetime64(int(number), "D"))


def night_start_tt(place: Site | Orbit, date: str) -> float:
    """Return the TT second at which the night of an evening date begins (local mean noon)."""
    turn = wrapped_longitude_rad(place) / (2 * np.pi) - 0.5 if isinstance(place, Site) else 0.0
    return float(tt_from_utc(utc_from_iso(date[:10]) - turn * DAY_S))


def _lattice(first_tt: float, end_tt: float, step_s: float) -> TimeGrid:
    """Return instants from first to before end, beginning at a whole multiple of the step from 0h UTC."""
    if not step_s > 0:
        raise RangeError(f"a time step of {step_s:g} s is not positive", "dates.step")
    if not end_tt > first_tt:
        first, end = iso_from_tt([first_tt, end_tt])
        raise RangeError(f"the end {end} is not after the beginning {first}", "dates")
    utc_s = float(utc_from_tt(first_tt))
    midnight = np.floor((utc_s + DAY_S / 2) / DAY_S) * DAY_S - DAY_S / 2
    begin = midnight + np.ceil(round((utc_s - midnight) / step_s, 6)) * step_s
    begin_tt = float(tt_from_utc(begin))
    count = max(int(np.ceil(round((end_tt - begin_tt) / step_s, 6))), 1)
    unit = "s" if begin == int(begin) else "ms"
    return TimeGrid(
        str(iso_from_tt(begin_tt, unit)), step_s * np.arange(count, dtype=np.float64), float(step_s)
    )


def season_grid(first_date: str, last_date: str, step_s: float, place: Site | Orbit | None) -> TimeGrid:
    """Return the grid from local mean noon of the first evening to that after the last night.

    Both dates are evening dates; in space (or None) they are UTC days. Instants are whole multiples of the
    step from 0h UTC, so that they read well; each stands for the `step_s` around it.

    Raises:
        RangeError: the last date comes before the first, or the step is not positive.
        DateError: a date outside the tables.

    """
    place = place or Orbit()
    if last_date < first_date:
        raise RangeError(f"the last date {last_date} comes before the first date {first_date}", "dates.last")
    return _lattice(night_start_tt(place, first_date), night_start_tt(place, last_date) + DAY_S, step_s)


def span_grid(start: str, stop: str, step_s: float) -> TimeGrid:
    """Return the grid from one UTC time to another, the last included when a step falls on it."""
    if not step_s > 0:
        raise RangeError(f"a time step of {step_s:g} s is not positive", "step")
    length = tt_from_iso(stop) - tt_from_iso(start)
    if length < 0:
        raise RangeError(f"the end {stop} comes before the beginning {start}", "to")
    return TimeGrid(
        start, step_s * np.arange(int(length / step_s + 1e-9) + 1, dtype=np.float64), float(step_s)
    )


def times_grid(times: Sequence[str] | Iterable[str]) -> TimeGrid:
    """Return the grid of the given UTC times, in the order given."""
    times = list(times)
    if not times:
        raise RangeError("no time was given; give at least one UTC time, for example 2027-11-25T05:30:00")
    tt = np.array([tt_from_iso(time) for time in times])
    return TimeGrid(times[0], tt - tt[0], 0.0)
