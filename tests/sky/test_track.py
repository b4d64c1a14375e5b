"""The track as a whole: its parts, its rates, its nights and its seams."""

import dataclasses
import math

import numpy as np
import pytest
from astropy import units as u
from astropy.table import QTable
from hypothesis import given, settings
from hypothesis import strategies as st
from sky_bodies import NORTH, OPEN, SOUTH, iau2015

from coldglow.describe.records import Orbit, Site
from coldglow.errors import DateError, NotFoundError, RangeError
from coldglow.sky.clock import TimeGrid, iso_from_tt, season_grid, span_grid, times_grid
from coldglow.sky.ephemeris import load_ephemeris
from coldglow.sky.stored import FORMAT
from coldglow.sky.track import Track, make_track

URANUS = iau2015("uranus")
SYSTEM = URANUS.rotation.systems[0]
POLE = Site(0.0, math.pi / 2, 2800.0)
ARRAYS = [
    field.name for field in dataclasses.fields(Track) if field.name.endswith(("_rad", "_m", "_s", "airmass"))
]


def track(grid, place=NORTH, limits=OPEN, target=URANUS, ephemeris=""):
    return make_track(target, place, limits, grid, target.rotation.systems[0], ephemeris)


def assert_same(one, other):
    for name in ARRAYS:
        np.testing.assert_allclose(
            getattr(one, name), getattr(other, name), rtol=1e-12, atol=1e-12, err_msg=name
        )
    assert np.array_equal(one.observable, other.observable)
    dates = [[t.night_dates[n] for n in t.night] for t in (one, other)]
    assert dates[0] == dates[1]
    for name, mask in one.limited_by.items():
        assert np.array_equal(mask, other.limited_by[name])


@given(st.integers(1, 287), st.sampled_from([NORTH, POLE, Orbit(), Site(math.pi, -0.3, 0.0)]))
@settings(max_examples=30, deadline=None)
def test_a_piece_of_the_grid_gives_a_piece_of_the_track(cut, place):
    grid = season_grid("2028-02-28", "2028-02-29", 600.0, place)
    whole = track(grid, place)
    for chosen in (slice(0, cut), slice(cut, None)):
        assert_same(track(grid.take(chosen), place), whole.take(chosen))


def test_an_array_gives_the_same_as_its_members():
    texts = ["2049-12-31T23:59:59", "1992-12-16", "2028-02-29T12:00", "2035-07-01T06:30:15.250"]
    whole = track(times_grid(texts))
    for i, text in enumerate(texts):
        alone = track(times_grid([text]))
        for name in ARRAYS:
            # rounding of the time in the grid: 2e-7 s of an altitude's turn
            ours, expected = getattr(whole.take(i), name), getattr(alone, name)
            np.testing.assert_allclose(ours, expected, rtol=1e-10, atol=1e-9, err_msg=name)


@pytest.mark.parametrize("place", [SOUTH, Orbit()])
def test_rates_are_derivatives(place):
    grid = TimeGrid("2031-10-01T05:00:00", np.array([-60.0, 0.0, 60.0]), 60.0)
    found = track(grid, place)
    rate = (found.distance_m[2] - found.distance_m[0]) / 120.0
    assert found.range_rate_m_s[1] == pytest.approx(rate, abs=5e-3)
    # directions: the rounding of a double in right ascension, 4e-16 rad, over 120 s
    dec = (found.dec_icrs_rad[2] - found.dec_icrs_rad[0]) / 120.0
    ra = (found.ra_icrs_rad[2] - found.ra_icrs_rad[0]) / 120.0 * math.cos(found.dec_icrs_rad[1])
    assert found.dec_rate_rad_s[1] == pytest.approx(dec, abs=1e-14)
    assert found.ra_rate_rad_s[1] == pytest.approx(ra, abs=1e-14)
    assert abs(found.ra_rate_rad_s[1]) > 1e-12


def test_nights_are_named_by_their_evening():
    grid = season_grid("2027-12-30", "2028-01-02", 300.0, NORTH)
    found = track(grid)
    assert found.night_dates == ("2027-12-30", "2027-12-31", "2028-01-01", "2028-01-02")
    assert list(np.bincount(found.night)) == [288] * 4
    # 12h UTC of the first of January is the small hours of that date at longitude -155.5 deg
    assert track(times_grid(["2028-01-01T12:00"])).night_dates == ("2027-12-31",)


def test_distant_instants_do_not_fill_the_time_between():
    found = track(times_grid(["1980-01-01", "2049-12-31"]))
    assert found.night_dates == ("1979-12-31", "2049-12-30")


def test_a_polar_site_has_its_values():
    found = track(season_grid("2027-06-20", "2027-06-21", 600.0, POLE), POLE)
    assert np.isfinite(found.airmass).all()  # Uranus at declination +20: 20 deg high all day
    np.testing.assert_allclose(found.altitude_rad, found.dec_rad, atol=np.radians(1.0 / 3600.0))
    assert not found.observable.any()
    assert found.limited_by["daylight"].all()
    assert found.why_not == "it is not dark (100 % of the time)"
    winter = track(season_grid("2027-12-20", "2027-12-21", 600.0, POLE), POLE)
    assert winter.observable.all()
    assert winter.why_not == ""


