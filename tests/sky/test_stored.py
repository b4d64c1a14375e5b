import math
from dataclasses import replace

import numpy as np
import pytest
from astropy import units as u
from astropy.table import QTable
from skyfield_places import SITE, skyfield_place

from coldglow.describe.records import Orbit
from coldglow.errors import DateError, NotFoundError, RangeError
from coldglow.sky.clock import times_grid
from coldglow.sky.ephemeris import load_ephemeris
from coldglow.sky.place import observe, see
from coldglow.sky.stored import FORMAT, load_stored, with_stored

MOMENTS = np.arange("2027-11-16T00:00", "2027-12-05T00:01", 360, dtype="datetime64[m]")


def make(path, **changes):
    ra, dec, distance, rate, ra_rate, dec_rate, sun = skyfield_place(MOMENTS)
    table = QTable(
        {
            "time": np.datetime_as_string(MOMENTS),
            "ra_icrs": np.degrees(ra) * u.deg,
            "dec_icrs": np.degrees(dec) * u.deg,
            "ra_rate": ra_rate * np.cos(dec) * u.rad / u.s,
            "dec_rate": dec_rate * u.rad / u.s,
            "distance": distance * u.au,
            "range_rate": rate * u.km / u.s,
            "sun_distance": sun * u.au,
        }
    )
    table.meta = {
        "format": FORMAT,
        "body": "uranus",
        "place": {"longitude_deg": -68.0, "latitude_deg": -25.0, "height_m": 4300.0},
        "query": "made for a test",
        "answered": "2027-09-06",
    }
    table.meta |= changes
    table.write(path, format="ascii.ecsv")
    return str(path)


@pytest.fixture(scope="module")
def path(tmp_path_factory):
    return make(tmp_path_factory.mktemp("stored") / "uranus.ecsv")


def test_between_its_rows_it_is_where_an_independent_library_sees_the_planet(path):
    # skyfield with the same kernel, topocentric astrometric place, at instants that are no rows
    moments = np.arange("2027-11-21T03:17", "2027-11-30T00:00", 1013, dtype="datetime64[m]")
    grid = times_grid(list(np.datetime_as_string(moments)))
    sight = see(observe(SITE, grid.tt_s, with_stored(load_ephemeris(), path, SITE)), path)
    ra, dec, distance, rate, *_, sun = skyfield_place(moments)
    expected = np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=1)
    found = sight.astrometric_m / sight.distance_m[:, None]
    assert np.linalg.norm(found - expected, axis=1).max() < math.radians(0.001 / 3600)  # 0.001 arcsec
    np.testing.assert_allclose(sight.distance_m, distance * 149597870700.0, atol=2000.0)
    speed = np.einsum("ij,ij->i", sight.rate_m_s, found)
    np.testing.assert_allclose(speed, rate * 1e3, atol=0.1)
    np.testing.assert_allclose(np.linalg.norm(sight.heliocentric_m, axis=1), sun * 149597870700.0, rtol=1e-7)


def test_other_bodies_are_those_of_the_ephemeris_beneath(path):
    base = load_ephemeris()
    stored = with_stored(base, path, SITE)
    when = np.array([8.8e8])
    for body in ("sun", "moon", "earth", "neptune"):
        np.testing.assert_array_equal(stored.state(body, when)[0], base.state(body, when)[0])
        assert stored.span(body) == base.span(body)


def test_dates_beside_the_table_are_refused(path):
    grid = times_grid(["2028-02-01T00:00"])
    with pytest.raises(DateError, match=r"uranus\.ecsv.*2027-11-19 to 2027-12-01"):
        see(observe(SITE, grid.tt_s, with_stored(load_ephemeris(), path, SITE)), path)


@pytest.mark.parametrize(
    "other",
    [replace(SITE, latitude_rad=SITE.latitude_rad + 1e-3), replace(SITE, height_m=2000.0), Orbit()],
)
def test_another_place_is_refused(path, other):
    with pytest.raises(RangeError, match=r"made for the site at longitude -68\.0000 deg") as caught:
        load_stored(path, other)
    assert caught.value.key == "body"


def test_the_place_may_be_left_open(path):
    assert load_stored(path).place.height_m == 4300.0


def test_a_missing_file_names_the_command_that_makes_one(tmp_path):
    with pytest.raises(NotFoundError, match="coldglow fetch"):
        load_stored(str(tmp_path / "no.ecsv"))


def test_other_files_are_refused(tmp_path):
    text = tmp_path / "x.ecsv"
    text.write_text("hello\n", encoding="utf-8")
    with pytest.raises(RangeError, match="no stored ephemeris"):
        load_stored(str(text))
    with pytest.raises(RangeError, match="its format is 'other/1'"):
        load_stored(make(tmp_path / "y.ecsv", format="other/1"))
    with pytest.raises(RangeError, match="damaged ephemeris"):
        load_stored(make(tmp_path / "z.ecsv", place={"longitude_deg": 3.0}))


def test_rows_out_of_order_are_refused(path, tmp_path):
    table = QTable.read(path, format="ascii.ecsv")
    table.reverse()
    table.write(tmp_path / "r.ecsv", format="ascii.ecsv")
    with pytest.raises(RangeError, match="ascending"):
        load_stored(str(tmp_path / "r.ecsv"))
