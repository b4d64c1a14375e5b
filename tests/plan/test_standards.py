import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from coldglow.plan.standards import nearest_standards, separation_rad

DEG = np.pi / 180


def secant(altitude):
    return np.where(altitude > 0, 1 / np.sin(np.maximum(altitude, 1e-3)), np.nan)


def choose(target, stars, **options):
    """Both lists of (altitude, azimuth) in degrees, one moment."""
    target_alt, target_az = (np.array([x]) * DEG for x in target)
    star_alt, star_az = (np.array(x, dtype=float)[:, None] * DEG for x in zip(*stars, strict=True))
    return nearest_standards(
        target_alt, target_az, secant(target_alt), star_alt, star_az, secant(star_alt), **options
    )


def test_the_same_direction_wins():
    found = choose((50, 120), [(50, 300), (50, 120), (30, 120)], count=3)
    assert found.star.tolist() == [[1, 0, 2]]  # 80 deg at the same airmass before 0.7 in airmass at 20 deg
    assert found.airmass_difference[0, 0] == 0.0
    assert found.separation_rad[0, 0] == pytest.approx(0.0, abs=1e-7)


def test_airmass_and_sky_are_weighed_against_each_other():
    # 10 deg away at the same altitude: 10/15; 0.2 in airmass at 5 deg: 2 and more
    near, far = (30, 0 + 10 / np.cos(30 * DEG)), (35, 0)
    found = choose((30, 0), [far, near], count=2)
    assert found.star.tolist() == [[1, 0]]
    assert found.airmass_difference[0, 1] == pytest.approx(1 / np.sin(35 * DEG) - 2.0)
    assert found.separation_rad[0, 1] == pytest.approx(5 * DEG)


def test_stars_below_the_horizon_or_too_low_are_left_out():
    stars = [(-20, 120), (49, 120), (50, 130)]
    assert choose((50, 120), stars, count=3).star.tolist() == [[1, 2, -1]]
    assert np.isnan(choose((50, 120), stars, count=3).separation_rad[0, 2])
    assert choose((50, 120), stars, altitude_min_rad=55 * DEG).star.tolist() == [[-1]]


def test_every_moment_has_its_own_star():
    star_alt = np.array([[60, 20], [20, 60]]) * DEG
    star_az = np.zeros((2, 2))
    target = np.array([60, 60]) * DEG
    found = nearest_standards(target, np.zeros(2), secant(target), star_alt, star_az, secant(star_alt))
    assert found.star[:, 0].tolist() == [0, 1]


@settings(deadline=None)
@given(st.floats(-89, 89), st.floats(0, 360), st.floats(-89, 89), st.floats(0, 360))
def test_separation_is_the_angle_between_unit_vectors(alt_a, az_a, alt_b, az_b):
    def unit(alt, az):
        alt, az = alt * DEG, az * DEG
        return np.array([np.cos(alt) * np.cos(az), np.cos(alt) * np.sin(az), np.sin(alt)])

    a, b = unit(alt_a, az_a), unit(alt_b, az_b)
    expected = np.arctan2(np.linalg.norm(np.cross(a, b)), a @ b)
    found = separation_rad(*(np.array(x * DEG) for x in (alt_a, az_a, alt_b, az_b)))
    assert found == pytest.approx(expected, abs=1e-12)
