from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers.common.scenes import visits
from coldglow.answers.expose import expose
from coldglow.answers.fade import fade
from coldglow.answers.fading.forecast import fading, glow_of, tabulated_glow
from coldglow.answers.fading.seasons import STEP_S, best_night, whole_year
from coldglow.answers.glow import glow
from coldglow.answers.hours import hours
from coldglow.describe.load import load_instrument, load_request, load_target
from coldglow.describe.records import Budget, Estimate, Use
from coldglow.errors import DateError, NotFoundError, RangeError
from coldglow.plan.fade import night_information
from coldglow.scenario import scenario, state_of, watch

EXAMPLES = Path(__file__).parents[2] / "examples"


def request(name="uranus-season", years=(2027, 2030), target="", **parts):
    found = load_request(EXAMPLES / f"{name}.yaml")
    if target:
        found = replace(found, target=load_target(target))
        found = replace(found, longitudes=found.target.rotation.systems[0].name)
    first, last = years
    return replace(found, fade=replace(found.fade, first_year=first, last_year=last, trials=60), **parts)


def in_state(asked, temperature_k, column_m2):
    """The same request about a planet of this state."""
    emission = replace(
        asked.target.emission, temperature_k=Estimate(temperature_k), column_m2=Estimate(column_m2)
    )
    still = replace(asked.target.cooling, law="constant", column_rate_s=Estimate(0.0))
    return replace(asked, target=replace(asked.target, emission=emission, cooling=still))


def certain(asked):
    """The same request without any uncertainty of planet and law."""

    def sure(estimate):
        return None if estimate is None else Estimate(estimate.value)

    target = asked.target
    emission = replace(
        target.emission,
        temperature_k=sure(target.emission.temperature_k),
        column_m2=sure(target.emission.column_m2),
        lte_fraction=sure(target.emission.lte_fraction),
    )
    names = ("rate_k_s", "floor_k", "time_scale_s", "column_rate_s")
    cooling = replace(target.cooling, **{name: sure(getattr(target.cooling, name)) for name in names})
    return replace(asked, target=replace(target, emission=emission, cooling=cooling))


@pytest.fixture(scope="module")
def uranus():
    return fade(request())


def night_of(asked, date):
    """The request for that one night, in the steps of the outlook."""
    dates = replace(asked.dates, first=date, last=date, offered=(), forbidden=(), fixed=(), step_s=STEP_S)
    return replace(asked, dates=dates)


@pytest.mark.parametrize("target", ["uranus", "neptune", "cold-giant"])
def test_without_uncertainty_the_trials_are_the_law(target):
    table = fade(certain(request(target=target, years=(2027, 2029)))).table()
    for name in ("temperature", "column", "relative_brightness", "snr_one_night", "nights_needed"):
        np.testing.assert_array_equal(table[f"{name}_low"], table[f"{name}_high"])
        np.testing.assert_allclose(table[name], table[f"{name}_low"], rtol=1e-6)
    assert np.all(table["probability_error"] < 1e-12)


def test_each_year_is_what_hours_says_of_that_night_and_state(uranus):
    # on another grid of instants moments fall into other groups of velocity: 2e-5
    asked, table = request(), uranus.table()
    for i, date in enumerate(table["date"]):
        one = in_state(night_of(asked, str(date)), table["temperature"][i], table["column"][i])
        assert table["snr_one_night"][i] == pytest.approx(float(hours(one)["snr"].max()), rel=1e-4)


def test_brightness_goes_as_the_totals_of_glow(uranus):
    table, target = uranus.table(), load_target("uranus")
    total = [
        glow(target, temperature=float(t), column_density=float(n)).header["total_radiance"].value
        for t, n in zip(table["temperature"], table["column"], strict=True)
    ]
    np.testing.assert_allclose(table["relative_brightness"], np.array(total) / total[0], rtol=1e-12)


def test_tabulated_brightness():
    kelvin = np.linspace(150.0, 1500.0, 700)
    np.testing.assert_allclose(tabulated_glow(kelvin), glow_of(kelvin), rtol=1e-6)


