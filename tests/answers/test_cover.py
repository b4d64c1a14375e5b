"""Covers of real seasons: against brute force, against the sky, and what cannot be reached."""

from dataclasses import replace
from itertools import product
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers.common.offers import WHOLE, offers
from coldglow.answers.common.scenes import scenes
from coldglow.answers.cover import cover, cover_of
from coldglow.answers.covering.choice import choose
from coldglow.answers.covering.coverage import longitudes_seen, spot_and_rest, view_of_bins, visit_gains
from coldglow.answers.covering.outofreach import bin_ranges
from coldglow.answers.covering.words import phase_errors_rad
from coldglow.describe.load import load_instrument, load_request, load_target
from coldglow.describe.records import Use
from coldglow.detect.season import beams
from coldglow.errors import RangeError
from coldglow.plan.bins import BinSums, central_weights, step_drift
from coldglow.plan.rotation import advance_per_day_rad
from coldglow.report.files import write_result
from coldglow.scenario import follow
from coldglow.sky.clock import tdb_from_tt, times_grid, tt_from_iso

EXAMPLES = Path(__file__).parents[2] / "examples"


def request(
    name="uranus-season", first="2027-11-18", last="2027-12-08", target="", instrument="", **coverage
):
    found = load_request(EXAMPLES / f"{name}.yaml")
    if target:
        planet = load_target(target)
        found = replace(found, target=planet, longitudes=planet.rotation.systems[0].name)
    if instrument:
        machine = load_instrument(instrument)
        found = replace(found, uses=(Use(machine, machine.settings[0]),))
    dates = replace(found.dates, first=first, last=last, forbidden=(), offered=(), fixed=())
    return replace(found, dates=dates, coverage=replace(found.coverage, **coverage))


def answer(asked):
    found = scenes(asked)
    choice = choose(asked, found)
    return cover_of(asked, found, choice), choice


def goal(**which):
    """A goal for the bins, and no other."""
    return {"snr": None, "temperature_error_k": None, "minutes": None} | which


@pytest.fixture(scope="module")
def season():
    return cover(EXAMPLES / "uranus-season.yaml")


# ---------------------------------------------------------------- the shipped season


def test_the_shipped_season_is_covered_and_proven(season):
    assert season.feasible
    assert season.header["proven"].value
    assert np.all(season.table("bins")["reachable"])
    assert np.all(season.table("bins")["share_of_goal"] >= 1.0)
    assert (season.table("bins")["visits"] > 1).sum() >= 5  # a true multi-cover: one visit does not do
    assert season.header["solver_time"].value < 5.0
    assert season["longitude"].tolist() == [30.0 * b for b in range(12)]


def test_longitudes_of_the_visits_are_those_of_the_sky(season):
    asked = load_request(EXAMPLES / "uranus-season.yaml")
    nights = season.table("nights")
    track = follow(asked, asked.uses[0], times_grid([str(t) for t in nights["end"]]))
    there = np.degrees(track.sub_observer_longitude_rad)
    apart = np.mod(nights["longitude_end"] - there + 180.0, 360.0) - 180.0
    assert np.abs(apart).max() < 0.3  # half a minute of rounded time is 0.2 degrees


def test_the_same_request_gives_the_same_bytes(tmp_path):
    texts, asked = [], request()
    found = scenes(asked)
    for name in ("one.json", "two.json"):
        result = cover_of(asked, found, choose(asked, found))
        texts.append(write_result(result, tmp_path / name).read_bytes())
    assert texts[0] == texts[1]
    assert b"solver_time" not in texts[0]


# ---------------------------------------------------------------- against brute force


@pytest.mark.parametrize(
    "bin_goal",
    [goal(snr=12.0), goal(snr=25.0), goal(minutes=55.0), goal(temperature_error_k=30.0)],
    ids=["shallow", "deep", "minutes", "kelvin"],
)
def test_no_set_of_nights_is_cheaper(bin_goal):
    asked = request(first="2027-11-19", last="2027-11-28", **bin_goal, candidates="night")
    _, choice = answer(asked)
    question, found = choice.question, choice.cover
    assert found.kind == "full"
    assert found.proven
    wanted = found.reachable
    assert wanted.any()
    cheapest = np.inf
    for bits in product((0.0, 1.0), repeat=question.offers.size):
        total = np.tensordot(np.array(bits), question.gain, axes=1)
        if np.all(question.demand.share(total)[wanted] >= 1.0 - 1e-9):
            cheapest = min(cheapest, float(question.offers.cost @ np.array(bits)))
    assert found.cost == pytest.approx(cheapest, abs=1e-9)


