"""Time scales against astropy, ERFA and the daily table of the Earth's rotation; grids and the calendar."""

import astropy_iers_data
import erfa
import numpy as np
import pytest
from astropy.time import Time
from astropy.utils import iers
from hypothesis import given
from hypothesis import strategies as st
from sky_bodies import NORTH

from coldglow.describe.records import Orbit, Site
from coldglow.errors import DateError, RangeError
from coldglow.sky import clock


@pytest.mark.parametrize(
    "text",
    [
        "1973-06-01T00:00:00",
        "1992-12-16T00:00:00",
        "2016-12-31T23:59:59",
        "2017-01-01T00:00:00",
        "2026-05-05T12:34:56.789",
    ],
)
def test_terrestrial_time_as_in_astropy(text):
    # astropy.time (leap seconds of ERFA, which are those of IERS Bulletin C)
    expected = Time(text, scale="utc").tt
    days = (expected.jd1 - 2451545.0) + expected.jd2
    assert clock.tt_from_iso(text) == pytest.approx(days * 86400.0, abs=1e-4)
    assert str(clock.iso_from_tt(clock.tt_from_iso(text), "ms")) == str(np.datetime64(text, "ms"))


def test_a_grid_counts_the_leap_second():
    # IERS Bulletin C 52: a leap second at the end of 2016
    grid = clock.TimeGrid("2016-12-31T23:59:50", np.array([0.0, 20.0]), 20.0)
    assert clock.iso(grid, 1) == "2017-01-01T00:00:09"


def test_barycentric_time_as_the_full_series():
    # ERFA dtdb: Fairhead & Bretagnon 1990, Astron. Astrophys. 229, 240, with topocentric terms left out (0)
    tt = np.linspace(clock.tt_from_iso("1980-01-01"), clock.tt_from_iso("2050-01-01"), 400)
    full = np.array([erfa.dtdb(2451545.0, t / 86400.0, 0.0, 0.0, 0.0, 0.0) for t in tt])
    assert np.abs(clock.tdb_from_tt(tt) - tt - full).max() < 15e-6


def test_universal_time_as_the_daily_table():
    # IERS Bulletin A with astropy-iers-data, every day of it: ten-day sampling leaves out fortnightly tides
    full = iers.IERS_A.open(astropy_iers_data.IERS_A_FILE)
    mjd, ut1_utc = full["MJD"].value, full["UT1_UTC"].value
    known = np.isfinite(ut1_utc)
    tt = clock.tt_from_utc((mjd[known] - 51544.5) * 86400.0)
    ours = clock.ut1_from_tt(tt) - clock.utc_from_tt(tt)
    error = np.abs(ours - ut1_utc[known])
    assert error.max() < 0.006
    assert error[mjd[known] > 46066].max() < 0.004  # since 1985


def test_the_last_prediction_is_held():
    late = clock.tt_from_iso("2040-01-01")
    later = clock.tt_from_iso("2050-01-01")
    held = [float(clock.ut1_from_tt(t) - clock.utc_from_tt(t)) for t in (late, later)]
    assert held[0] == pytest.approx(held[1], abs=1e-6)
    assert abs(held[0]) < 0.9  # UTC is kept within 0.9 s of UT1 (ITU-R TF.460-6)


@given(st.floats(-8e8, 1.6e9))
def test_utc_there_and_back(utc_s):
    assert float(clock.utc_from_tt(clock.tt_from_utc(utc_s))) == pytest.approx(utc_s, abs=1e-5)


@pytest.mark.parametrize("text", ["2027-13-01", "tomorrow", "", "2027-02-29", "2027-01-01T25:00"])
def test_unreadable_times_are_shown(text):
    with pytest.raises(RangeError, match="is not a UTC date or time; write for example 2027-11-25") as error:
        clock.utc_from_iso(text)
    assert repr(text) in str(error.value)


def test_times_before_the_table_are_refused():
    with pytest.raises(DateError, match="1850-01-01 lies before 1973-01-02"):
        clock.utc_from_iso("1850-01-01")


def test_offsets_from_utc_are_understood():
    assert clock.utc_from_iso("2027-11-25T05:30:00+02:00") == clock.utc_from_iso("2027-11-25T03:30")
    assert clock.utc_from_iso("2027-11-25T03:30:00Z") == clock.utc_from_iso("2027-11-25 03:30")


def test_an_event_that_does_not_happen_has_no_time():
    assert list(clock.iso_from_tt(np.array([0.0, np.nan]))) == ["2000-01-01T11:58:56", ""]


