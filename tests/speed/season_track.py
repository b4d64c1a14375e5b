"""Time the track of a season (184 nights at 5 minutes) against astroplan's vectorised altaz in the same run.

Run ``python tests/speed/season_track.py`` (about a minute). Wanted on two cores with warm files: below 0.2 s
once loaded, and more than 100 times faster than astroplan for the same bodies from the same kernel. astroplan
takes the place of a moving target from astropy's ``get_body``; a track holds planet, Sun and Moon, so the
baseline is the three. What altaz alone takes, the planet's coordinates handed over, is printed as well.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from astropy.coordinates import SkyCoord, get_body, solar_system_ephemeris
from astropy.time import Time

sys.path.insert(0, str(Path(__file__).parents[1] / "sky"))
from sky_bodies import KERNEL, OPEN, SOUTH, iau2015

from coldglow.bridges.astroplan import observer, offline
from coldglow.sky.clock import iso_from_tt, season_grid
from coldglow.sky.track import Track, make_track

WANTED_S, WANTED_RATIO = 0.2, 100.0


def timed(words: str, job: Callable[[], object]) -> tuple[float, object]:
    """Run a job and print how long it took."""
    begin = time.perf_counter()
    result = job()
    taken_s = time.perf_counter() - begin
    print(f"{words:<58} {taken_s:8.3f} s", flush=True)
    return taken_s, result


def main() -> int:
    """Print the times, their ratios and how far the altitudes differ; 1 if a wanted figure is missed."""
    target = iau2015("uranus")
    grid = season_grid("2027-08-01", "2028-01-31", 300.0, SOUTH)
    print(f"{grid.time_s.size} instants")

    def ours() -> Track:
        return make_track(target, SOUTH, OPEN, grid, target.rotation.systems[0])

    timed("season track, first call", ours)
    ours_s, track = min((timed("season track, once loaded", ours) for _ in range(5)), key=lambda run: run[0])

    watcher = observer(SOUTH)
    with offline(), solar_system_ephemeris.set(str(KERNEL)):
        texts = list(iso_from_tt(grid.tt_s, "ms"))

        def place() -> SkyCoord:
            return get_body("uranus", Time(texts, scale="utc"), watcher.location)

        def altaz(body: SkyCoord) -> SkyCoord:
            return watcher.altaz(Time(texts, scale="utc"), body, grid_times_targets=False)

        place_s, body = timed("astropy, place of the planet", place)
        altaz_s, there = timed("astroplan, altaz of the planet", lambda: altaz(body))
        sun_s, _ = timed("astroplan, altaz of the Sun", lambda: watcher.sun_altaz(Time(texts, scale="utc")))
        moon_s, _ = timed(
            "astroplan, altaz of the Moon", lambda: watcher.moon_altaz(Time(texts, scale="utc"))
        )
    apart = np.abs(there.alt.rad - track.altitude_rad).max() * 648000.0 / np.pi
    ratio = (place_s + altaz_s + sun_s + moon_s) / ours_s
    print(f"altitudes agree to {apart:.1f} arcsec; altaz of the planet alone: ratio {altaz_s / ours_s:.0f}")
    print(f"ratio {ratio:.0f} (wanted > {WANTED_RATIO:.0f}); track {ours_s:.3f} s (wanted < {WANTED_S} s)")
    return int(ours_s > WANTED_S or ratio < WANTED_RATIO)


if __name__ == "__main__":
    sys.exit(main())