def test_at_most_two_nights_cover_as_much_as_any_two():
    asked = request(first="2027-11-19", last="2027-11-28", snr=25.0, candidates="night", nights_max=2.0)
    result, choice = answer(asked)
    question, found = choice.question, choice.cover
    assert found.kind == "most"
    assert not result.feasible
    assert any("Missing within the limits" in text for text in result.sentences)
    pairs = [(i, j) for i in range(question.offers.size) for j in range(i)]
    best = max(
        float(
            np.minimum(question.demand.share(question.gain[list(pair)].sum(axis=0)), 1.0)[
                found.reachable
            ].sum()
        )
        for pair in pairs
    )
    assert np.minimum(found.share, 1.0)[found.reachable].sum() == pytest.approx(best, abs=1e-4)


def test_more_nights_never_make_a_cover_dearer():
    costs = [answer(request(last=last, snr=15.0))[1] for last in ("2027-11-28", "2027-12-03", "2027-12-08")]
    assert all(each.cover.reachable.all() for each in costs)
    found = [each.cover.cost for each in costs]
    assert found == sorted(found, reverse=True)
    shares = [each.cover.most for each in costs]
    assert np.all(np.diff(shares, axis=0) >= -1e-9)


def test_fixed_and_forbidden_nights():
    asked = request(first="2027-11-18", last="2027-12-08", snr=8.0)
    dates = replace(
        asked.dates, fixed=("2027-11-20 second", "2027-12-01"), forbidden=("2027-11-19", "2027-11-21 first")
    )
    result, choice = answer(replace(asked, dates=dates))
    nights = list(zip(result.table("nights")["night"], result.table("nights")["part"], strict=True))
    assert any(day == "2027-11-20" and part in ("second half", "whole night") for day, part in nights)
    assert any(day == "2027-12-01" for day, _ in nights)
    assert not any(
        day == "2027-11-19" or (day == "2027-11-21" and part == "first half") for day, part in nights
    )
    free = answer(asked)[1].cover.cost
    assert choice.cover.cost >= free
    unseen = replace(asked, dates=replace(asked.dates, fixed=("2027-11-14",), first="2027-11-14"))
    assert any("2027-11-14" in text for text in answer(unseen)[0].warnings)  # the Moon is in the way


# ---------------------------------------------------------------- information, not minutes


def test_bins_share_out_the_whole_of_a_visit():
    asked = request(**goal(minutes=30.0), candidates="night")
    scene = scenes(asked)[0]
    given = offers(asked, (scene,), "night")
    first, end = given.visits[0].first, given.visits[0].end
    view = view_of_bins(asked, scene)
    clock = visit_gains(scene, view, first, end).clock_s
    np.testing.assert_allclose(clock.sum(axis=1), given.observable_s - scene.overhead_s, rtol=1e-6)
    # without blur the matrices of the bins add to the visit's, before nuisances are marginalised
    usable = scene.usable
    weight = np.zeros((usable.size, 12))
    weight[usable] = central_weights(scene.steps.longitude_rad[usable], 12, step_drift(scene.steps)[usable])
    bins = BinSums(scene.steps, weight).visits(first, end, scene.overhead_s)
    whole = BinSums(scene.steps, usable.astype(float)[:, None]).visits(first, end, scene.overhead_s)
    total = whole.matrix[:, 0]
    np.testing.assert_allclose(bins.matrix.sum(axis=1), total, rtol=1e-6, atol=1e-7 * np.abs(total).max())


def test_blur_takes_away_and_never_adds():
    asked = request(snr=20.0, bins=36)
    scene = scenes(asked)[0]
    sharp = replace(scene, air=replace(scene.air, seeing_rad=1e-9))
    given = offers(asked, (scene,), "night")
    first, end = given.visits[0].first, given.visits[0].end
    blurred, clear = (
        visit_gains(s, view_of_bins(asked, s), first, end).matrix[..., 0, 0] for s in (scene, sharp)
    )
    assert np.all(blurred <= clear * (1 + 1e-9))
    assert 0.2 < blurred.sum() / clear.sum() < 0.8  # 23 degrees of blur in bins of 10