def test_the_coldest_temperature_gives_the_goal_when_put_back(uranus):
    asked, header = request(), uranus.header
    kelvin = header["coldest_one_night"].value
    column_m2 = float(uranus["column"][0])
    cold = in_state(asked, kelvin, column_m2)
    night = hours(night_of(cold, header["night"].value))
    assert night["snr"].max() == pytest.approx(asked.fade.significance, rel=1e-9)
    seen = expose(cold, at=header["moment"].value, clock=3600.0 * header["clock_time"].value)
    assert seen.header["snr"].value == pytest.approx(asked.fade.significance, rel=1e-9)


def test_the_budget_reaches_the_goal_at_its_coldest_temperature(uranus):
    asked, found = request(), fading(request(), request().uses[0])
    night, count = found.night[0], found.budget.nights
    information = night.information(uranus.header["coldest_budget"].value, float(uranus["column"][0]))
    floor = asked.uses[0].instrument.operation.visit_floor
    common = asked.uses[0].instrument.operation.common_floor
    assert count == 7  # of fourteen nights, 70 % clear
    snr = ((1 / information + floor**2) / count + common**2) ** -0.5
    assert snr == pytest.approx(asked.fade.significance, rel=1e-9)


@pytest.mark.parametrize(("name", "years"), [("uranus-season", (2027, 2043)), ("neptune-deep", (2028, 2044))])
def test_other_years_by_the_ratio_of_their_nights(name, years):
    # measured: within 0.07 % of the SNR where the temperatures of the year lie, 0.9 % far beyond them
    asked = request(name, years)
    found = fading(asked, asked.uses[0])
    rng = np.random.default_rng(4)
    for i in range(0, found.year.size, 4):
        kelvin = rng.uniform(found.trials.temperature_k.low[i], found.trials.temperature_k.high[i], 4)
        column_m2 = found.law.column_m2.median[i] * np.exp(0.4 * rng.standard_normal(4))
        exact = [found.night[i].information(t, n) for t, n in zip(kelvin, column_m2, strict=True)]
        close = night_information(found.grid, i, kelvin, column_m2)
        np.testing.assert_allclose(np.sqrt(close), np.sqrt(exact), rtol=1e-3)
        far = max(170.0, found.law.temperature_k.median[i] - 120.0)
        exact = found.night[i].information(far, float(column_m2[0]))
        assert night_information(found.grid, i, far, column_m2[0]) == pytest.approx(exact, rel=2e-2)


@pytest.mark.parametrize("instrument", ["echelle-8m", "longslit-4m"])
def test_every_tenth_night_is_enough_to_find_the_best(instrument):
    asked, record = request(), load_instrument(instrument)
    use = Use(record, record.settings[0])
    state = state_of(asked)
    wide = whole_year(asked)
    year = replace(wide, dates=replace(wide.dates, first="2028-01-01", last="2028-12-31"))
    season = visits(scenario(year, use, watch(year, use), state))
    best = np.bincount(season.night, season.matrix[:, 0, 0]).max()
    found = best_night(asked, use, 2028).information(state.temperature_k, state.column_m2)
    assert 0.97 < found / best < 1.01  # moments interpolated within a night and over a season differ a little


def test_the_same_seed_is_the_same_answer_and_another_is_not(uranus):
    again = fade(request())
    for name in ("temperature_low", "nights_needed_high", "probability_detectable"):
        np.testing.assert_array_equal(uranus[name], again[name])
    asked = request()
    other = fade(replace(asked, weather=replace(asked.weather, seed=5)))
    assert not np.array_equal(other["temperature_low"], uranus["temperature_low"])


def test_columns_and_map(uranus):
    table = uranus.table()
    wanted = ["date", "temperature", "column", "relative_brightness", "snr_one_night", "nights_needed"]
    names = [column.name for column in table.columns]
    assert set(wanted) | {"probability_detectable"} <= set(names)
    assert [str(date)[:4] for date in table["date"]] == ["2027", "2028", "2029", "2030"]
    chart = uranus.table("map")
    nights = chart["nights_needed"].reshape(len(np.unique(chart["temperature"])), -1)
    assert np.all(np.diff(nights, axis=1) <= 0)  # more ions never need more nights
    assert np.all(np.diff(nights, axis=0) <= 0)  # nor do warmer ones, below 1000 K


def test_years_override_and_order():
    assert len(fade(request(), years=(2031, 2032)).table()) == 2
    with pytest.raises(RangeError, match="2032 to 2031"):
        fade(request(), years=(2032, 2031))


