"""Advance of the central longitude and resonances, by hand from published rotation rates.

Rates W_dot in deg/day: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, table 1: Jupiter (system
III) 870.5360000, Saturn (system III) 810.7939024, Uranus -501.1600928, Neptune 541.1397757. They count
from mean noon to mean noon (86400 s), light time not counted.
"""

from __future__ import annotations

import numpy as np
import pytest

from coldglow.plan.rotation import advance_per_day_rad, closest_resonance

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
