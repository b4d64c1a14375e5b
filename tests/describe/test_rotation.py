"""Rotation constants against the report, and longitude systems that are anchored to another one."""

import csv
import math
import re
from pathlib import Path

import pytest

from coldglow.describe.load import load_target

DAY_S = 86400.0
CENTURY_S = 36525 * DAY_S
# Rows copied from Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, tables 1, 2 and 4.
ROWS = {
    row["body"]: row
    for row in csv.DictReader(
        line
        for line in (Path(__file__).parents[1] / "data" / "describe" / "iau2015.csv").read_text().splitlines()
        if not line.startswith("#")
    )
}
PLANETS = ("jupiter", "saturn", "uranus", "neptune")


def system(planet, name):
    return {one.name: one for one in load_target(planet).rotation.systems}[name]


def meridian_deg(one, days):
    """W without the periodic terms."""
    return math.degrees(one.prime_meridian_rad + one.rate_rad_s * days * DAY_S)


def apart_deg(first, second, days):
    return (meridian_deg(first, days) - meridian_deg(second, days) + 180) % 360 - 180


@pytest.mark.parametrize("planet", PLANETS)
def test_pole_meridian_rate_and_radii_are_those_of_the_report(planet):
    row, target = ROWS[planet], load_target(planet)
    (ra, ra_rate), (dec, dec_rate) = target.rotation.pole_ra_rad, target.rotation.pole_dec_rad
    for value, key in ((ra, "ra_deg"), (ra_rate, "ra_rate"), (dec, "dec_deg"), (dec_rate, "dec_rate")):
        assert math.degrees(value) == pytest.approx(float(row[key]), rel=1e-14, abs=1e-15)
    iau = system(planet, "iau2015")
    assert math.degrees(iau.prime_meridian_rad) == pytest.approx(float(row["w0_deg"]), rel=1e-14)
    assert math.degrees(iau.rate_rad_s) * DAY_S == pytest.approx(float(row["rate_deg_day"]), rel=1e-14)
    assert target.figure.equatorial_radius_m == 1000 * float(row["equatorial_km"])
    assert target.figure.polar_radius_m == 1000 * float(row["polar_km"])


@pytest.mark.parametrize("planet", PLANETS)
def test_periodic_terms_are_those_of_the_report(planet):
    expected = [tuple(map(float, term.split())) for term in ROWS[planet]["terms"].split(";") if term.strip()]
    found = [
        tuple(
            math.degrees(part)
            for part in (term.angle_rad, term.rate_rad_century, term.ra_rad, term.dec_rad, term.meridian_rad)
        )
        for term in load_target(planet).rotation.terms
    ]
    assert len(found) == len(expected)
    for mine, theirs in zip(found, expected, strict=True):
        assert mine == pytest.approx(theirs, rel=1e-13, abs=1e-15)


def test_other_systems_of_the_report():
    # Archinal et al. 2018, notes to table 1; Neptune III from the report of 2009 and earlier.
    for planet, name, w0, rate in (
        ("jupiter", "i", 67.1, 877.900),
        ("jupiter", "ii", 43.3, 870.270),
        ("jupiter", "iii", 284.95, 870.536),
        ("saturn", "iii", 38.90, 810.7939024),
        ("neptune", "iii", 253.18, 536.3128492),
    ):
        one = system(planet, name)
        assert math.degrees(one.prime_meridian_rad) == pytest.approx(w0, rel=1e-14)
        assert math.degrees(one.rate_rad_s) * DAY_S == pytest.approx(rate, rel=1e-14)


@pytest.mark.parametrize("planet", [*PLANETS, "cold-giant"])
def test_longitude_grows_as_a_distant_observer_sees_it(planet):
    for one in load_target(planet).rotation.systems:
        assert (one.rate_rad_s > 0) == (one.grows == "west")
        assert one.period_s == pytest.approx(2 * math.pi / abs(one.rate_rad_s), rel=1e-15)


def test_defaults_are_those_of_the_ionosphere():
    default = {name: load_target(name).rotation.systems[0].name for name in PLANETS}
    assert default == {"jupiter": "iii", "saturn": "iii", "uranus": "auroral", "neptune": "iii"}


def test_a_corrected_period_of_uranus_keeps_the_phase_of_1986_not_of_2000():
    # Nat. Astron. 2025, doi 10.1038/s41550-025-02492-z: 17.247864 h +- 0.000010 h
    new, old = system("uranus", "auroral"), system("uranus", "iau2015")
    assert new.period_s / 3600 == pytest.approx(17.247864, rel=1e-12)
    assert new.period_uncertainty_s / 3600 == pytest.approx(0.000010, rel=1e-12)
    assert old.period_uncertainty_s / 3600 == pytest.approx(0.01, rel=1e-12)
    days = -5090.5  # from noon of 1 January 2000 back to 0 h of 24 January 1986
    assert new.tie_epoch_s == old.tie_epoch_s == days * DAY_S
    assert apart_deg(new, old, days) == pytest.approx(0, abs=1e-8)
    # by hand: 24 h/17.24 h - 24 h/17.247864 h = 0.000634717 turns a day; times 5090.5 days = 3.23103 turns
    assert apart_deg(new, old, 0) == pytest.approx(360 * 3.23103 - 1080, abs=0.01)


def test_two_clocks_of_neptune_drift_by_4_83_degrees_a_day():
    radio, clouds = system("neptune", "iii"), system("neptune", "iau2015")
    assert apart_deg(clouds, radio, 1) - apart_deg(clouds, radio, 0) == pytest.approx(4.8269265, abs=1e-7)
    assert radio.period_s / 3600 == pytest.approx(16.11, abs=5e-5)
    assert clouds.period_s / 3600 == pytest.approx(15.9663, abs=5e-5)


def test_an_anchored_system_without_a_rate_is_the_same_system():
    for planet in ("jupiter", "saturn"):
        mine, iau = system(planet, "iii"), system(planet, "iau2015")
        assert (mine.prime_meridian_rad, mine.rate_rad_s) == (iau.prime_meridian_rad, iau.rate_rad_s)


def test_the_cold_giant_turns_like_neptune():
    assert load_target("cold-giant").rotation == load_target("neptune").rotation


def test_the_default_may_be_changed_by_one_line(write):
    path = write("mine.yaml", "format: coldglow-target/1\nextends: uranus\nrotation:\n  default: iau2015\n")
    assert [one.name for one in load_target(path).rotation.systems] == ["iau2015", "auroral"]


def test_the_rows_are_complete():
    assert set(ROWS) == set(PLANETS)
    assert all(re.fullmatch(r"[-\d. ;]*", row["terms"]) for row in ROWS.values())
