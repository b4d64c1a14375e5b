"""Standard stars of the chosen stretches: nearest in airmass and on the sky when one begins and ends."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coldglow.answers.asking.chosen import Stretch
from coldglow.describe.records import Site
from coldglow.plan.standards import nearest_standards
from coldglow.report.results import Table, column, table
from coldglow.sky.clock import iso_from_tt
from coldglow.sky.night import airmass
from coldglow.sky.stars import Stars, star_altaz

COUNT = 2  # for each moment: the best and one to fall back upon


@dataclass(frozen=True, slots=True)
class Standard:
    """A star at the moment at which it is wanted."""

    when: str  # "before" or "after"
    time: str  # ISO, UTC
    designation: str
    spectral_type: str
    magnitude: float
    ra_rad: float
    dec_rad: float
    airmass: float
    airmass_difference: float  # star minus target
    separation_rad: float

    def __str__(self) -> str:
        """Return the star in a few words for a calendar."""
        return f"{self.designation} (V {self.magnitude:.1f}, airmass {self.airmass:.2f})"


def standards_for(stretch: Stretch, stars: Stars) -> tuple[Standard, ...]:
    """Return the best stars before and after a stretch; none in space, fewer where fewer are up."""
    scene = stretch.scene
    place, limits, track = scene.use.instrument.place, scene.use.instrument.limits, scene.track
    if not isinstance(place, Site):
        return ()
    steps = [stretch.first, stretch.end - 1]
    tt_s = track.grid.tt_s[steps]
    altitude, azimuth = star_altaz(stars, place, tt_s)
    through = airmass(altitude)
    high = np.where(altitude <= limits.altitude_max_rad, through, np.nan)  # outside the zenith gap
    choice = nearest_standards(
        track.altitude_rad[steps],
        track.azimuth_rad[steps],
        track.airmass[steps],
        altitude,
        azimuth,
        np.where(high <= limits.airmass_max, high, np.nan),
        count=COUNT,
        altitude_min_rad=limits.altitude_min_rad,
    )
    times = iso_from_tt(np.array([stretch.start_tt_s, stretch.end_tt_s]), "m")
    return tuple(
        Standard(
            when,
            str(times[m]),
            stars.designation[star],
            stars.spectral_type[star],
            float(stars.magnitude[star]),
            float(stars.ra_rad[star]),
            float(stars.dec_rad[star]),
            float(through[star, m]),
            float(choice.airmass_difference[m, rank]),
            float(choice.separation_rad[m, rank]),
        )
        for m, when in enumerate(("before", "after"))
        for rank, star in enumerate(choice.star[m])
        if star >= 0
    )


def standards_table(stretches: Sequence[tuple[Stretch, tuple[Standard, ...]]]) -> Table | None:
    """Return the stars of some stretches as a table; None where there are none."""
    rows = [star for _, stars in stretches for star in stars]
    if not rows:
        return None
    return table(
        column("star", [row.designation for row in rows]),
        column("when", [f"{row.time[11:16]}, {row.when}" for row in rows]),
        column("type", [row.spectral_type for row in rows]),
        column("V", [row.magnitude for row in rows], decimals=1),
        column("ra", [sexagesimal(row.ra_rad, hours=True) for row in rows], description="ICRS"),
        column("dec", [sexagesimal(row.dec_rad) for row in rows], description="ICRS"),
        column("airmass", [row.airmass for row in rows], decimals=2),
        column("difference", [row.airmass_difference for row in rows], decimals=2, description="of airmass"),
        column("apart", np.degrees([row.separation_rad for row in rows]), "deg", decimals=0),
        caption="Standard stars, nearest in airmass and on the sky; the second of a pair to fall back upon",
        rows=range(len(rows)),
    )


def sexagesimal(angle_rad: float, hours: bool = False) -> str:
    """Return an angle as ``03:51:20.1`` (hours, minutes, seconds) or ``+19:40:12`` (degrees)."""
    size = np.degrees(angle_rad) / (15.0 if hours else 1.0)
    if hours:
        tenths = round((size % 24.0) * 36000.0) % 864000
        return f"{tenths // 36000:02d}:{tenths // 600 % 60:02d}:{tenths % 600 / 10.0:04.1f}"
    seconds = round(abs(size) * 3600.0)
    sign = "−" if angle_rad < 0 else "+"
    return f"{sign}{seconds // 3600:02d}:{seconds // 60 % 60:02d}:{seconds % 60:02d}"
