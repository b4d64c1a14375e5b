"""Events of the night against four libraries; polar sites; the spline against the sky at the instant."""

import numpy as np
import pytest
from astropy.time import Time
from sky_bodies import NORTH, SITES, SOUTH, rows

from coldglow.bridges.astroplan import observer as astroplan_observer
from coldglow.bridges.astroplan import offline
from coldglow.describe.records import Site
from coldglow.errors import DateError
from coldglow.sky.clock import night_start_tt, tt_from_iso
from coldglow.sky.ephemeris import load_ephemeris
from coldglow.sky.events import SUN_LEVELS_RAD, night_events
from coldglow.sky.place import altitude_azimuth, observe, see
from coldglow.sky.vectors import longitude_latitude

FIELDS = {
    "sunset": "sunset",
    "dusk_-6": "civil_dusk",
    "dusk_-12": "nautical_dusk",
    "dusk_-18": "astronomical_dusk",
    "dawn_-18": "astronomical_dawn",
    "dawn_-12": "nautical_dawn",
    "dawn_-6": "civil_dawn",
    "sunrise": "sunrise",
    "planet_rise": "rise",
    "planet_transit": "transit",
    "planet_set": "set",
}
FAR_NORTH = Site(np.radians(16.0), np.radians(78.2), 500.0)


def dates(first, count):
    return [str(np.datetime64(first) + i) for i in range(count)]


def test_events_as_in_three_libraries():
    # tests/data/sky/events.csv: skyfield, ephem, bisection on astropy; wanted: 2 s
    table = rows("events.csv")
    assert len(table) == 33
    for row in table:
        events = night_events(SITES[row["site"]], [row["evening_date"]], row["planet"])
        ours = getattr(events, f"{FIELDS[row['event']]}_tt_s")[0]
        for library in ("skyfield_utc", "ephem_utc", "astropy_root_utc"):
            if row[library]:
                assert ours == pytest.approx(tt_from_iso(row[library]), abs=0.5), (row["event"], library)


def test_twilight_as_in_astroplan():
    # astroplan interpolates linearly between 150 points: its events of the Sun are good to 1.5 s
    evening = "2026-09-10"
    events = night_events(SOUTH, [evening])
    with offline():
        noon = Time("2026-09-10T16:41:36", scale="utc")  # local mean noon of longitude -70.4 deg
        watcher = astroplan_observer(SOUTH)
        for field, method in (
            ("nautical_dusk_tt_s", watcher.twilight_evening_nautical),
            ("astronomical_dusk_tt_s", watcher.twilight_evening_astronomical),
            ("astronomical_dawn_tt_s", watcher.twilight_morning_astronomical),
        ):
            expected = tt_from_iso(method(noon, which="next").utc.isot)
            assert getattr(events, field)[0] == pytest.approx(expected, abs=2.0)


@pytest.mark.parametrize("site", [NORTH, SOUTH, FAR_NORTH])
def test_at_an_event_the_sky_is_as_it_should_be(site):
    # the spline against the altitude computed at the very instant: 0.02 s of the sky's turn is 0.3 arcsec
    events = night_events(site, dates("2027-02-01", 60), "saturn")
    for field, body, level in (
        ("sunset", "sun", SUN_LEVELS_RAD["sunset"]),
        ("nautical_dusk", "sun", SUN_LEVELS_RAD["nautical"]),
        ("astronomical_dawn", "sun", SUN_LEVELS_RAD["astronomical"]),
        ("sunrise", "sun", SUN_LEVELS_RAD["sunset"]),
        ("rise", "saturn", 0.0),
        ("set", "saturn", 0.0),
    ):
        instants = getattr(events, f"{field}_tt_s")
        instants = instants[np.isfinite(instants)]
        assert instants.size > 20 or (site == FAR_NORTH)
        if instants.size:
            watcher = observe(site, instants, load_ephemeris())
            altitude, _ = altitude_azimuth(watcher, see(watcher, body).apparent)
            assert np.abs(altitude - level).max() < np.radians(0.3 / 3600.0), field
    watcher = observe(site, events.transit_tt_s, load_ephemeris())
    ra, _ = longitude_latitude(see(watcher, "saturn").apparent)
    assert np.abs(np.sin(watcher.sidereal_rad - ra)).max() < np.radians(0.3 / 3600.0)


