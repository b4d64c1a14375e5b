"""How well places and orientation agree with SPICE, skyfield and ephem: the table of the project guide.

Not part of the normal run, which holds each of these below its tolerance (`tests/sky`): ``python
tests/long/agreement.py`` prints the largest difference over 300 instants of 2024-2050, same kernel.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "sky"))
import test_events as events
import test_orientation as orientation
import test_place as places
from sky_bodies import KERNEL, SITES, iau2015, rows
from skyfield.api import load, load_file, wgs84
from skyfield.framelib import true_equator_and_equinox_of_date as of_date

from coldglow.sky import place
from coldglow.sky.clock import iso_from_tt, tdb_from_tt, tt_from_iso, ut1_from_tt
from coldglow.sky.ephemeris import PLANETS
from coldglow.sky.vectors import dot, length

SITE = places.SOUTH


def spice_differences(planet: str) -> tuple[float, float, float, float]:
    """Return the largest differences from SPICE: sub-points (deg), range rate (m/s), distance (m), of 300."""
    times = places.TIMES
    spice = next(pool := orientation.spice.__wrapped__())
    target, ours = iau2015(planet), orientation.track(planet, [str(t) for t in iso_from_tt(times, "ms")])
    tdb = tdb_from_tt(ours.grid.tt_s)
    equatorial, polar = (1e-3 * r for r in (target.figure.equatorial_radius_m, target.figure.polar_radius_m))
    longitude, latitude = 0.0, 0.0
    for i, et in enumerate(tdb):
        seen, light_s = spice.spkpos(f"{planet} barycenter", et, "J2000", "CN", "EARTH")
        outside = spice.pxform("J2000", f"IAU_{planet}", et - light_s) @ -seen
        point = spice.surfpt(outside, -outside, equatorial, equatorial, polar)
        expected = spice.recpgr(planet, point, equatorial, 1.0 - polar / equatorial)
        longitude = max(longitude, abs(orientation.turned(ours.sub_observer_longitude_rad[i] - expected[0])))
        latitude = max(latitude, abs(np.degrees(ours.sub_observer_latitude_rad[i] - expected[1])))
    name = f"{planet} barycenter"
    states = np.array([spice.spkezr(name, t, "J2000", "CN", "EARTH")[0] for t in tdb_from_tt(times)]) * 1e3
    next(pool, None)
    _, sight = places.seen(places.GEOCENTRE, times, planet)
    unit = states[:, :3] / length(states[:, :3])[:, None]
    rate = dot(sight.rate_m_s, sight.astrometric_m) / sight.distance_m
    far = np.abs(sight.astrometric_m - states[:, :3]).max()
    return longitude, latitude, np.abs(rate - dot(unit, states[:, 3:])).max(), far


def skyfield_differences(planet: str) -> tuple[float, float, float]:
    """Return the largest differences from skyfield: astrometric, apparent place, altitude, all in arcsec."""
    times = places.TIMES
    time = load.timescale(builtin=True).tt_jd(2451545.0 + times / 86400.0)
    time.delta_t = times - ut1_from_tt(times)
    kernel = load_file(str(KERNEL))
    here = wgs84.latlon(np.degrees(SITE.latitude_rad), np.degrees(SITE.longitude_rad), SITE.height_m)
    astrometric = (kernel["earth"] + here).at(time).observe(kernel[f"{planet} barycenter"])
    apparent = astrometric.apparent()
    observer, sight = places.seen(SITE, times, planet)
    ra, dec, _ = astrometric.radec()
    first = places.off_arcsec(sight.astrometric_m, ra._degrees, dec.degrees).max()
    dec, ra, _ = apparent.frame_latlon(of_date)
    second = places.off_arcsec(sight.apparent, ra.degrees, dec.degrees).max()
    altitude, _ = place.altitude_azimuth(observer, sight.apparent)
    third = np.abs(altitude - apparent.altaz()[0].radians).max() / places.ARCSEC
    kernel.close()
    return first, second, third


def event_differences() -> dict[str, float]:
    """Return the largest difference in time of twilight, rise, transit and set from each library, in s."""
    largest: dict[str, float] = {}
    for row in rows("events.csv"):
        found = events.night_events(SITES[row["site"]], [row["evening_date"]], row["planet"])
        ours = getattr(found, f"{events.FIELDS[row['event']]}_tt_s")[0]
        for library in ("skyfield_utc", "ephem_utc", "astropy_root_utc"):
            if row[library]:
                late = abs(ours - tt_from_iso(row[library]))
                largest[library] = max(largest.get(library, 0.0), float(late))
    return largest


def main() -> None:
    """Print the table."""
    print(
        "| body | SPICE: longitude, latitude (deg) | range-rate (m/s) | distance (m) | "
        "skyfield: astrometric, apparent, altitude (arcsec) |\n|---|---|---|---|---|"
    )
    for planet in PLANETS:
        longitude, latitude, rate, far = spice_differences(planet)
        angles = ", ".join(f"{value:.4f}" for value in skyfield_differences(planet))
        print(f"| {planet} | {longitude:.1e}, {latitude:.1e} | {rate:.1e} | {far:.1f} | {angles} |")
    print("events:", {name: round(value, 2) for name, value in event_differences().items()})


if __name__ == "__main__":
    main()
