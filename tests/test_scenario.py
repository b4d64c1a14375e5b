"""The path from descriptions to information over time: what interpolation costs, and what must add up."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coldglow import scenario as paths
from coldglow.describe.load import load_request
from coldglow.detect import season
from coldglow.plan.goal import marginalise
from coldglow.plan.stretches import runs, table
from coldglow.scenario import moments_of, scenario, state_of, usable_steps, watch

EXAMPLES = Path(__file__).parent.parent / "examples"
ALL = sorted(path.stem for path in EXAMPLES.glob("*.yaml"))


def example(name, first=None, nights=3):
    """A shipped request, cut to a few nights."""
    request = load_request(EXAMPLES / f"{name}.yaml")
    first = first or {"cold-giant-limit": "2027-09-12"}.get(name, request.dates.first)
    last = str(np.datetime64(first) + (nights - 1))
    return replace(request, dates=replace(request.dates, first=first, last=last, forbidden=()))


@pytest.fixture(scope="module", params=ALL)
def any_scene(request):
    """The last use of every example, over three nights."""
    asked = example(request.param)
    use = asked.uses[-1]
    return asked, use, scenario(asked, use, watch(asked, use))


def test_every_kind_of_instrument_runs_through_the_same_path(any_scene):
    _, _, scene = any_scene
    assert scene.usable.any()
    information = marginalise(scene.steps.matrix)[scene.usable]
    assert np.all(information[:, 0, 0] > 0.0)
    assert np.all(np.linalg.eigvalsh(information) >= -1e-9 * information[:, 1:2, 1])
    assert np.all(scene.steps.matrix[~scene.usable] == 0.0)


def test_information_between_the_moments_is_right(any_scene, monkeypatch):
    # every step worked out against every half-hour: 3 % in a single step, 0.5 % in the sum
    asked, use, scene = any_scene
    monkeypatch.setattr(paths, "MOMENT_SPACING_S", asked.dates.step_s)
    monkeypatch.setattr(paths, "MOMENTS_PER_TURN", 10_000)
    monkeypatch.setattr(season, "FEW", 10_000)
    exact = scenario(asked, use, scene.track)
    assert exact.moments.size == scene.usable.sum() > scene.moments.size
    got, want = (marginalise(s.steps.matrix)[scene.usable][:, 0, 0] for s in (scene, exact))
    np.testing.assert_allclose(got, want, rtol=0.03)
    assert got.sum() == pytest.approx(want.sum(), rel=0.005)


def test_halves_of_a_night_add_to_the_night_before_marginalisation():
    asked = example("uranus-season", "2027-11-20", 1)
    use = asked.uses[0]
    scene = scenario(asked, use, watch(asked, use))
    steps = scene.steps
    (first,), (end,) = runs(steps.time_s, steps.step_s, scene.usable, steps.night)
    weight = steps.step_s * steps.shutter_share[:, None, None]
    middle = (first + end) // 2
    halves = np.stack([(steps.matrix * weight)[a:b].sum(axis=0) for a, b in ((first, middle), (middle, end))])
    whole = table(steps, [first], [end]).matrix[0]
    np.testing.assert_allclose(whole, marginalise(halves.sum(axis=0)), rtol=1e-9)
    # each half pays for its own continuum and its own acquisition, so two visits are worth less than one
    apart = table(steps, [first, middle], [middle, end]).matrix
    np.testing.assert_allclose(apart, marginalise(halves), rtol=1e-9)
    assert apart[:, 0, 0].sum() < whole[0, 0]
    paid = table(steps, [first, middle], [middle, end], scene.overhead_s).matrix
    assert paid[:, 0, 0].sum() < apart[:, 0, 0].sum()


def test_a_night_does_not_depend_on_the_season_around_it():
    short = example("uranus-season", "2027-11-20", 1)
    use = short.uses[0]
    alone = scenario(short, use, watch(short, use), state_of(short))
    season = load_request(EXAMPLES / "uranus-season.yaml")
    whole = scenario(season, use, watch(season, use), state_of(short))
    mine = whole.usable & (whole.track.night == whole.track.night_dates.index("2027-11-20"))
    got = marginalise(whole.steps.matrix)[mine][:, 0, 0]
    want = marginalise(alone.steps.matrix)[alone.usable][:, 0, 0]
    np.testing.assert_allclose(got, want, rtol=0.005)


def test_the_column_scales_the_signal_and_the_lte_fraction_scales_the_column():
    asked = example("uranus-season", "2027-11-20", 1)
    use = asked.uses[0]
    track = watch(asked, use)
    state = state_of(asked)
    half = scenario(asked, use, track, replace(state, lte_fraction=0.5 * state.lte_fraction))
    thin = scenario(asked, use, track, replace(state, column_m2=0.5 * state.column_m2))
    np.testing.assert_allclose(half.exposure.signal_e_s, thin.exposure.signal_e_s, rtol=1e-12)
    full = scenario(asked, use, track)
    np.testing.assert_allclose(2.0 * half.exposure.signal_e_s, full.exposure.signal_e_s, rtol=1e-9)


def test_forbidden_and_offered_nights_are_obeyed():
    asked = example("uranus-season", "2027-11-20", 4)
    use = asked.uses[0]
    track = watch(asked, use)
    dates = replace(asked.dates, forbidden=("2027-11-21",))
    used = set(track.night[usable_steps(replace(asked, dates=dates), track)])
    assert {track.night_dates[i] for i in used} == {"2027-11-20", "2027-11-22", "2027-11-23"}
    dates = replace(asked.dates, offered=("2027-11-22",))
    used = set(track.night[usable_steps(replace(asked, dates=dates), track)])
    assert {track.night_dates[i] for i in used} == {"2027-11-22"}


def test_space_has_no_air_and_no_airmass():
    asked = example("uranus-space")
    use = asked.uses[0]
    track = watch(asked, use)
    moments = moments_of(asked.target, use.instrument, use.setting, track.take([0]), paths.Air(1e-6, 0.0))
    assert np.isnan(track.airmass).all()
    assert moments.airmass[0] == 1.0
    scene = scenario(asked, use, track)
    np.testing.assert_allclose(scene.exposure.line_transmission, 1.0)