def test_events_lie_in_their_night_in_order():
    found = night_events(NORTH, dates("2027-12-20", 30), "uranus")
    start = np.array([night_start_tt(NORTH, date) for date in found.dates])
    order = [
        start,
        found.sunset_tt_s,
        found.civil_dusk_tt_s,
        found.nautical_dusk_tt_s,
        found.astronomical_dusk_tt_s,
        found.astronomical_dawn_tt_s,
        found.nautical_dawn_tt_s,
        found.civil_dawn_tt_s,
        found.sunrise_tt_s,
        start + 86400.0,
    ]
    assert (np.diff(order, axis=0) > 0).all()
    np.testing.assert_allclose(
        found.dark_s, found.astronomical_dawn_tt_s - found.astronomical_dusk_tt_s, atol=1e-3
    )


def test_many_nights_are_as_each_alone():
    many = night_events(NORTH, dates("2027-06-01", 5), "jupiter")
    for i, date in enumerate(many.dates):
        alone = night_events(NORTH, [date], "jupiter")
        for field in (
            "sunset_tt_s",
            "astronomical_dawn_tt_s",
            "rise_tt_s",
            "transit_tt_s",
            "set_tt_s",
            "dark_s",
        ):
            assert getattr(many, field)[i] == pytest.approx(getattr(alone, field)[0], abs=1e-4), field


def test_polar_day_and_polar_night():
    found = night_events(FAR_NORTH, ["2027-06-21", "2027-12-21"])
    assert np.isnan(found.sunset_tt_s).all()
    assert np.isnan(found.sunrise_tt_s).all()
    # midsummer never dark; at midwinter noon the Sun stands 90 - 78.2 - 23.44 = -11.6 deg high
    assert found.dark_s[0] == 0.0
    assert 0.0 < found.dark_s[1] < 86400.0
    assert np.isfinite(found.nautical_dusk_tt_s[1])
    # at the pole itself the Sun stands at its declination, -23.4 deg: dark all day
    pole = night_events(Site(0.0, np.pi / 2, 2800.0), ["2027-06-21", "2027-12-21"])
    assert list(pole.dark_s) == [0.0, 86400.0]


def test_short_nights_are_not_lost():
    # near the end of the polar day the Sun dips for some minutes only; every such night must show both events
    found = night_events(FAR_NORTH, dates("2027-08-15", 20))
    sets, rises = np.isfinite(found.sunset_tt_s), np.isfinite(found.sunrise_tt_s)
    assert (sets == rises).all()
    assert sets.any()
    assert not sets.all()
    below = found.sunrise_tt_s - found.sunset_tt_s
    minutes = np.arange(1440) * 60.0
    for i, date in enumerate(found.dates):
        watcher = observe(FAR_NORTH, night_start_tt(FAR_NORTH, date) + minutes, load_ephemeris())
        altitude, _ = altitude_azimuth(watcher, see(watcher, "sun").apparent)
        counted = 60.0 * (altitude < SUN_LEVELS_RAD["sunset"]).sum()
        assert counted == pytest.approx(below[i] if sets[i] else 0.0, abs=61.0)


def test_a_body_that_never_rises_has_no_events():
    found = night_events(FAR_NORTH, ["2025-01-10"], "neptune")  # declination -3 deg: rises
    assert np.isfinite(found.rise_tt_s[0])
    south = Site(0.0, np.radians(-80.0), 100.0)
    found = night_events(south, ["2027-07-10"], "uranus")  # declination +20 deg: never
    assert np.isnan([found.rise_tt_s[0], found.set_tt_s[0]]).all()


def test_dates_outside_are_refused():
    with pytest.raises(DateError, match="outside the span of the ephemeris DE421"):
        night_events(NORTH, ["2053-12-01"])