def test_a_low_hour_counts_less_than_a_high_one():
    asked = request(**goal(snr=20.0), candidates="stretch", stretch_s=3600.0)
    scene = scenes(asked)[0]
    given = offers(asked, (scene,), "stretch")
    rows = given.visits[0]
    per_hour = given.information / given.shutter_s
    middle = 0.5 * (rows.airmass_min + rows.airmass_max)
    assert per_hour[middle > 1.6].max() < per_hour[middle < 1.4].max()
    assert np.corrcoef(middle, per_hour)[0, 1] < -0.4


# ---------------------------------------------------------------- what cannot be reached


def test_a_short_window_explains_what_it_never_sees():
    asked = request(first="2028-02-20", last="2028-03-05", **goal(minutes=30.0))
    result, choice = answer(asked)
    never = choice.question.clock_s.sum(axis=0) <= 0.0
    assert np.array_equal(never, choice.cover.most <= 0.0)
    assert never.any()
    text = " ".join(result.sentences)
    assert bin_ranges(never, 30.0) in text
    # 24 h / 17.247864 h = 1.39148 turns: 140.9 degrees a day; five days are 6.9574 turns, -15.3 degrees
    assert "141°" in text
    assert "5 days are nearly 7 turns (−15.3°)" in text
    assert not result.feasible


def test_too_faint_is_told_from_turned_away():
    asked = request("neptune-deep", "2028-10-01", "2028-10-14", **goal(snr=10.0))
    result, choice = answer(asked)
    assert not choice.cover.reachable.any()
    assert any("too deep" in text for text in result.sentences)
    assert not result.feasible


def test_a_latitude_that_never_turns_to_us():
    asked = request("neptune-deep", "2028-10-01", "2028-10-03", **goal(minutes=30.0))
    for latitude, seen in ((75.0, False), (-40.0, True)):
        coverage = replace(asked.coverage, latitude_rad=np.radians(latitude), angle_max_rad=np.radians(50.0))
        result, choice = answer(replace(asked, coverage=coverage))
        assert bool(choice.cover.reachable.any()) is seen
        assert any("never comes within 50.0°" in text for text in result.sentences) is not seen


def test_ranges_of_bins_in_words():
    mask = np.zeros(12, dtype=bool)
    mask[[11, 0, 4, 5]] = True
    assert bin_ranges(mask, 30.0) == "longitudes 120° to 180° and 330° to 30°"
    assert bin_ranges(~np.zeros(12, dtype=bool), 30.0) == "at all longitudes"


# ---------------------------------------------------------------- longitude systems


def test_neptune_in_radio_longitudes_is_relative_and_says_so():
    result, _ = answer(request("neptune-deep", "2028-09-01", "2028-09-20"))
    assert str(result.header["longitudes"]) == "iii"
    assert result.header["period"].value == pytest.approx(16.11)
    assert any("relative longitudes" in text for text in result.sentences)


def test_phase_uncertainty_by_hand():
    # 17.24 h +- 0.01 h, phase known on 1986-01-24 (Archinal et al. 2018, table 1): 360 dt sigma_P / P^2
    asked = replace(request(snr=20.0), longitudes="iau2015")
    result, choice = answer(asked)
    hours = (
        tdb_from_tt(tt_from_iso(str(result.table("nights")["end"][-1])))
        - tdb_from_tt(tt_from_iso("1986-01-24"))
    ) / 3600.0
    by_hand = 360.0 * hours * 0.01 / 17.24**2
    assert result.header["phase_uncertainty"].value == pytest.approx(by_hand, rel=1e-3)
    assert by_hand > 360.0  # lost by turns
    assert any("relative longitudes" in text for text in result.sentences)
    times = choice.question.offers
    span_h = (
        times.end_tt_s[choice.cover.chosen].max() - times.start_tt_s[choice.cover.chosen].min()
    ) / 3600.0
    assert np.degrees(phase_errors_rad(choice)[1]) == pytest.approx(
        360.0 * span_h * 0.01 / 17.24**2, rel=1e-6
    )
    good, _ = answer(request(snr=20.0))
    assert good.header["phase_uncertainty"].value < 30.0
    assert not any("relative longitudes" in text for text in good.sentences)


# ---------------------------------------------------------------- rotation against the day


