"""How many nights: against laws of probability, and what insurance, scatter and time account say."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import binom

from coldglow.answers.asking.requesting import plan_of
from coldglow.answers.asking.scatter import factors_of, response_of
from coldglow.answers.common.offers import offers
from coldglow.answers.common.scenes import scenes
from coldglow.answers.covering.choice import choose
from coldglow.answers.nights import nights, nights_of
from coldglow.describe.load import load_request
from coldglow.describe.records import Budget, Estimate, Quartiles

EXAMPLES = Path(__file__).parents[2] / "examples"


def request(name="neptune-deep", first="2028-10-01", last="2028-10-14", asked=False, **weather):
    found = load_request(EXAMPLES / f"{name}.yaml")
    dates = replace(found.dates, first=first, last=last, forbidden=(), offered=(), fixed=())
    return replace(
        found,
        dates=dates,
        weather=replace(found.weather, **{"scatter": False, "correlation": 0.0} | weather),
        coverage=replace(found.coverage, asked=asked),
        budget=Budget(None, None),
    )


def test_nearly_equal_nights_follow_the_binomial_law():
    asked = request(clear_fraction=0.6)
    found = scenes(asked)
    given = offers(asked, found)
    result = nights_of(asked, found)
    plan = plan_of(asked, given, None)
    # how many clear nights are enough, whichever they are; and one fewer is too few, whichever they are
    need = plan.needed
    best, worst = np.sort(given.information)[::-1], np.sort(given.information)
    demand = float(plan.goals[0].demand.demand[0])
    assert worst[:need].sum() >= demand > best[: need - 1].sum()
    n = result["nights"].astype(int)
    expected = binom.sf(need - 1, n, 0.6)  # P(at least `need` successes among n)
    np.testing.assert_allclose(result["probability"], expected, atol=1e-12)


def test_certain_weather_needs_no_insurance():
    result = nights(request(clear_fraction=1.0))
    assert result.header["probability"].value == 1.0
    assert set(result.table("requested")["purpose"]) == {"goal"}
    hopeless = nights(request(clear_fraction=0.0))
    assert not hopeless.feasible
    assert np.all(hopeless["probability"] == 0.0)
    assert any("With every night clear" in text for text in hopeless.sentences)


def test_persistent_weather_is_worth_more_nights():
    plain, lasting = (
        nights(request(last="2028-11-05", clear_fraction=0.7, correlation=rho)) for rho in (0.0, 0.8)
    )
    enough = int(plain.header["nights"].value)
    assert plain["probability"][enough - 1] >= 0.8 > lasting["probability"][enough - 1]


def test_a_goal_too_deep_is_said_to_be():
    asked = request()
    result = nights(replace(asked, goal=replace(asked.goal, snr=500.0)))
    assert not result.feasible
    assert any("too deep" in text for text in result.sentences)


# ---------------------------------------------------------------- coverage


def test_insurance_keeps_apart_from_the_clouds_of_the_best_night():
    asked = request("jupiter-ovals", "2027-03-01", "2027-03-20", clear_fraction=0.7, correlation=0.3)
    asked = replace(asked, weather=replace(asked.weather, probability=0.905))
    asked = replace(asked, dates=replace(asked.dates, unit="night"))
    asked = replace(asked, coverage=replace(asked.coverage, candidates="night"))
    result = nights(asked)
    # every night reaches the goal: two of the same weather 1 - 0.3 (0.3 + 0.7 x 0.3^d), d days apart
    assert result.header["nights"].value == 2.0
    assert any("1 night of it insures against the weather" in sentence for sentence in result.sentences)
    first, second = (np.datetime64(day) for day in result.table("requested")["night"])
    apart = int((second - first) / np.timedelta64(1, "D"))
    expected = 1.0 - 0.3 * (0.3 + 0.7 * 0.3**apart)
    assert result["probability"][1] == pytest.approx(expected, abs=1e-9)
    assert expected > 0.905 > 1.0 - 0.3 * (0.3 + 0.7 * 0.3**2)


def test_one_night_is_not_spoken_of_as_many():
    result = nights(request(first="2028-10-01", last="2028-10-01"))
    assert result.sentences[0].startswith("1 night reaches SNR 5 with a probability of only 0 %")


@pytest.fixture(scope="module")
def covering():
    asked = request("uranus-season", "2027-11-18", "2027-12-08", asked=True, clear_fraction=0.7)
    asked = replace(asked, coverage=replace(asked.coverage, snr=12.0))
    found = scenes(asked)
    return asked, found, choose(asked, found)


def test_a_minimal_cover_succeeds_when_all_its_nights_are_clear(covering):
    asked, found, choice = covering
    result = nights_of(asked, found, choice)
    base = choice.cover.chosen
    different = np.unique(choice.question.offers.day[base]).size
    at_base = result["probability"][base.size - 1]
    # every one of its units is needed (else a smaller cover were found), so all must be clear: 0.7^n
    error = result["probability_error"][base.size - 1]
    assert at_base == pytest.approx(0.7**different, abs=4 * max(error, 1e-12))
    assert np.all(result["probability"][: base.size - 1] == 0.0)


def test_insurance_raises_the_chance_and_keeps_the_cover(covering):
    asked, found, choice = covering
    result = nights_of(asked, found, choice)
    assert np.all(np.diff(result["probability"]) >= 0.0)
    assert result.header["probability"].value >= asked.weather.probability
    requested = result.table("requested")
    given = choice.question.offers
    names = set(zip(given.date[choice.cover.chosen], given.start_tt_s[choice.cover.chosen], strict=True))
    assert len(names) == choice.cover.chosen.size
    assert {day for day, _ in names} <= set(requested["night"])
    purpose = requested["purpose"]
    assert (purpose == "insurance").sum() > 0
    assert (purpose == "goal").sum() >= choice.cover.chosen.size


def test_coverage_probability_against_a_simulation_by_hand(covering):
    asked, _, choice = covering
    plan = plan_of(asked, choice.question.offers, choice)
    units = plan.order[: plan.chosen + 1]
    question = choice.question
    rng = np.random.default_rng(77)
    days, index = np.unique(question.offers.day[units], return_inverse=True)
    success, trials = 0, 20_000
    demand = question.demand.demand
    total_goal = plan.goals[1].demand.demand[0]
    for clear in rng.random((trials, days.size)) < 0.7:
        up = units[clear[index]]
        bins = question.gain[up].sum(axis=0)
        success += np.all(bins >= demand * (1 - 1e-9)) and question.offers.information[up].sum() >= total_goal
    expected = success / trials
    error = np.hypot(plan.chances.probability_error[plan.chosen], np.sqrt(expected * (1 - expected) / trials))
    assert plan.chances.probability[plan.chosen] == pytest.approx(expected, abs=4 * error)


def test_insurance_obeys_a_run_of_nights():
    asked = request("uranus-season", "2027-11-18", "2027-12-08", asked=True, clear_fraction=0.8)
    asked = replace(asked, coverage=replace(asked.coverage, snr=10.0, consecutive=True, candidates="night"))
    result = nights(asked)
    used = np.unique(result.table("requested")["night"].astype("datetime64[D]").astype(int))
    assert np.all(np.diff(used) == 1)


def test_two_sites_have_weather_of_their_own():
    asked = request("neptune-two-sites", "2028-10-09", "2028-10-10", asked=True, correlation=0.9)
    asked = replace(
        asked, weather=replace(asked.weather, clear_fraction=0.75), goal=replace(asked.goal, snr=0.5)
    )
    found = scenes(asked)
    result = nights_of(asked, found)
    # both nights at both sites are needed: (c (c + (1-c) rho))^2 with c = 0.75, rho = 0.9
    assert result["probability"][3] == pytest.approx((0.75 * (0.75 + 0.25 * 0.9)) ** 2, abs=1e-9)
    assert "each of 2 sites" in str(result.header["weather"])


def test_no_clouds_in_space():
    asked = request("uranus-space", "2028-01-15", "2028-01-24", asked=True)
    result = nights(asked)
    assert result.header["probability"].value == 1.0
    assert "space" in str(result.header["weather"])
    assert np.all(result.table("requested")["purpose"] == "goal")


def test_bins_out_of_reach_are_left_out_and_named():
    asked = request("uranus-season", "2028-02-20", "2028-03-05", asked=True, clear_fraction=1.0)
    asked = replace(
        asked, coverage=replace(asked.coverage, snr=None, minutes=30.0), goal=replace(asked.goal, snr=5.0)
    )
    result = nights(asked)
    assert not result.feasible
    assert any("that the cover reaches" in text for text in result.sentences)
    assert any("Out of reach" in text for text in result.sentences)


# ---------------------------------------------------------------- natural scatter


def steady(asked):
    """The same request about a planet and a site that never change."""
    emission = asked.target.emission
    emission = replace(
        emission,
        temperature_k=Estimate(emission.temperature_k.value),
        column_m2=Estimate(emission.column_m2.value),
    )
    use = asked.uses[0]
    sky = use.instrument.sky
    same = {name: Quartiles(*(getattr(sky, name).median,) * 3) for name in ("seeing_rad", "water_m")}
    use = replace(use, instrument=replace(use.instrument, sky=replace(sky, **same)))
    return replace(asked, uses=(use,), target=replace(asked.target, emission=emission))


def test_what_never_changes_does_not_scatter():
    asked = steady(request(scatter=True))
    factors = factors_of(asked, offers(asked, scenes(asked)))
    np.testing.assert_allclose(factors, 1.0, rtol=1e-9)


def test_information_answers_to_column_and_air_as_physics_has_it():
    asked = request(scatter=True)
    scene = scenes(asked)[0]
    response = response_of(asked, scene)
    assert response.power == pytest.approx(2.0, abs=0.05)  # a faint line under a bright sky: I goes as N^2
    for good, median, poor in response.quartiles:
        assert good > 1.0 > poor
        assert median == pytest.approx(1.0)
    # slope of the signal against exp(-c2 E / T) / Q: for the fundamental's Q branch near 550 K some 1 % per K
    assert 0.004 < response.slope_k < 0.03


def test_scatter_of_the_column_by_hand():
    asked = steady(request(scatter=True, trials=20_000))
    emission = asked.target.emission
    column = Estimate(emission.column_m2.value, 0.0, 0.2 * emission.column_m2.value)
    asked = replace(asked, target=replace(asked.target, emission=replace(emission, column_m2=column)))
    factors = factors_of(asked, offers(asked, scenes(asked)))
    assert np.log(factors).std() == pytest.approx(2.0 * 0.2, rel=0.03)  # ln I = 2 ln N
    assert np.corrcoef(np.log(factors[:, :2]).T)[0, 1] == pytest.approx(0.0, abs=0.03)


def test_halves_of_a_night_and_two_sites_share_the_planet():
    asked = request("neptune-two-sites", "2028-10-09", "2028-10-11", scatter=True, trials=3000)
    given = offers(asked, scenes(asked), "half-night")
    logs = np.log(factors_of(asked, given))
    night = np.flatnonzero((given.day == given.day[0]) & (given.scene == 0))
    np.testing.assert_allclose(logs[:, night[0]], logs[:, night[1]])
    other = np.flatnonzero((given.day == given.day[0]) & (given.scene == 1))[0]
    assert 0.3 < np.corrcoef(logs[:, night[0]], logs[:, other])[0, 1] < 0.999  # same planet, different air


def test_scatter_is_told_and_changes_the_answer():
    plain, scattered = (nights(request(scatter=flag)) for flag in (False, True))
    assert not np.allclose(plain["probability"][:5], scattered["probability"][:5])
    assert any("scatter" in text for text in scattered.sentences)


# ---------------------------------------------------------------- time account


def test_the_account_adds_up(covering):
    asked, found, choice = covering
    result = nights_of(asked, found, choice)
    account = result.table("account")
    assert account["time"][:4].sum() == pytest.approx(account["time"][4])
    assert account["share"][:4].sum() == pytest.approx(1.0)
    assert account["cost"][:4].sum() == pytest.approx(account["cost"][4])
    assert account["cost"][4] == pytest.approx(result.header["nights"].value)
    scene = found[0]
    goal = (result.table("requested")["purpose"] == "goal").sum()
    # at least acquisition and standards of every unit are overhead
    assert account["time"][1] >= goal * scene.overhead_s / 3600.0
    within = replace(asked, budget=Budget(0.5, None))
    assert not nights_of(within, found, choice).feasible
    assert any("more than the budget" in text for text in nights_of(within, found, choice).sentences)


def test_what_is_said_of_the_insurance(covering):
    asked, found, choice = covering
    assert any("insurance was added" in text for text in nights_of(asked, found, choice).sentences)
    certain = replace(asked, weather=replace(asked.weather, clear_fraction=1.0))
    assert not any("insurance was added" in text for text in nights_of(certain, found).sentences)
    blocks = replace(asked, coverage=replace(asked.coverage, block_nights=2, candidates="night", snr=8.0))
    said = nights_of(blocks, found).sentences
    assert any("Nights come in blocks, for which no insurance" in text for text in said)
