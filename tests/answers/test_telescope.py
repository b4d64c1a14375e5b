"""What is taken to the telescope: calendar, night pages, standard stars."""

import math
import re
from contextlib import closing
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
import time_machine
from astropy import units as u
from astropy.coordinates import Angle
from hypothesis import given
from hypothesis import strategies as st
from icalendar import Calendar
from skyfield.api import Star, load, load_file, wgs84

from coldglow.answers.planning.findings import find_out
from coldglow.answers.planning.standards import sexagesimal, standards_for
from coldglow.answers.planning.telescope import calendar_of, frames_words, pages_of
from coldglow.describe.load import load_request
from coldglow.sky.ephemeris import _packaged_kernel
from coldglow.sky.stars import Stars, load_standards


def events(small):
    text = (small.folder / "observing.ics").read_bytes().decode("utf-8")
    return [part for part in Calendar.from_ical(text).walk("VEVENT")]


def observer_of(stretch):
    """The site of a stretch in skyfield, an independent library."""
    site = stretch.scene.use.instrument.place
    return wgs84.latlon(
        math.degrees(site.latitude_rad), math.degrees(site.longitude_rad), elevation_m=site.height_m
    )


def young_1994(altitude_rad):
    """Airmass of a true altitude; Young 1994, Appl. Opt. 33, 1108, equation 5."""
    c = math.sin(altitude_rad)
    return (1.002432 * c**2 + 0.148386 * c + 0.0096467) / (
        c**3 + 0.149864 * c**2 + 0.0102963 * c + 0.000303978
    )


def test_one_event_for_each_stretch_in_order_of_time(small):
    found = events(small)
    assert len(found) == len(small.found.stretches) >= 2
    for event, stretch in zip(found, small.found.stretches, strict=True):
        for key, iso in (("DTSTART", stretch.start), ("DTEND", stretch.stop)):
            moment = event[key].dt
            assert moment.tzinfo is not None
            assert abs(moment - datetime.fromisoformat(iso).replace(tzinfo=UTC)) <= timedelta(minutes=1)
        assert "Uranus" in event["SUMMARY"]
        assert "echelle-8m" in event["LOCATION"]


def test_an_event_holds_airmass_and_rates_as_an_independent_library_has_them(small):
    scale = load.timescale(builtin=True)
    with closing(load_file(str(_packaged_kernel()))) as kernel:
        for event, stretch in zip(events(small), small.found.stretches, strict=True):
            text = str(event["DESCRIPTION"])
            first, last, least = map(
                float, re.search(r"Airmass ([\d.]+) at .*?, ([\d.]+) at .*?, least ([\d.]+)", text).groups()
            )
            place = kernel["earth"] + observer_of(stretch)
            half = timedelta(seconds=0.5 * stretch.scene.steps.step_s)
            begin, end = event["DTSTART"].dt + half, event["DTEND"].dt - half
            middle = begin + (end - begin) / 2
            hour = timedelta(hours=0.5)
            at = scale.from_datetimes([begin, end, middle - hour, middle + hour])
            seen = place.at(at).observe(kernel["uranus barycenter"])
            altitude = seen.apparent().altaz()[0].radians
            assert young_1994(altitude[0]) == pytest.approx(first, abs=0.0061)
            assert young_1994(altitude[1]) == pytest.approx(last, abs=0.0061)
            assert least <= min(first, last)
            ra, dec, _ = seen.radec()
            turn = (ra.radians[3] - ra.radians[2]) * math.cos(dec.radians[2])
            rates = re.search(r"RA x cos\(Dec\) ([+-][\d.]+) arcsec/h, Dec ([+-][\d.]+)", text).groups()
            wanted = np.degrees([turn, dec.radians[3] - dec.radians[2]]) * 3600.0
            assert [float(rate) for rate in rates] == pytest.approx(wanted, abs=0.02)


def test_an_event_tells_longitudes_set_up_and_standard_stars(small):
    for event, stretch in zip(events(small), small.found.stretches, strict=True):
        text = str(event["DESCRIPTION"])
        low, high = map(float, re.search(r"longitude (\d+) to (\d+) deg", text).groups())
        turn = 360.0 * (stretch.end_tt_s - stretch.exposing_tt_s) / stretch.scene.track.system.period_s
        assert (high - low) % 360.0 == pytest.approx(turn, abs=1.01)
        integration_s, coadds, _ = stretch.setup
        assert f"integrations of {integration_s:.4g} s, {coadds} co-added" in text
        assert "Standard stars before: HR" in text
        assert "Standard stars after: HR" in text


def test_the_expected_snr_keeps_its_digits(small):
    text = (small.folder / "observing.ics").read_text(encoding="utf-8").replace("\n ", "")
    told = re.findall(r"expected SNR ([\d.]+)", text.replace("\r", ""))
    for shown, stretch in zip(told, small.found.stretches, strict=True):
        assert float(shown) == pytest.approx(stretch.snr, rel=5e-3)


def test_the_calendar_does_not_know_when_it_was_made(small):
    pairs = list(zip(small.found.stretches, small.found.standards, strict=True))
    with time_machine.travel("2031-02-03"):
        early = calendar_of(small.request, pairs)
    with time_machine.travel("2033-04-05"):
        late = calendar_of(small.request, pairs)
    assert early == late == (small.folder / "observing.ics").read_bytes().decode("utf-8")