# ---------------------------------------------------------------- grids and nights


@given(st.floats(-179.99, 179.99))
def test_a_night_begins_at_local_mean_noon(longitude_deg):
    # local mean time is UTC + longitude / 15 deg per hour (definition)
    site = Site(np.radians(longitude_deg), 0.3, 0.0)
    noon = np.datetime64("2027-03-01T12:00:00", "ms") - np.timedelta64(
        round(longitude_deg / 15 * 3.6e6), "ms"
    )
    begin = clock.night_start_tt(site, "2027-03-01")
    # 1 ms for the rounding of the expected value
    assert abs(begin - clock.tt_from_iso(str(noon))) < 2e-3
    numbers = clock.night_numbers(site, np.array([begin - 1.0, begin + 1.0, begin + 86399.0]))
    assert [clock.date_of(number) for number in numbers] == ["2027-02-28", "2027-03-01", "2027-03-01"]


def test_the_date_line():
    # 200 deg east is 160 deg west: the same site, the same dates
    east, west = Site(np.radians(200.0), 0.3, 0.0), Site(np.radians(-160.0), 0.3, 0.0)
    assert clock.night_start_tt(east, "2027-03-01") == pytest.approx(
        clock.night_start_tt(west, "2027-03-01"), abs=1e-5
    )
    instants = clock.tt_from_iso("2027-03-01") + 3600.0 * np.arange(48)
    assert np.array_equal(clock.night_numbers(east, instants), clock.night_numbers(west, instants))
    # a step over the line changes the date of one and the same night by a day
    before, after = Site(np.radians(179.999), 0.3, 0.0), Site(np.radians(-179.999), 0.3, 0.0)
    instant = np.array([clock.tt_from_iso("2027-03-01T10:00")])
    assert clock.night_numbers(before, instant)[0] - clock.night_numbers(after, instant)[0] == 1


def test_a_season_over_a_leap_day():
    grid = clock.season_grid("2028-02-28", "2028-03-01", 300.0, NORTH)
    numbers = clock.night_numbers(NORTH, grid.tt_s)
    dates, steps = np.unique(numbers, return_counts=True)
    assert [clock.date_of(number) for number in dates] == ["2028-02-28", "2028-02-29", "2028-03-01"]
    assert list(steps) == [288, 288, 288]
    # longitude -155.5 deg: mean noon at 22:22 UTC, the first whole five minutes after it
    assert grid.start_utc == "2028-02-28T22:25:00"


def test_in_space_a_night_is_a_day_of_utc():
    grid = clock.season_grid("2027-12-31", "2028-01-01", 600.0, Orbit())
    assert (grid.start_utc, grid.time_s.size) == ("2027-12-31T00:00:00", 288)
    assert [clock.date_of(n) for n in np.unique(clock.night_numbers(Orbit(), grid.tt_s))] == [
        "2027-12-31",
        "2028-01-01",
    ]


def test_a_span_includes_its_end():
    grid = clock.span_grid("2027-01-01", "2027-01-02", 3600.0)
    assert (clock.iso(grid, 0), clock.iso(grid, -1), grid.time_s.size) == (
        "2027-01-01T00:00:00",
        "2027-01-02T00:00:00",
        25,
    )


def test_given_times_keep_their_order():
    grid = clock.times_grid(["2027-01-02", "2027-01-01T12:00"])
    assert [clock.iso(grid, i) for i in (0, 1)] == ["2027-01-02T00:00:00", "2027-01-01T12:00:00"]
    assert grid.step_s == 0.0


@pytest.mark.parametrize(
    ("make", "sentence"),
    [
        (
            lambda: clock.season_grid("2027-03-02", "2027-03-01", 300.0, None),
            "2027-03-01 comes before the first date 2027-03-02",
        ),
        (
            lambda: clock.season_grid("2027-03-01", "2027-03-02", 0.0, None),
            "a time step of 0 s is not positive",
        ),
        (
            lambda: clock.span_grid("2027-03-02", "2027-03-01", 300.0),
            "the end 2027-03-01 comes before the beginning",
        ),
        (lambda: clock.span_grid("2027-03-01", "2027-03-02", -1.0), "a time step of -1 s is not positive"),
        (lambda: clock.times_grid([]), "no time was given"),
    ],
)
def test_impossible_grids_are_refused(make, sentence):
    with pytest.raises(RangeError, match=sentence):
        make()
