from datetime import UTC, datetime

import pytest
import time_machine
from hypothesis import given, settings
from hypothesis import strategies as st
from icalendar import Calendar

from coldglow.report.calendar import Event, StretchFacts, calendar_text, describe_stretch

STAMP = "2027-11-01T00:00:00"
FACTS = StretchFacts(
    airmass_start=1.62,
    airmass_end=1.31,
    airmass_min=1.30,
    longitude_start_deg=12.4,
    longitude_end_deg=118.9,
    longitude_system="ionosphere",
    integration_s=120.0,
    coadds=2,
    setting="L-long",
    ra_rate_arcsec_h=-4.321,
    dec_rate_arcsec_h=1.2,
    standards_before=("HR 1038 (2 xi Tau)",),
    standards_after=("HR 1251 (38 nu Tau)",),
)
EVENT = Event("2027-11-25T05:30:00", "2027-11-25T07:00:00", "Uranus", describe_stretch(FACTS), "25 S, 68 W")


def parsed(text):
    calendar = Calendar.from_ical(text)
    assert not calendar.errors
    return calendar, calendar.walk("VEVENT")


def test_an_event_is_read_back_by_the_library():
    calendar, events = parsed(calendar_text([EVENT], "My run", STAMP, "0.1.0"))
    assert calendar["VERSION"] == "2.0"
    assert calendar["NAME"] == "My run"
    assert calendar["PRODID"] == "-//coldglow//coldglow 0.1.0//EN"
    (event,) = events
    assert not event.errors
    assert event["DTSTART"].dt == datetime(2027, 11, 25, 5, 30, tzinfo=UTC)
    assert event["DTEND"].dt == datetime(2027, 11, 25, 7, 0, tzinfo=UTC)
    assert event["DTSTAMP"].dt == datetime(2027, 11, 1, tzinfo=UTC)
    assert event["SUMMARY"] == "Uranus"
    assert event["LOCATION"] == "25 S, 68 W"
    assert event["DESCRIPTION"] == "\n".join(EVENT.description)


def test_the_description_says_what_the_observer_needs():
    text = "\n".join(describe_stretch(FACTS))
    for word in ("1.62", "1.31", "1.30", "12 to 119 deg", "ionosphere", "120 s, 2 co-added", "L-long"):
        assert word in text
    assert "RA x cos(Dec) -4.32 arcsec/h, Dec +1.20 arcsec/h" in text
    assert "before: HR 1038 (2 xi Tau)" in text
    assert "after: HR 1251 (38 nu Tau)" in text


def test_lines_are_folded_as_the_standard_asks():
    long = Event("2027-11-25T05:30", "2027-11-25T06:00", "Größe µm 星 " * 20, ("ä" * 200,))
    text = calendar_text([long], "x", STAMP)
    assert text.endswith("END:VCALENDAR\r\n")
    for line in text.removesuffix("\r\n").split("\r\n"):
        assert "\n" not in line
        assert len(line.encode()) <= 75  # RFC 5545, section 3.1, without the line end
    _, (event,) = parsed(text)
    assert event["SUMMARY"] == long.title
    assert event["DESCRIPTION"] == long.description[0]


@settings(deadline=None)
@given(st.text(st.characters(exclude_categories=("Cs",), exclude_characters="\r"), min_size=1))
def test_any_text_comes_back(text):
    expected = "".join(c for c in text if c in "\n\t" or (ord(c) >= 32 and ord(c) != 127))
    _, (event,) = parsed(calendar_text([Event("2027-11-25", "2027-11-26", text)], "x", STAMP))
    assert str(event["SUMMARY"]) == expected


def test_the_same_plan_gives_the_same_bytes_whenever_it_is_written():
    with time_machine.travel("2028-02-03"):
        early = calendar_text([EVENT], "My run", STAMP)
    with time_machine.travel("2031-07-09"):
        late = calendar_text([EVENT], "My run", STAMP)
    assert early == late


def test_identifiers_are_unique_and_belong_to_the_stretch():
    other = Event("2027-11-26T05:30:00", "2027-11-26T07:00:00", "Uranus")
    _, events = parsed(calendar_text([EVENT, other, other], "x", STAMP))
    names = [str(event["UID"]) for event in events]
    assert len(set(names)) == 3
    _, again = parsed(calendar_text([other], "a new name", "2028-01-01"))
    assert str(again[0]["UID"]) == names[1]


def test_other_offsets_become_utc():
    _, (event,) = parsed(
        calendar_text([Event("2027-11-25T05:30:00+02:00", "2027-11-25T05:30:00Z", "x")], "x", STAMP)
    )
    assert event["DTSTART"].dt == datetime(2027, 11, 25, 3, 30, tzinfo=UTC)
    assert event["DTEND"].dt == datetime(2027, 11, 25, 5, 30, tzinfo=UTC)


def test_an_event_that_ends_before_it_starts_is_refused():
    with pytest.raises(ValueError, match="'x' ends at 2027-11-25"):
        calendar_text([Event("2027-11-26", "2027-11-25", "x")], "x", STAMP)


def test_no_event_is_a_calendar_too():
    assert parsed(calendar_text([], "x", STAMP))[1] == []
