"""Advance of the central longitude and nights to cover, by hand from published rotation rates.

Rates W_dot in deg/day: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, table 1: Jupiter (system
III) 870.5360000, Saturn (system III) 810.7939024, Uranus -501.1600928, Neptune 541.1397757. They count
from mean noon to mean noon (86400 s), light time not counted.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow.plan.rotation import advance_per_day_rad, closest_resonance, nights_to_cover

DEG_PER_DAY = {"jupiter": 870.5360000, "saturn": 810.7939024, "uranus": -501.1600928, "neptune": 541.1397757}
HOUR_S = 3600.0


def period_s(planet: str) -> float:
    return 360.0 / abs(DEG_PER_DAY[planet]) * 86400.0


# By hand: |W_dot| less whole turns. Jupiter 870.536 - 720 = 150.536; Saturn 810.7939024 - 720 = 90.7939024;
# Uranus 501.1600928 - 360 = 141.1600928; Neptune 541.1397757 - 360 = 181.1397757.
@pytest.mark.parametrize(
    ("planet", "advance"),
    [("jupiter", 150.536), ("saturn", 90.7939024), ("uranus", 141.1600928), ("neptune", 181.1397757)],
)
def test_advance_per_day(planet, advance):
    assert np.degrees(advance_per_day_rad(period_s(planet))) == pytest.approx(advance, abs=1e-6)


# By hand, a window of 5 h each night, arc = 5/24 * W_dot, stretches start at k * advance (mod 360), and
# the nights are enough when no gap between neighbouring starts is wider than the arc:
# Jupiter  arc 181.4: two starts 0, 150.5: gaps 150.5, 209.5 > arc; third at 301.1: 150.5, 150.5, 58.9 -> 3.
# Saturn   arc 168.9: starts 0, 90.8, 181.6: largest gap 178.4 > arc; fourth at 272.4: 90.8 x 3, 87.6 -> 4.
# Uranus   arc 104.4: starts 0, 141.2, 282.3, 63.5, 204.6: sorted 0 63.5 141.2 204.6 282.3: gaps 63.5 77.7
#          63.5 77.7 77.7 -> 5 are enough; four (0 63.5 141.2 282.3) leave 141.2 -> 5.
# Neptune  arc 112.7: even nights start at 0, 2.28, 4.56 ..., odd ones at 181.1, 183.4 ...: the gap from the
#          last even start to the first odd one, 181.14 - 2.28 * (pairs - 1), must shrink to 112.7, and the
#          one from the last odd start, 360 - 181.14 - 2.28 * (odd - 1), too: the first needs 31 steps
#          (181.14 - 31 * 2.27955 = 110.47), so 32 even nights, the last of them night 63; the second 29.03
#          steps, 30 of them, done by then -> 63.
@pytest.mark.parametrize(
    ("planet", "nights"), [("jupiter", 3), ("saturn", 4), ("uranus", 5), ("neptune", 63)]
)
def test_nights_to_cover_with_five_hours_each(planet, nights):
    assert nights_to_cover(period_s(planet), 5.0 * HOUR_S) == nights


def test_resonances_by_hand():
    # Neptune: 2 days = 1082.2795514 deg = 3 turns + 2.2795514 deg
    found = closest_resonance(period_s("neptune"), 10)
    assert (found.nights, found.turns) == (2, 3)
    assert np.degrees(found.drift_rad) == pytest.approx(2.2795514, abs=1e-6)
    # Saturn: 4 days = 3243.1756096 deg = 9 turns + 3.1756096 deg
    found = closest_resonance(period_s("saturn"), 5)
    assert (found.nights, found.turns) == (4, 9)
    assert np.degrees(found.drift_rad) == pytest.approx(3.1756096, abs=1e-6)
    # Uranus: 5 days = 2505.800464 deg = 7 turns - 14.199536 deg
    found = closest_resonance(period_s("uranus"), 6)
    assert (found.nights, found.turns) == (5, 7)
    assert np.degrees(found.drift_rad) == pytest.approx(-14.199536, abs=1e-6)


def test_a_planet_in_step_with_the_day_is_never_covered():
    assert nights_to_cover(0.5 * 86400.0, 4.0 * HOUR_S) is None
    assert nights_to_cover(10.0 * HOUR_S, 11.0 * HOUR_S) == 1


@given(st.floats(9.0, 30.0), st.floats(3.0, 9.0))
def test_nights_against_a_scan_of_longitudes(period_h, window_h):
    nights = nights_to_cover(period_h * HOUR_S, window_h * HOUR_S, 60)
    turn = np.linspace(0.0, 1.0, 7201)[:-1]

    def uncovered(count):
        start = np.arange(count) * 24.0 / period_h
        return ~np.any(np.mod(turn[None] - start[:, None], 1.0) <= window_h / period_h, axis=0)

    if nights is not None:
        assert not uncovered(nights).any()
    # one night fewer leaves a gap, unless it is thinner than the scan resolves
    fewer = 60 if nights is None else nights - 1
    arc, start = window_h / period_h, np.sort(np.mod(np.arange(fewer) * 24.0 / period_h, 1.0))
    if fewer > 0 and arc < 1.0:
        widest = np.diff(np.append(start, start[0] + 1.0)).max() - arc
        assert widest > 0.0
        if widest > 1.0 / 7200.0:
            assert uncovered(fewer).any()
