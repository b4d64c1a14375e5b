"""The beam's table over a season against looking at each instant by itself."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coldglow.describe.load import load_request
from coldglow.detect.season import FEW, beams
from coldglow.scenario import usable_steps, watch

EXAMPLES = Path(__file__).parent.parent.parent / "examples"


@pytest.mark.parametrize(
    ("name", "angle", "tolerance"),
    [
        ("uranus-season", "rotation-axis", 0.003),
        ("uranus-season", "parallactic", 0.003),
        ("uranus-season", "position-angle", 0.003),
        ("jupiter-ovals", "rotation-axis", 0.02),
    ],
)
def test_the_beam_table_of_a_season_is_right(name, angle, tolerance):
    asked = load_request(EXAMPLES / f"{name}.yaml")
    use = asked.uses[0]
    instrument = replace(use.instrument, opening=replace(use.instrument.opening, angle=angle))
    track = watch(asked, use)
    index = np.flatnonzero(usable_steps(asked, track))[::23]
    short = track.take(index)
    seeing_rad = use.instrument.sky.seeing_rad.median
    arguments = (asked.target, instrument, use.setting, short, short.airmass, seeing_rad)
    many = beams(*arguments)
    assert index.size > FEW
    exact = [
        beams(asked.target, instrument, use.setting, short.take([i]), short.airmass[i : i + 1], seeing_rad)
        for i in range(0, index.size, 7)
    ]
    for part in ("path_factor", "disk_fill", "light_share"):
        want = np.array([getattr(beam, part)[0] for beam in exact])
        np.testing.assert_allclose(getattr(many, part)[::7], want, rtol=tolerance)
