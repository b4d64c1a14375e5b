"""Bodies, sites and limits for the tests of the sky, read from the table of rotation elements beside them."""

from __future__ import annotations

import csv
import importlib.util
import math
import re
from pathlib import Path

from coldglow.describe.records import (
    Continuum,
    Cooling,
    Emission,
    Estimate,
    Figure,
    Limits,
    LongitudeSystem,
    PeriodicTerm,
    Rotation,
    Site,
    Target,
)

KERNEL = Path(importlib.util.find_spec("skyfield_data").submodule_search_locations[0]) / "data" / "de421.bsp"
DATA = Path(__file__).parents[1] / "data" / "sky"
DAY_S = 86400.0

# the two sites of physical_ephemeris.ecsv and visibility.csv: coordinates only
NORTH = Site(math.radians(-155.5), math.radians(19.8), 4200.0)
SOUTH = Site(math.radians(-70.4), math.radians(-24.6), 2600.0)
SITES = {"north_summit": NORTH, "south_desert": SOUTH}

OPEN = Limits(
    airmass_max=40.0,
    altitude_min_rad=0.0,
    altitude_max_rad=math.pi / 2,
    sun_altitude_max_rad=math.radians(-12.0),
    daytime=False,
    sun_separation_min_rad=0.0,
    moon_separation_min_rad=0.0,
    elongation_min_rad=math.radians(85.0),
    elongation_max_rad=math.radians(135.0),
    longest_visit_s=math.inf,
)


def rows(name: str) -> list[dict[str, str]]:
    """Return the rows of a table with comment lines."""
    lines = [line for line in (DATA / name).read_text().splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines, delimiter="," if "," in lines[0] else " "))


def _linear(text: str) -> tuple[float, float]:
    """Return constant and rate of ``268.056595-0.006499T`` in radians."""
    match = re.fullmatch(r"(-?[\d.]+)(?:([+-][\d.]+)T)?", text)
    return math.radians(float(match[1])), math.radians(float(match[2] or 0.0))


def _terms(text: str) -> tuple[PeriodicTerm, ...]:
    """Return the periodic terms, from the words in which the table writes them."""
    if text == "none":
        return ()
    angles = {name: _linear(value) for name, value in re.findall(r"(\b[A-Z][a-z]?)=([\d.+T-]+)", text)}
    sums: dict[str, dict[str, float]] = {name: {} for name in angles}
    for clause in text.split(";"):
        if "+=" not in clause:
            continue
        quantity, series = (part.strip() for part in clause.split("+="))
        for sign, value, name in re.findall(r"([+-]?) ?([\d.]+) (?:sin|cos) ([A-Z][a-z]?)", series):
            sums[name][quantity] = math.radians(float(sign + value))
    return tuple(
        PeriodicTerm(*angles[name], part.get("alpha0", 0.0), part.get("delta0", 0.0), part.get("W", 0.0))
        for name, part in sums.items()
    )


def iau2015(planet: str) -> Target:
    """Return a target with figure and rotation of the IAU 2015 report; everything else is a placeholder."""
    row = next(row for row in rows("iau2015_rotation.csv") if row["body"] == planet)
    rate = math.radians(float(row["Wdot_deg_per_day"])) / DAY_S
    system = LongitudeSystem(
        "iau2015",
        math.radians(float(row["W0_deg"])),
        rate,
        "west" if rate > 0 else "east",
        2 * math.pi / abs(rate),
        36.0,
        0.0,
        "Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22",
    )
    return Target(
        name=planet,
        body=planet,
        rotation=Rotation(
            _linear(row["alpha0_deg"]),
            _linear(row["delta0_deg"]),
            _terms(row["periodic_terms"]),
            (system,),
            "",
        ),
        figure=Figure(1e3 * float(row["r_equatorial_km"]), 1e3 * float(row["r_polar_km"]), 1e6, ""),
        emission=Emission(Estimate(500.0), Estimate(1e16), "vertical", Estimate(1.0), (), ""),
        continuum=Continuum((3e-6, 4e-6), (0.0, 0.0), (), (), ""),
        cooling=Cooling(
            "constant", "2020-01-01", Estimate(0.0), None, None, Estimate(0.0), (), (), (), None, ""
        ),
    )
