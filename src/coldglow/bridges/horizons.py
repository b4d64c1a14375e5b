"""The online ephemeris of the JPL service, fetched into a file: the only code that touches the network.

What is stored is read back by `coldglow.sky.stored`, without the network and without astroquery.
"""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable
from datetime import datetime
from email.utils import parsedate_to_datetime
from typing import Any

import numpy as np
from astropy import units as u
from astropy.table import QTable

from coldglow.describe.records import Orbit, Site
from coldglow.errors import RangeError, ServiceError
from coldglow.sky.stored import FORMAT

# Codes of the service's major bodies: centres of the planets, not of their systems; 32 is the Sun-Earth L2
# (the codes and the columns below as in the service's own manual, quoted from memory).
_CODES = {"jupiter": "599", "saturn": "699", "uranus": "799", "neptune": "899"}
_L2_CENTRE = "500@32"
_QUANTITIES = "1,3,19,20"
_COLUMNS = {  # ours: (astroquery's name, unit)
    "ra_icrs": ("RA", u.deg),
    "dec_icrs": ("DEC", u.deg),
    "ra_rate": ("RA_rate", u.arcsec / u.hour),
    "dec_rate": ("DEC_rate", u.arcsec / u.hour),
    "distance": ("delta", u.au),
    "range_rate": ("delta_rate", u.km / u.s),
    "sun_distance": ("r", u.au),
}
MARGIN = np.timedelta64(4, "D")
LONGEST_ROWS = 80_000  # the service stops at some 90 000 lines


def fetch(
    body: str,
    place: Site | Orbit,
    start_utc: str,
    stop_utc: str,
    step_minutes: int = 60,
    *,
    timeout_s: float = 30.0,
    tries: int = 3,
    pause: Callable[[float], None] = time.sleep,
) -> QTable:
    """Ask the JPL service for an observer table; store it with ``write(path, format="ascii.ecsv")``.

    Columns: time (ISO UTC), ra_icrs, dec_icrs (astrometric), ra_rate (times cos dec), dec_rate, distance,
    range_rate, sun_distance; the metadata hold the query, the place and the date of the service's answer.
    `body` is a planet's name or anything that the service understands; `pause` waits between the tries (2, 4,
    ... s). Four days are added at either end, so that the times asked for lie well inside the table.

    Raises: ServiceError when the service cannot be reached within `tries` attempts of at most `timeout_s`
    each, or does not answer with a table; RangeError for a question that is too long or empty.
    """
    start, stop = _minute(start_utc) - MARGIN, _minute(stop_utc) + MARGIN
    rows = int((stop - start) / np.timedelta64(step_minutes, "m")) + 1 if step_minutes >= 1 else 0
    if stop_utc < start_utc or not 2 <= rows <= LONGEST_ROWS:
        raise RangeError(
            f"From {start_utc} to {stop_utc} in steps of {step_minutes} minutes there are {rows} rows; the "
            f"service answers between 2 and {LONGEST_ROWS}."
        )
    query = {
        "id": _CODES.get(body.lower(), body),
        "location": _location(place),
        "epochs": {"start": _words(start), "stop": _words(stop), "step": f"{step_minutes}m"},
    }
    for attempt in range(1, tries + 1):
        try:
            answer, address, date = _ask(query, timeout_s)
        except OSError as error:  # every network error of requests is one
            if attempt == tries:
                raise ServiceError(
                    f"The JPL service could not be reached in {tries} tries of at most {timeout_s:g} s "
                    f"({type(error).__name__}). Is this computer online? Everything but fetch works without."
                ) from error
            pause(2.0**attempt)
        except (ValueError, KeyError, IndexError, UnboundLocalError) as error:
            raise ServiceError(
                f"The JPL service gave no table for {body!r} from {start_utc} to {stop_utc}. Its answer: "
                f"{_shortened(str(error))}"
            ) from error
        else:
            return _stored(answer, body, place, address, date)
    raise ServiceError(f"The JPL service was to be asked {tries} times.")


def _ask(query: dict[str, Any], timeout_s: float) -> tuple[Any, str, str]:
    """Return the service's table, the address that was asked, and the ISO date of the answer."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from astroquery.jplhorizons import Horizons  # slow to import, and needed for this command alone

        service = Horizons(**query)
        service.TIMEOUT = timeout_s
        table = service.ephemerides(quantities=_QUANTITIES, extra_precision=True, cache=False)
    stamp = service.last_response.headers.get("Date", "")
    date = parsedate_to_datetime(stamp).date().isoformat() if stamp else ""
    return table, str(service.uri), date


def _stored(answer: Any, body: str, place: Site | Orbit, address: str, date: str) -> QTable:
    """Return the answer in our columns, with all that says where it came from."""
    days = np.asarray(answer["datetime_jd"], dtype=float) - 2451545.0
    moments = np.datetime64("2000-01-01T12:00:00", "ms") + np.rint(days * 86_400_000.0).astype(
        "timedelta64[ms]"
    )
    table = QTable({"time": np.datetime_as_string(moments)})
    for name, (theirs, unit) in _COLUMNS.items():
        table[name] = np.asarray(answer[theirs], dtype=float) * unit
    table.meta = {
        "format": FORMAT,
        "source": "JPL Horizons observer table",
        "body": body,
        "service_body": str(answer["targetname"][0]),
        "place": _place_words(place),
        "query": address,
        "answered": date,
        "time_scale": "UTC",
    }
    return table


def _place_words(place: Site | Orbit) -> dict[str, Any]:
    if isinstance(place, Orbit):
        return {"orbit": place.kind}
    return {
        "longitude_deg": round(float(np.degrees(place.longitude_rad)), 9),
        "latitude_deg": round(float(np.degrees(place.latitude_rad)), 9),
        "height_m": float(place.height_m),
    }


def _location(place: Site | Orbit) -> str | dict[str, float]:
    if isinstance(place, Orbit):
        return _L2_CENTRE
    words = _place_words(place)
    return {
        "lon": words["longitude_deg"] % 360.0,
        "lat": words["latitude_deg"],
        "elevation": place.height_m / 1e3,
    }


def _words(moment: np.datetime64) -> str:
    return str(moment).replace("T", " ")


def _minute(iso: str) -> np.datetime64:
    try:
        return np.datetime64(datetime.fromisoformat(iso).replace(tzinfo=None), "m")
    except ValueError:
        raise RangeError(f"{iso!r} is no ISO date or time; write 2031-10-01 or 2031-10-01T05:30.") from None


def _shortened(text: str) -> str:
    words = " ".join(text.split())
    return words if len(words) <= 400 else words[:400] + " ..."
