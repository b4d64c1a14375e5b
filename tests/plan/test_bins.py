"""Which bins a moment serves, and what candidates bring to them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import norm

from coldglow.plan.bins import (
    BinSums,
    Interest,
    central_weights,
    interest_weights,
    resolution_rad,
    spot_gain,
    step_drift,
)
from coldglow.plan.goal import marginalise
from coldglow.plan.stretches import Steps, runs, table

PERIOD_S = 62064.0
DEG = np.pi / 180.0


def night(step_s: float = 300.0) -> Steps:
    time_s = np.arange(8.0 * 3600.0, 18.0 * 3600.0, step_s)
    rng = np.random.default_rng(2)
    slopes = rng.normal(size=(time_s.size, 6, 4)) * np.array([1.0, 0.01, 1.0, 1.0])
    ones = np.ones(time_s.size)
    return Steps(
        time_s=time_s,
        step_s=step_s,
        observable=ones > 0.0,
        night=np.zeros(time_s.size, dtype=np.int64),
        matrix=np.einsum("tki,tkj->tij", slopes, slopes) * 1e-3,
        shutter_share=0.7 * ones,
        airmass=ones,
        longitude_rad=np.mod(2.0 * np.pi * time_s / PERIOD_S, 2.0 * np.pi),
        range_rate_m_s=0.0 * ones,
        line_transmission=ones,
    )


@given(st.floats(0.0, 7.0), st.integers(1, 72), st.floats(0.0, 1.0), st.floats(0.0, 2.0))
def test_shares_add_to_one_and_are_no_debts(longitude, bins, drift, resolution):
    weight = central_weights(np.array([longitude]), bins, drift, resolution)
    assert weight.sum() == pytest.approx(1.0, abs=1e-6)
    assert weight.min() > -1e-9


def test_a_sharp_moment_serves_one_bin_and_drift_splits_by_time():
    longitude = np.array([45.0, 59.0, 359.0]) * DEG
    np.testing.assert_allclose(central_weights(longitude, 12)[[0, 1, 2], [1, 1, 11]], 1.0, atol=1e-5)
    weight = central_weights(longitude, 12, 4.0 * DEG)  # 57 ... 61 deg: three quarters before 60
    assert weight[1, 1] == pytest.approx(0.75, abs=1e-6)
    assert weight[1, 2] == pytest.approx(0.25, abs=1e-6)
    assert weight[2, 0] == pytest.approx(0.25, abs=1e-6)  # 357 ... 361 deg


def test_blur_spreads_as_the_gaussian_it_is():
    weight = central_weights(np.array([45.0 * DEG]), 12, 0.0, 30.0 * DEG)[0]
    sigma = 30.0 / 2.354820045
    assert weight[1] == pytest.approx(norm.cdf(15.0 / sigma) - norm.cdf(-15.0 / sigma), abs=1e-6)
    assert weight[0] == pytest.approx(weight[2], abs=1e-9)


def test_resolution_on_a_small_disk_by_hand():
    # 0.6 arcsec of seeing on a disk of 3.7 arcsec: 2 arcsin(0.162162) = 18.665 deg; 10 deg of drift more
    assert resolution_rad(0.6, 3.7) / DEG == pytest.approx(18.665, abs=2e-3)
    assert resolution_rad(0.6, 3.7, 10.0 * DEG) / DEG == pytest.approx(np.hypot(18.665, 10.0), abs=2e-3)
    assert resolution_rad(3.0, 2.3) == pytest.approx(np.pi)  # a blurred planet resolves nothing


@pytest.mark.parametrize("latitude", [-80.0, -30.0, 0.0, 45.0, 77.6])
def test_resolution_where_the_disk_centre_shows_a_latitude_against_turned_points(latitude):
    # a point half the blur east of the disk's centre, turned back into the planet's frame
    tilt, east = latitude * DEG, 0.82 / 3.7
    towards = np.sqrt(1.0 - east**2)
    meridian, _ = np.cos(tilt) * towards, np.sin(tilt) * towards
    assert resolution_rad(0.82, 3.7, 0.0, tilt) == pytest.approx(2.0 * np.arctan2(east, meridian), rel=1e-12)


def test_seen_from_above_the_pole_nothing_is_resolved():
    assert resolution_rad(0.01, 3.7, 0.0, 90.0 * DEG) == pytest.approx(np.pi)
    assert resolution_rad(0.82, 3.7, 0.0, 77.6 * DEG) / DEG == pytest.approx(93.2, abs=0.1)


def interest(latitude, angle, lit="any", sub_latitude=0.0, sun_latitude=0.0, sun_longitude=0.0) -> Interest:
    one = np.ones(1)
    return Interest(
        latitude * DEG, angle * DEG, lit, sub_latitude * DEG * one, sun_latitude * DEG * one,
        sun_longitude * DEG * one,
    )  # fmt: skip


def test_places_on_the_equator_within_an_angle():
    weight = interest_weights(np.array([180.0 * DEG]), 12, interest(0.0, 60.0))[0]
    assert weight.tolist() == [0, 0, 0, 0, 1, 1, 1, 1, 0, 0, 0, 0]  # 120 ... 240 deg


def test_a_high_latitude_by_spherical_trigonometry():
    # latitude 60 deg seen from above latitude 30 deg, within 45 deg of it:
    # cos 45 = sin 60 sin 30 + cos 60 cos 30 cos x -> cos x = 0.63299, x = 50.73 deg
    weight = interest_weights(np.array([0.0]), 360, interest(60.0, 45.0, sub_latitude=30.0))[0]
    assert weight.sum() / 2.0 == pytest.approx(50.73, abs=0.12)
    assert not interest_weights(np.array([0.0]), 12, interest(-60.0, 45.0, sub_latitude=40.0)).any()


def test_day_and_night_sides_share_what_is_seen():
    seen = interest_weights(np.array([90.0 * DEG]), 36, interest(20.0, 70.0))
    day = interest_weights(np.array([90.0 * DEG]), 36, interest(20.0, 70.0, "day", sun_longitude=30.0))
    dark = interest_weights(np.array([90.0 * DEG]), 36, interest(20.0, 70.0, "night", sun_longitude=30.0))
    np.testing.assert_allclose(day + dark, seen, atol=1e-12)
    assert 0.0 < dark.sum() < day.sum()


def test_bins_add_to_the_night_before_marginalisation_and_lose_after():
    steps = night()
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night)
    weight = central_weights(steps.longitude_rad, 12, step_drift(steps), 10.0 * DEG)
    found = BinSums(steps, weight).visits(first, end, overhead_s=750.0)
    seconds = np.full(steps.time_s.size, 0.7 * 300.0)
    seconds[:2], seconds[2] = 0.0, 0.7 * 150.0
    whole = np.tensordot(seconds, steps.matrix, axes=1)
    np.testing.assert_allclose(found.matrix.sum(axis=1)[0], whole, rtol=1e-6)
    assert found.clock_s.sum() == pytest.approx(36000.0 - 750.0, rel=1e-6)
    apart = marginalise(found.matrix[0])[:, 0, 0].sum()
    assert apart < table(steps, first, end, 750.0).matrix[0, 0, 0]


def test_gains_do_not_depend_on_the_step():
    gains = []
    for step_s in (100.0, 600.0):
        steps = night(step_s)
        flat = np.broadcast_to(np.eye(4) * 1e-3, steps.matrix.shape)
        steps = replace(steps, matrix=flat, time_s=steps.time_s + step_s / 2.0)
        steps = replace(steps, longitude_rad=np.mod(2.0 * np.pi * steps.time_s / PERIOD_S, 2.0 * np.pi))
        weight = central_weights(steps.longitude_rad, 36, step_drift(steps))
        gains.append(BinSums(steps, weight).visits(np.array([0]), np.array([steps.time_s.size])).clock_s)
    np.testing.assert_allclose(gains[0], gains[1], atol=1e-3)


def test_a_bin_not_served_has_no_visit():
    steps = night()
    weight = central_weights(steps.longitude_rad, 12, step_drift(steps))
    found = BinSums(steps, weight).visits(np.array([0]), np.array([12]))  # one hour, 20.9 deg from 167 deg
    assert found.visits.tolist() == [[0, 0, 0, 0, 0, 1, 1, 0, 0, 0, 0, 0]]
    assert np.all(found.matrix[0, 0] == 0.0)


def test_spot_that_shows_half_of_the_time_by_hand():
    # 120 steps of information i each, the spot adds 20 % of the rest in the second half:
    # sum I m² = 60 i 0.04 = 2.4 i; (sum I m)²/sum I = (60 i 0.2)²/(120 i) = 1.2 i; the difference 1.2 i
    steps = night()
    flat = np.zeros_like(steps.matrix)
    flat[:, 0, 0] = 2.0
    ratio = np.where(np.arange(120) < 60, 0.0, 0.2)
    free, known = spot_gain(replace(steps, matrix=flat), ratio, np.array([0]), np.array([120]))
    i = 2.0 * 0.7 * 300.0
    assert free[0, 0] == pytest.approx(1.2 * i, rel=1e-9)
    assert known[0, 0] == pytest.approx(2.4 * i, rel=1e-9)


def test_spot_that_never_changes_cannot_be_told_from_the_rest():
    free, known = spot_gain(night(), np.full(120, 0.3), np.array([0]), np.array([120]))
    assert free[0, 0] == 0.0
    assert known[0, 0] > 0.0