def test_a_target_that_is_never_up_says_so():
    south = Site(0.0, np.radians(-80.0), 100.0)
    found = track(season_grid("2027-06-20", "2027-06-21", 600.0, south), south)
    assert not found.observable.any()
    # Uranus at declination +21 deg culminates at 90 - 80 - 21 = -11 deg
    assert found.why_not == (
        "the target is too low (100 % of the time), the airmass is too large (100 % of the time); "
        "when the Sun allows, the target is never higher than -11 deg"
    )
    assert np.isnan(found.airmass).all()


def test_space_has_no_horizon_but_an_elongation():
    grid = span_grid("2027-07-01", "2028-06-30", 86400.0)
    found = track(grid, Orbit())
    for name in ("altitude_rad", "azimuth_rad", "airmass", "sun_altitude_rad", "parallactic_angle_rad"):
        assert np.isnan(getattr(found, name)).all()
    low, high = OPEN.elongation_min_rad, OPEN.elongation_max_rad
    inside = (found.solar_elongation_rad >= low) & (found.solar_elongation_rad <= high)
    assert np.array_equal(found.observable, inside)
    opposition = int(np.argmax(found.solar_elongation_rad))
    assert np.degrees(found.solar_elongation_rad[opposition]) > 179.0
    # seen from 0.01 au further out, the planet is nearer by as much
    ground = track(grid)
    assert ground.distance_m[opposition] - found.distance_m[opposition] == pytest.approx(1.496e9, rel=0.01)
    # two windows, before and after, each of some 50 days (50 deg of elongation at a degree a day)
    starts = np.flatnonzero(np.diff(found.observable.astype(int)) == 1)
    assert len(starts) == 2
    assert found.observable.sum() == pytest.approx(100, abs=6)


def test_an_ephemeris_may_be_given_itself():
    grid = times_grid(["2030-01-01"])
    assert_same(track(grid, ephemeris=load_ephemeris()), track(grid))
    builtin = track(grid, ephemeris="builtin")
    # Simon et al. 1994: Uranus within 86 arcsec
    assert abs(builtin.dec_icrs_rad - track(grid).dec_icrs_rad)[0] < np.radians(100.0 / 3600.0)


def test_a_stored_table_takes_the_place_of_the_kernel(tmp_path):
    # the planet's way rebuilt from its own places every six hours: the same track again
    stored = track(span_grid("2030-02-25", "2030-03-10", 21600.0))
    table = QTable({"time": list(iso_from_tt(stored.grid.tt_s, "ms"))})
    for column, values, unit in (
        ("ra_icrs", stored.ra_icrs_rad, u.rad),
        ("dec_icrs", stored.dec_icrs_rad, u.rad),
        ("ra_rate", stored.ra_rate_rad_s, u.rad / u.s),
        ("dec_rate", stored.dec_rate_rad_s, u.rad / u.s),
        ("distance", stored.distance_m, u.m),
        ("range_rate", stored.range_rate_m_s, u.m / u.s),
        ("sun_distance", stored.sun_distance_m, u.m),
    ):
        table[column] = values * unit
    place = {"longitude_deg": -155.5, "latitude_deg": 19.8, "height_m": 4200.0}
    table.meta = {
        "format": FORMAT,
        "body": "uranus",
        "place": place,
        "query": "none",
        "answered": "2030-01-01",
    }
    path = str(tmp_path / "uranus.ecsv")
    table.write(path, format="ascii.ecsv")

    target = dataclasses.replace(URANUS, body=path)
    grid = span_grid("2030-03-01", "2030-03-05", 1000.0)
    again, kernel = track(grid, target=target), track(grid)
    np.testing.assert_allclose(again.ra_rad, kernel.ra_rad, atol=np.radians(0.002 / 3600.0))
    np.testing.assert_allclose(again.distance_m, kernel.distance_m, atol=2e3)
    np.testing.assert_allclose(again.range_rate_m_s, kernel.range_rate_m_s, atol=0.05)
    np.testing.assert_allclose(again.sub_observer_longitude_rad, kernel.sub_observer_longitude_rad, atol=1e-6)
    with pytest.raises(RangeError, match=r"was made for the site at longitude -155\.5"):
        track(grid, SOUTH, target=target)


def test_a_body_that_the_ephemeris_lacks_is_an_error():
    with pytest.raises(NotFoundError, match=r"no body 'uranos'.* did you mean uranus"):
        track(times_grid(["2030-01-01"]), target=dataclasses.replace(URANUS, body="uranos"))


def test_a_season_beyond_the_kernel_names_the_first_date_outside():
    with pytest.raises(
        DateError, match=r"2053-10-06 lies outside the span .* it answers 1899-08-01 to 2053-10-05"
    ) as error:
        track(span_grid("2053-10-01", "2053-10-09", 86400.0))
    assert error.value.key == "dates"