@pytest.mark.parametrize(
    ("target", "instrument", "turn_deg"),
    [
        # degrees a day of the published rates (Archinal et al. 2018, table 1), less whole turns;
        # for Uranus 24 h / 17.247864 h (Nat. Astron. 2025), for Neptune 24 h / 16.11 h of the radio period
        ("jupiter", "narrowband-3m", 870.536 - 720.0),
        ("saturn", "longslit-4m", 810.7939024 - 720.0),
        ("uranus", "echelle-8m", 360.0 * 24.0 / 17.247864 - 360.0),
        ("neptune", "echelle-8m", 360.0 * 24.0 / 16.11 - 360.0),
    ],
)
def test_advance_of_the_central_longitude_in_a_day(target, instrument, turn_deg):
    asked = request(target=target, instrument=instrument)
    times = times_grid(["2027-11-20T05:00", "2027-11-21T05:00"])
    track = follow(asked, asked.uses[0], times)
    advance = float(np.degrees(np.diff(track.sub_observer_longitude_rad)[0])) % 360.0
    light_and_motion = 0.5  # degrees: light time and the motion of both planets within a day
    assert advance == pytest.approx(turn_deg, abs=light_and_motion)
    period_s = track.system.period_s
    assert np.degrees(advance_per_day_rad(period_s)) == pytest.approx(turn_deg, abs=0.01)


# ---------------------------------------------------------------- campaigns


def test_two_sites_cover_in_two_days_what_one_cannot_in_twelve():
    asked = load_request(EXAMPLES / "neptune-two-sites.yaml")

    def covered(uses, last):
        part = replace(asked, uses=uses, dates=replace(asked.dates, last=last))
        return answer(part)[1].cover.covered.all()

    assert covered(asked.uses, "2028-10-10")
    for use in asked.uses:
        assert not covered((use,), "2028-10-20")
    assert covered(asked.uses[:1], "2028-10-24")


def test_a_campaign_names_its_sites_and_adds_their_information():
    asked = load_request(EXAMPLES / "neptune-two-sites.yaml")
    result, choice = answer(asked)
    assert set(result.table("nights")["instrument"]) == {"echelle-8m", "grating-8m"}
    assert any("echelle-8m" in text and "grating-8m" in text for text in result.sentences)
    question, chosen = choice.question, choice.cover.chosen
    by_site = [question.information[chosen[question.offers.scene[chosen] == k]].sum(axis=0) for k in (0, 1)]
    together = by_site[0] + by_site[1]
    np.testing.assert_allclose(result.table("bins")["snr"], np.sqrt(together), rtol=1e-9)
    costs = dict(zip(result.table("nights")["instrument"], result.table("nights")["cost"], strict=True))
    assert costs == {"echelle-8m": 1.0, "grating-8m": 0.8}


# ---------------------------------------------------------------- space


@pytest.fixture(scope="module")
def space():
    asked = request("uranus-space", "2028-01-15", "2028-01-24", **goal(snr=60.0))
    return asked, *answer(asked)


def with_longest(asked, hours):
    use = asked.uses[0]
    limits = replace(use.instrument.limits, longest_visit_s=3600.0 * hours)
    return replace(asked, uses=(replace(use, instrument=replace(use.instrument, limits=limits)),))


def test_one_stare_sees_a_full_turn(space):
    _, result, choice = space
    nights = result.table("nights")
    overhead_h, step_h = 0.5, 1.0 / 12.0
    assert len(nights) == 1
    assert nights["cost"][0] == pytest.approx(17.247864 + overhead_h, abs=2 * step_h)
    assert nights["turn"][0] >= 359.0
    assert result.feasible
    assert choice.stare


def test_a_short_longest_visit_splits_the_stare(space):
    asked, whole, _ = space
    result, choice = answer(with_longest(asked, 6.0))
    nights = result.table("nights")
    assert np.all(nights["cost"] <= 6.0)
    assert len(nights) > 17.75 / 6.0
    assert np.all(nights["start"][1:] == nights["end"][:-1])  # one after the other
    given, chosen = choice.question.offers, choice.cover.chosen
    assert longitudes_seen(given, chosen, 720).mean() > 0.995
    # the gaps of the acquisitions make it longer than the single stare
    assert nights["cost"].sum() > whole.table("nights")["cost"].sum()
    # by hand: longitudes seen, minute by minute, from the times printed and the period alone
    seen = np.zeros(360, dtype=bool)
    origin = tt_from_iso(str(nights["start"][0]))
    for begin, end in zip(nights["start"], nights["end"], strict=True):
        minutes = np.arange(tt_from_iso(str(begin)) + 1800.0, tt_from_iso(str(end)), 60.0) - origin
        seen[np.floor(np.mod(minutes / (17.247864 * 3600.0), 1.0) * 360).astype(int)] = True
    assert seen.mean() > 0.98