def test_years_beyond_the_ephemeris_are_told_and_left_out():
    found = fade(request(years=(2052, 2055)))
    assert [int(year) for year in found["year"]] == [2052]
    said = [sentence for sentence in found.sentences if "No answer" in sentence]
    assert len(said) == 1
    assert said[0].startswith("No answer for 2053 to 2055: ")
    assert "2053-10-05" in said[0]
    with pytest.raises(DateError, match="2060"):
        fade(request(years=(2060, 2062)))


def test_a_law_that_ends_is_told_and_a_line_to_zero_refused():
    asked = request()
    cooling = replace(asked.target.cooling, floor_k=None, valid_until="2029-06-01")
    target = replace(asked.target, cooling=cooling)
    found = fade(replace(asked, target=target))
    assert [int(year) for year in found["year"]] == [2027, 2028]
    assert any("2029 to 2030" in each and "valid_until" in each for each in found.sentences)
    steep = replace(cooling, valid_until=None, rate_k_s=Estimate(2.0 * cooling.rate_k_s.value))
    late = fade(replace(asked, target=replace(target, cooling=steep)), years=(2039, 2044))
    assert list(late["year"])[:2] == [2039, 2040]  # 430 K less 16 K a year: 150 K in 2041
    assert 2042 not in late["year"]
    assert np.all(late["temperature"] >= 150.0)
    assert any("to 2044: " in each and "150 K" in each and "floor" in each for each in late.sentences)


def test_no_budget_is_one_clear_night_and_hours_are_nights(uranus):
    asked = request(years=(2027, 2027))
    none = fade(replace(asked, budget=Budget(None, None)))
    assert none.header["budget"].value == 1.0
    assert "states none" in str(none.header["budget"])
    space = fade(request("uranus-space", years=(2028, 2028)))
    assert space.header["budget"].value == pytest.approx(40.0 / 24.0)


def test_weather_that_gives_nothing_sure_is_said():
    asked = request(years=(2027, 2027))
    asked = replace(asked, budget=Budget(1.0, None), weather=replace(asked.weather, clear_fraction=0.5))
    found = fade(asked)
    assert "the weather gives none of them with 90 %" in str(found.header["budget"])
    assert found["probability_detectable"][0] == pytest.approx(0.5, abs=1e-9)


def test_a_target_that_never_rises_is_an_answer():
    asked = request(years=(2027, 2028))
    instrument = asked.uses[0].instrument
    shut = replace(instrument, limits=replace(instrument.limits, altitude_min_rad=1.55))
    found = fade(replace(asked, uses=(Use(shut, shut.settings[0]),)))
    assert not found.feasible
    assert "never be observed" in found.sentences[0]
    assert np.all(np.isinf(found["nights_needed"]))


def test_a_detector_that_cannot_is_refused_with_its_reason():
    asked = request(years=(2027, 2028), target="jupiter")
    with pytest.raises(RangeError, match="Nods within the opening"):
        fade(asked)


@pytest.mark.parametrize(
    ("target", "instrument"),
    [
        ("jupiter", "narrowband-3m"),
        ("saturn", "narrowband-3m"),
        ("saturn", "longslit-4m"),
        ("neptune", "cold-space-ifu"),
    ],
)
def test_other_targets_and_kinds_of_instrument(target, instrument):
    record = load_instrument(instrument)
    asked = replace(request(target=target, years=(2027, 2028)), uses=(Use(record, record.settings[0]),))
    found = fade(asked)
    assert len(found.table()) == 2
    assert np.all(found["snr_one_night"] > 0.0)


def test_an_instrument_that_the_request_does_not_name():
    with pytest.raises(NotFoundError, match="echelle-8m"):
        fade(request(), instrument="ifu-8m")


def test_a_brighter_trial_that_saturates_the_detector_does_not_end_the_outlook():
    asked = request()
    emission = replace(
        asked.target.emission, temperature_k=Estimate(850.0, 30.0), column_m2=Estimate(1e18, 3e17)
    )
    bright = replace(asked, target=replace(asked.target, emission=emission))
    found = fade(bright)
    assert found.feasible
    assert np.all(found["nights_needed"] == 1)
