"""Fixed stars: the packaged list of telluric standards or the user's own, and where they stand."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path

import erfa
import numpy as np

from coldglow.describe.records import Site
from coldglow.errors import NotFoundError, RangeError
from coldglow.sky.clock import DAY_S, Floats, tdb_from_tt, ut1_from_tt

_J2000_JD = 2451545.0


@dataclass(frozen=True, slots=True)
class Stars:
    """A list of stars; every array and tuple is [star]. ICRS places, V magnitudes."""

    designation: tuple[str, ...]
    ra_rad: Floats
    dec_rad: Floats
    magnitude: Floats
    spectral_type: tuple[str, ...]


def load_standards(path: str = "") -> Stars:
    """Return the packaged early-type stars ('' ) or those of a CSV file of the user.

    The file has a line of column names and then one star a line: `designation`, `ra_deg`, `dec_deg`,
    `magnitude`, and `spectral_type` if wanted; lines that begin with # are comments. The packaged list has
    B9-A1 dwarfs, mean places of 2016.5 in ICRS axes without proper motion since (some arcsec).

    Raises: NotFoundError without such a file; RangeError, with the line, for a file that cannot be used.
    Source: for the packaged list, Bright Stars of the Astronomical Almanac for 2016 (see its header).
    """
    if path and not Path(path).is_file():
        raise NotFoundError(f"There is no list of standard stars {path!r}.")
    text = (Path(path) if path else files("coldglow.data") / "standards.csv").read_text(encoding="utf-8-sig")
    numbered = [
        (number, line)
        for number, line in enumerate(text.splitlines(), 1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    rows = csv.DictReader([line for _, line in numbered], skipinitialspace=True)
    needed = (
        ("designation", "ra_deg", "dec_deg", "magnitude") if path else ("hr", "ra_deg", "dec_deg", "v_mag")
    )
    columns = [name.strip() for name in rows.fieldnames or ()]
    rows.fieldnames = columns
    missing = [name for name in needed if name not in columns]
    if missing:
        raise RangeError(
            f"The list of standard stars {path!r} has no column {', '.join(missing)}; its first line must "
            "name designation, ra_deg, dec_deg and magnitude, and it names "
            f"{', '.join(columns) or 'nothing'}."
        )
    listed = [(numbered[i + 1][0], row) for i, row in enumerate(rows)]
    if not listed:
        raise RangeError(f"The list of standard stars {path!r} holds no star.")
    values = np.array([[_number(path, number, row, name) for name in needed[1:]] for number, row in listed])
    for number, (ra_deg, dec_deg) in zip((number for number, _ in listed), values[:, :2], strict=True):
        if not (-360.0 <= ra_deg <= 360.0 and abs(dec_deg) <= 90.0):
            raise RangeError(
                f"{path}:{number}: a star at ra_deg {ra_deg:g}, dec_deg {dec_deg:g} cannot be; right "
                "ascension lies in 0 to 360 deg, declination in -90 to 90 deg."
            )
    return Stars(
        designation=tuple(_designation(row, path) for _, row in listed),
        ra_rad=np.radians(values[:, 0]) % (2.0 * np.pi),
        dec_rad=np.radians(values[:, 1]),
        magnitude=values[:, 2].copy(),
        spectral_type=tuple((row.get("spectral_type") or "").strip() for _, row in listed),
    )


def star_altaz(stars: Stars, site: Site, tt_s: Floats) -> tuple[Floats, Floats]:
    """Return airless altitude and azimuth (N through E) in radians, each ndarray[star, time].

    Annual aberration, light deflection, precession and nutation by ERFA (apci13, atciqz), the Earth's
    rotation by the program's own UT1. Left out: parallax and proper motion of the stars, diurnal
    aberration and polar motion (together below 1 arcsec, parallax and proper motion aside).
    """
    tt_s = np.atleast_1d(np.asarray(tt_s, dtype=float))
    context, _ = erfa.apci13(_J2000_JD, tdb_from_tt(tt_s) / DAY_S)
    ra_cirs, dec_cirs = erfa.atciqz(stars.ra_rad[:, None], stars.dec_rad[:, None], context)
    rotation = erfa.era00(_J2000_JD, ut1_from_tt(tt_s) / DAY_S)
    azimuth, altitude = erfa.hd2ae(rotation + site.longitude_rad - ra_cirs, dec_cirs, site.latitude_rad)
    return altitude, azimuth


def _designation(row: dict[str, str], path: str) -> str:
    """Return the name of a star: as the user wrote it, or the HR number and, where it has one, its name."""
    name = " ".join((row["designation"] or "").split())
    if path:
        return name
    return f"HR {row['hr']}" + (f" ({name})" if name else "")


def _number(path: str, number: int, row: dict[str, str], name: str) -> float:
    text = (row[name] or "").strip()
    try:
        value = float(text)
    except ValueError:
        value = np.nan
    if not np.isfinite(value):
        raise RangeError(f"{path}:{number}: {name} is {text!r}; write a number.")
    return value