def test_a_deep_goal_stares_for_several_turns(space):
    asked, _, shallow = space
    deep = replace(asked, coverage=replace(asked.coverage, snr=400.0))
    _, choice = answer(with_longest(deep, 24.0))
    assert choice.cover.covered.all()
    # a visit knows the light to 0.3 % (its floor) at best, SNR 333: every longitude must be seen twice
    assert choice.cover.chosen.size >= 2
    assert choice.cover.cost > 1.9 * shallow.cover.cost


# ---------------------------------------------------------------- spots


@pytest.fixture(scope="module")
def ovals():
    asked = request("jupiter-ovals", "2027-02-08", "2027-02-14")
    return asked, scenes(asked)


def test_spot_and_rest_are_the_whole(ovals):
    scene = ovals[1][0]
    track = scene.track.take(scene.moments[:40])
    airmass = np.ones(40)
    spot, rest = spot_and_rest(scene, track, airmass, "northern oval")
    use = scene.use
    whole = beams(scene.target, use.instrument, use.setting, track, airmass, scene.air.seeing_rad).path_factor
    np.testing.assert_allclose(spot + rest, whole, rtol=1e-9)
    assert np.all(rest > 0.0)


def test_the_light_curve_turns_with_the_spot(ovals):
    asked, _ = ovals
    result, _ = answer(asked)
    curve = result.table("light_curve")
    assert curve["relative_brightness"][:-1].mean() == pytest.approx(1.0)
    np.testing.assert_allclose(curve["relative_brightness"][0], curve["relative_brightness"][-1], rtol=0.01)
    # the oval at longitude 185 deg: its light, as a vector around the turn, points there
    angle = np.radians(curve["longitude"][:-1])
    vector = np.sum(curve["spot_share"][:-1] * np.exp(1j * angle))
    assert np.degrees(np.angle(vector)) % 360.0 == pytest.approx(185.0, abs=5.0)
    even = replace(asked.target, emission=replace(asked.target.emission, spots=()))
    flat, _ = answer(replace(asked, target=even, coverage=replace(asked.coverage, spot="")))
    assert "light_curve" not in flat.tables


def test_passes_of_a_spot(ovals):
    asked, _ = ovals
    result, choice = answer(replace(asked, coverage=replace(asked.coverage, **goal(snr=8.0))))
    assert choice.cover.covered.all()
    nights = result.table("nights")
    total = np.sqrt(np.square(nights["snr"]).sum())
    assert result.table("bins")["snr"][0] == pytest.approx(total, rel=1e-9)
    assert total >= 8.0 + 1.645 - 0.01  # 95 % that the measured one reaches it
    assert result.table("bins")["longitude"][0] == pytest.approx(185.0)
    assert str(result.header["goal"]).startswith("SNR 8 on the spot “northern oval”")
    assert any(each.startswith("The spot “northern oval” shows on") for each in result.sentences)
    with pytest.raises(RangeError, match="temperature error"):
        answer(replace(asked, coverage=replace(asked.coverage, **goal(temperature_error_k=20.0))))


def test_nothing_to_see_is_said():
    asked = request(first="2027-06-01", last="2027-06-05")  # near the Sun
    result, choice = answer(asked)
    assert choice is None
    assert not result.feasible
    assert "never be observed" in result.sentences[0]


def test_nights_are_not_priced_in_nights_again():
    result, _ = answer(request(first="2027-12-18", last="2027-12-20", bins=1, candidates="night", snr=5.0))
    assert result.sentences[0].startswith("1 night gives SNR 5 in the one bin, and")


def test_whole_nights_are_offered_beside_halves():
    _, choice = answer(request(snr=25.0, half_night_cost=0.7))
    assert np.all(choice.question.offers.part[choice.cover.chosen] == WHOLE)  # two halves would cost 1.4
