"""What can be asked for: nights, halves, stretches, and how they add up."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers.common.offers import FIRST, SECOND, STRETCH, WHOLE, offers
from coldglow.answers.common.scenes import scenes
from coldglow.describe.load import load_request
from coldglow.plan.goal import marginalise
from coldglow.plan.stretches import RunningSums
from coldglow.sky.clock import iso_from_tt

EXAMPLES = Path(__file__).parents[2] / "examples"


@pytest.fixture(scope="module")
def season():
    """Half a month of the shipped season, every night long enough for two halves."""
    request = load_request(EXAMPLES / "uranus-season.yaml")
    dates = replace(request.dates, first="2027-11-10", last="2027-11-24", forbidden=())
    request = replace(request, dates=dates)
    return request, scenes(request)


def test_halves_part_at_local_mean_midnight(season):
    request, found = season
    given = offers(request, found, "half-night")
    longitude_h = np.degrees(request.uses[0].instrument.place.longitude_rad) / 15.0
    for part, sign in ((FIRST, -1), (SECOND, 1)):
        edge = given.end_tt_s if part == FIRST else given.start_tt_s
        inner = iso_from_tt(edge[given.part == part], "s")
        hour = np.array([int(t[11:13]) + int(t[14:16]) / 60 + int(t[17:19]) / 3600 for t in inner])
        from_midnight = np.mod(hour + longitude_h + 12.0, 24.0) - 12.0
        assert np.all(np.abs(from_midnight) <= request.dates.step_s / 3600.0), sign
    assert np.all(given.cost == 0.5)


def test_a_whole_night_is_its_halves_without_the_second_overhead(season):
    request, found = season
    scene = found[0]
    given = offers(request, found, "half-night", wholes=True)
    for day in np.unique(given.day):
        whole, first, second = (
            np.flatnonzero((given.day == day) & (given.part == p))[0] for p in (WHOLE, FIRST, SECOND)
        )
        assert given.observable_s[whole] == given.observable_s[first] + given.observable_s[second]
        saved = given.shutter_s[whole] - given.shutter_s[first] - given.shutter_s[second]
        assert saved == pytest.approx(
            scene.overhead_s * scene.steps.shutter_share[scene.usable].mean(), rel=0.02
        )
        assert given.information[whole] > given.information[first] + given.information[second]


def test_matrices_of_halves_add_to_the_nights_before_marginalising(season):
    request, found = season
    scene = found[0]
    night, half = (offers(request, found, unit).visits[0] for unit in ("night", "half-night"))
    sums = RunningSums(scene.steps, scene.steps.matrix)
    whole = sums.window(night.first, night.end, 0.0)
    parts = sums.window(half.first, half.end, 0.0).reshape(-1, 2, 4, 4).sum(axis=1)
    np.testing.assert_allclose(parts, whole, rtol=1e-9, atol=1e-9 * np.abs(whole).max())
    # nuisances of each half's own cost information: what two visits know is never more than one visit
    apart = marginalise(sums.window(half.first, half.end, 0.0)).reshape(-1, 2, 2, 2).sum(axis=1)
    assert np.all(np.linalg.eigvalsh(marginalise(whole) - apart) >= -1e-9 * np.abs(apart).max())
    # and the second acquisition costs more
    assert np.all(half.matrix[:, 0, 0].reshape(-1, 2).sum(axis=1) < apart[:, 0, 0])


def test_stretches_tile_each_night_twice(season):
    request, found = season
    request = replace(request, coverage=replace(request.coverage, stretch_s=3600.0))
    given, nights = offers(request, found, "stretch"), offers(request, found, "night")
    assert np.all(given.part == STRETCH)
    assert given.observable_s.min() >= 3600.0
    assert given.cost_unit == "h"
    np.testing.assert_allclose(given.cost, given.observable_s / 3600.0)
    for day in nights.day:
        here, whole = np.flatnonzero(given.day == day), np.flatnonzero(nights.day == day)[0]
        assert given.start_tt_s[here[0]] == nights.start_tt_s[whole]
        assert given.end_tt_s[here[-1]] == nights.end_tt_s[whole]
        assert np.all(
            given.start_tt_s[here[2:]] == given.end_tt_s[here[:-2]]
        )  # every other one is next to it


def test_visits_are_no_longer_than_the_longest(season):
    request = load_request(EXAMPLES / "uranus-space.yaml")
    use = request.uses[0]
    limits = replace(use.instrument.limits, longest_visit_s=5 * 3600.0)
    use = replace(use, instrument=replace(use.instrument, limits=limits))
    request = replace(request, uses=(use,), dates=replace(request.dates, last="2028-01-20"))
    found = scenes(request)
    for unit in ("night", "half-night", "stretch"):
        given = offers(request, found, unit)
        assert given.visits[0].duration_s.max() <= 5 * 3600.0
        assert given.cloudless == (0,)
        assert np.isnan(given.weather_day).all()


def test_two_settings_share_telescope_and_weather():
    request = load_request(EXAMPLES / "cold-giant-limit.yaml")
    given = offers(request, scenes(request))
    assert set(given.telescope) == {0}
    assert set(given.site) == {0}
    both = load_request(EXAMPLES / "neptune-two-sites.yaml")
    apart = offers(both, scenes(both))
    assert set(apart.telescope) == set(apart.site) == {0, 1}
    assert len(np.unique(apart.weather_day)) == apart.size


def test_half_nights_offered_and_forbidden(season):
    request, _ = season
    dates = replace(
        request.dates,
        offered=("2027-11-18", "2027-11-20 first", "2027-11-22"),
        forbidden=("2027-11-22 second",),
    )
    request = replace(request, dates=dates)
    given = offers(request, scenes(request), "half-night")
    seen = {(str(day), int(part)) for day, part in zip(given.date, given.part, strict=True)}
    assert seen == {
        ("2027-11-18", FIRST),
        ("2027-11-18", SECOND),
        ("2027-11-20", FIRST),
        ("2027-11-22", FIRST),
    }