def test_standard_stars_are_the_nearest_and_stand_where_an_independent_library_sees_them(small):
    stars = load_standards()
    stretch = small.found.stretches[0]
    limits, track = stretch.scene.use.instrument.limits, stretch.scene.track
    scale = load.timescale(builtin=True)
    step = stretch.first
    moment = scale.tt_jd(2451545.0 + track.grid.tt_s[step] / 86400.0)
    hours, degrees = np.degrees(stars.ra_rad) / 15.0, np.degrees(stars.dec_rad)
    with closing(load_file(str(_packaged_kernel()))) as kernel:
        place = (kernel["earth"] + observer_of(stretch)).at(moment)
        listed = [Star(ra_hours=h, dec_degrees=d) for h, d in zip(hours, degrees, strict=True)]
        directions = [place.observe(star).apparent() for star in listed]
        altitude = np.array([direction.altaz()[0].radians for direction in directions])
        target = place.observe(kernel["uranus barycenter"]).apparent()
        apart = np.array([direction.separation_from(target).degrees for direction in directions])
        own = young_1994(target.altaz()[0].radians)
    through = np.array([young_1994(a) if a > 0 else np.inf for a in altitude])
    fits = (altitude > limits.altitude_min_rad) & (through <= limits.airmass_max)
    badness = np.where(fits, np.hypot((through - own) / 0.1, apart / 15.0), np.inf)
    best = np.argsort(badness)[:2]
    before = [star for star in small.found.standards[0] if star.when == "before"]
    assert [star.designation for star in before] == [stars.designation[i] for i in best]
    for star, i in zip(before, best, strict=True):
        assert star.airmass == pytest.approx(through[i], abs=2e-4)
        assert star.airmass_difference == pytest.approx(through[i] - own, abs=2e-4)
        assert math.degrees(star.separation_rad) == pytest.approx(apart[i], abs=0.01)


def test_the_users_own_stars_are_used(small, tmp_path):
    path = tmp_path / "mine.csv"
    path.write_text(
        "designation,ra_deg,dec_deg,magnitude,spectral_type\nMine 1,65,20,6.1,A0 V\n", encoding="utf-8"
    )
    found = standards_for(small.found.stretches[0], load_standards(str(path)))
    assert {star.designation for star in found} == {"Mine 1"}
    assert {star.when for star in found} == {"before", "after"}


def test_stars_that_never_rise_are_no_standards(small):
    never = Stars(("south pole",), np.array([0.0]), np.radians([89.0]), np.array([5.0]), ("A0 V",))
    assert standards_for(small.found.stretches[0], never) == ()


def test_what_to_take_fits_into_the_time(small):
    for stretch in small.found.stretches:
        integration_s, coadds, fill = stretch.setup
        words = frames_words(stretch)
        positions = int(re.match(r"(\d+) position", words).group(1))
        assert positions % 2 == 0  # A and B alike
        assert 0.0 <= stretch.open_s - positions * integration_s * coadds < 2 * integration_s * coadds
        assert 0.0 < fill < 1.0


def test_the_nights_page_has_a_sheet_for_each_night(small):
    text = (small.folder / "nights.html").read_text(encoding="utf-8")
    nights = list(dict.fromkeys(stretch.night for stretch in small.found.stretches))
    assert len(re.findall(r'<section class="sheet"', text)) == len(nights)
    for word in (
        "sunset",
        "sun below −18° from",
        "transit",
        "standard star HR",
        "first integration",
        "Slit angle",
    ):
        assert word.lower() in text.lower()
    assert "<script" not in text


@pytest.mark.parametrize("hours", [True, False])
@given(angle=st.floats(-1.57, 1.57))
def test_sexagesimal_is_what_astropy_writes(hours, angle):
    size = angle % (2 * math.pi) if hours else angle
    unit, precision = (u.hourangle, 1) if hours else (u.deg, 0)
    written = Angle(size, u.rad).to_string(
        unit=unit, sep=":", precision=precision, pad=True, alwayssign=not hours
    )
    got = sexagesimal(size, hours=hours).replace("−", "-")

    def seconds(text):
        sign = -1.0 if text.startswith("-") else 1.0
        first, second, third = (float(part) for part in text.lstrip("+-").split(":"))
        return sign * (3600.0 * first + 60.0 * second + third)

    day = 86400.0 if hours else 1e9
    difference = abs(seconds(got) - seconds(written))
    assert min(difference, abs(difference - day)) <= 1.01 * 10.0**-precision
    assert all(float(part) < 60.0 for part in got.split(":")[1:])


def test_in_space_there_are_no_stars_and_no_airmass():
    space = load_request(Path(__file__).parents[2] / "examples" / "uranus-space.yaml")
    space = replace(space, fade=replace(space.fade, last_year=space.fade.first_year))
    found = find_out(space, load_standards(), lambda step: None)
    pairs = list(zip(found.stretches, found.standards, strict=True))
    (event,) = Calendar.from_ical(calendar_of(space, pairs)).walk("VEVENT")
    assert "Airmass" not in str(event["DESCRIPTION"])
    assert "Standard" not in str(event["DESCRIPTION"])
    page = pages_of(space, pairs).lower()
    assert "sunset" not in page
    assert "nan" not in re.findall(r"\w+", page)
