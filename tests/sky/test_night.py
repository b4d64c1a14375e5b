"""Airmass against its published formula; limits as masks, and what is said about them."""

import dataclasses
import math

import numpy as np
import pvlib
import pytest
from hypothesis import given
from hypothesis import strategies as st
from sky_bodies import NORTH, OPEN, rows

from coldglow.describe.records import Orbit
from coldglow.sky import night


def test_airmass_as_published():
    # tests/data/sky/airmass.csv: Young 1994, Appl. Opt. 33, 1108, evaluated by pvlib, six decimals
    for row in rows("airmass.csv"):
        value = night.airmass(np.radians(90.0 - float(row["zenith_angle"])))
        assert float(value) == pytest.approx(float(row["young_1994"]), abs=2e-6)


@given(st.floats(0.0, 89.0))
def test_airmass_as_in_pvlib(zenith_angle):
    # pvlib 0.11 and later, model young1994
    expected = pvlib.atmosphere.get_relative_airmass(zenith_angle, "young1994")
    assert float(night.airmass(math.radians(90.0 - zenith_angle))) == pytest.approx(expected, rel=1e-12)


def test_below_the_horizon_there_is_no_airmass():
    assert np.isnan(night.airmass(np.radians([-0.1, -45.0]))).all()


def masks(limits, place=NORTH, **angles):
    """Return the masks at one instant, high in a dark sky unless told otherwise (degrees)."""
    given_deg = {"altitude": 60.0, "sun_altitude": -40.0, "elongation": 110.0, "moon": 90.0} | angles
    return night.limiting_masks(place, limits, *(np.radians([angle]) for angle in given_deg.values()))


LIMITS = dataclasses.replace(
    OPEN,
    airmass_max=2.0,
    altitude_min_rad=math.radians(20.0),
    altitude_max_rad=math.radians(85.0),
    sun_separation_min_rad=math.radians(30.0),
    moon_separation_min_rad=math.radians(10.0),
)


@pytest.mark.parametrize(
    ("angles", "forbidding"),
    [
        ({}, set()),
        ({"sun_altitude": -11.9}, {"daylight"}),
        ({"sun_altitude": -12.1}, set()),
        # airmass 2 at 29.86 deg of altitude (Young 1994, from the table of test_airmass_as_published)
        ({"altitude": 29.0}, {"airmass"}),
        ({"altitude": 19.0}, {"airmass", "altitude"}),
        ({"altitude": -5.0}, {"airmass", "altitude"}),
        ({"altitude": 86.0}, {"zenith"}),
        ({"elongation": 29.0}, {"sun"}),
        ({"moon": 9.0}, {"moon"}),
    ],
)
def test_each_limit_forbids_what_it_should(angles, forbidding):
    found = masks(LIMITS, **angles)
    assert {name for name, mask in found.items() if mask[0]} == forbidding
    assert night.allowed(found)[0] == (not forbidding)


def test_daytime_leaves_the_separation_from_the_sun():
    day = dataclasses.replace(LIMITS, daytime=True)
    assert night.allowed(masks(day, sun_altitude=50.0))[0]
    assert not night.allowed(masks(day, sun_altitude=50.0, elongation=29.0))[0]


@pytest.mark.parametrize(
    ("elongation", "allowed"), [(84.0, False), (86.0, True), (134.0, True), (136.0, False)]
)
def test_in_space_the_elongation_decides(elongation, allowed):
    found = masks(OPEN, Orbit(), altitude=np.nan, sun_altitude=np.nan, elongation=elongation)
    assert night.allowed(found)[0] == allowed
    assert found["elongation"][0] != allowed


def test_words_name_the_most_frequent_limit_first():
    often, seldom, never = (
        np.array([True, True, True, False]),
        np.array([False, True, False, False]),
        np.zeros(4, bool),
    )
    words = night.why_not({"moon": seldom, "daylight": often, "zenith": never})
    assert words == "it is not dark (75 % of the time), the Moon is too near (25 % of the time)"
    assert night.why_not({"zenith": never}) == ""
