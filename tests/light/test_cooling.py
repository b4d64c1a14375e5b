import dataclasses
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from coldglow.describe.records import Cooling, Emission, Estimate
from coldglow.errors import RangeError
from coldglow.light.cooling import emission_at, sample_states, seconds_since, state_at
from coldglow.light.emission import line_radiance_w_m2_sr
from coldglow.light.lines import load_lines

YEAR_S = 365.25 * 86400.0
NONE = Estimate(0.0)


def emission(kelvin=600.0, column=1e15, kelvin_error=0.0, column_error=0.0):
    return Emission(
        temperature_k=Estimate(kelvin, kelvin_error),
        column_m2=Estimate(column, column_error),
        given_as="vertical",
        lte_fraction=Estimate(1.0),
        spots=(),
        source="invented",
    )


CONSTANT = Cooling("constant", "2020-01-01", NONE, None, None, NONE, (), (), (), None, "invented")
LINEAR = dataclasses.replace(CONSTANT, law="linear", rate_k_s=Estimate(-8.0 / YEAR_S))
EXPONENTIAL = dataclasses.replace(
    CONSTANT, law="exponential", floor_k=Estimate(300.0), time_scale_s=Estimate(10.0 * YEAR_S)
)
TABLE = dataclasses.replace(
    CONSTANT,
    law="table",
    table_dates=("2020-01-01", "2030-01-01", "2040-01-01"),
    table_temperature_k=(600.0, 500.0, 480.0),
    table_column_m2=(1e15, 1e14, 1e14),
)


def test_seconds_between_dates_count_leap_days():
    # 1461 days from 2020-01-01 to 2024-01-01 in the Gregorian calendar
    assert seconds_since("2020-01-01", ["2020-01-01", "2024-01-01"]).tolist() == [0.0, 1461 * 86400.0]


def test_constant_law_changes_nothing():
    kelvin, column = state_at(emission(), CONSTANT, ["2020-01-01", "2050-06-01"])
    assert kelvin.tolist() == [600.0, 600.0]
    assert column.tolist() == [1e15, 1e15]


def test_published_straight_line_of_uranus():
    # 715 K in 1992, falling 8 K per year: ApJ 729, 134 (2011), abstract; ten Julian years are ten rates
    kelvin, _ = state_at(emission(715.0), dataclasses.replace(LINEAR, epoch="1992-01-01"), "2002-01-01")
    assert kelvin[0] == pytest.approx(715.0 - 80.0, abs=0.03)


def test_exponential_after_one_time_scale():
    late = "2030-01-01"  # 3653 days: 0.5 day more than ten Julian years
    kelvin, _ = state_at(emission(), EXPONENTIAL, late)
    assert kelvin[0] == pytest.approx(300.0 + 300.0 / np.e, abs=0.02)


def test_column_rate_is_a_fraction_per_time():
    losing = dataclasses.replace(CONSTANT, column_rate_s=Estimate(-0.1 / YEAR_S))
    _, column = state_at(emission(), losing, "2030-01-01")
    assert column[0] == pytest.approx(1e15 * np.exp(-1.0), rel=2e-4)


def test_table_is_met_at_its_dates_and_straight_between():
    kelvin, column = state_at(emission(), TABLE, [*TABLE.table_dates, "2035-01-01"])
    assert kelvin[:3].tolist() == [600.0, 500.0, 480.0]
    np.testing.assert_allclose(column[:3], [1e15, 1e14, 1e14])
    assert kelvin[3] == pytest.approx(490.0, abs=0.01)
    assert state_at(emission(), TABLE, "2025-01-01")[1][0] == pytest.approx(10**14.5, rel=1e-3)


@pytest.mark.parametrize("date", ["2019-12-31", "2040-01-02"])
def test_table_is_not_extended(date):
    with pytest.raises(RangeError, match=rf"nothing about {date}.*2020-01-01 to 2040-01-01") as caught:
        state_at(emission(), TABLE, date)
    assert caught.value.key == "cooling.table"


@pytest.mark.parametrize("law", [CONSTANT, LINEAR, EXPONENTIAL])
def test_validity_ends(law):
    law = dataclasses.replace(law, valid_until="2035-06-01")
    assert state_at(emission(), law, "2035-06-01")[0].size == 1
    with pytest.raises(RangeError, match=r"until 2035-06-01, and 2035-06-02 is later") as caught:
        state_at(emission(), law, ["2030-01-01", "2035-06-02"])
    assert caught.value.key == "cooling.valid_until"


def test_straight_line_to_zero_is_refused_with_the_temperature_and_the_way_out():
    with pytest.raises(RangeError, match=r"120 K on 2080-01-01.*give a floor") as caught:
        state_at(emission(), LINEAR, ["2030-01-01", "2080-01-01"])
    assert caught.value.key == "cooling.rate"


def test_floor_stops_a_straight_line_instead_of_refusing():
    floored = dataclasses.replace(LINEAR, floor_k=Estimate(400.0), valid_until="2030-01-01")
    assert state_at(emission(), floored, ["2030-01-01", "2100-01-01"])[0] == pytest.approx(
        [519.98, 400.0], abs=0.01
    )


def test_a_wrong_date_is_named():
    with pytest.raises(RangeError, match=re.escape("'2030-13-01'")):
        state_at(emission(), CONSTANT, "2030-13-01")


@pytest.mark.parametrize("law", [CONSTANT, LINEAR, EXPONENTIAL, TABLE], ids=lambda law: law.law)
def test_no_uncertainty_is_the_deterministic_answer(law):
    dates = ["2021-01-01", "2030-07-01", "2039-12-01"]
    states = sample_states(emission(), law, dates, 5, np.random.default_rng(1))
    for sampled, exact in zip(states, state_at(emission(), law, dates), strict=True):
        assert sampled.shape == (5, 3)
        np.testing.assert_array_equal(sampled, np.broadcast_to(exact, (5, 3)))


def test_a_straight_line_spreads_as_independent_errors_add():
    law = dataclasses.replace(LINEAR, rate_k_s=Estimate(-8.0 / YEAR_S, 1.5 / YEAR_S))
    kelvin, _ = sample_states(
        emission(kelvin_error=10.0), law, ["2020-01-01", "2030-01-01"], 20_000, np.random.default_rng(7)
    )
    expected = np.array([10.0, np.hypot(10.0, 15.0)])  # sigma^2 = sigma_T^2 + (t sigma_rate)^2
    np.testing.assert_allclose(kelvin.std(axis=0), expected, rtol=4 / np.sqrt(2 * 20_000))
    np.testing.assert_allclose(kelvin.mean(axis=0), [600.0, 520.0], atol=4 * expected.max() / np.sqrt(20_000))


def test_column_spreads_in_its_logarithm_and_trials_keep_their_planet():
    _, column = sample_states(
        emission(column_error=3e14), CONSTANT, ["2021-01-01", "2031-01-01"], 20_000, np.random.default_rng(3)
    )
    np.testing.assert_array_equal(column[:, 0], column[:, 1])
    assert np.log(column[:, 0]).std() == pytest.approx(0.3, rel=4 / np.sqrt(2 * 20_000))
    assert np.median(column[:, 0]) == pytest.approx(1e15, rel=4 * 1.2533 * 0.3 / np.sqrt(20_000))


def test_exponential_spread_by_error_propagation():
    law = dataclasses.replace(
        EXPONENTIAL, floor_k=Estimate(300.0, 10.0), time_scale_s=Estimate(10 * YEAR_S, 0.5 * YEAR_S)
    )
    kelvin, _ = sample_states(emission(kelvin_error=5.0), law, "2030-01-01", 20_000, np.random.default_rng(5))
    share = np.exp(-1.0)  # dT/dT0 = share, dT/dfloor = 1 - share, dT/dln(tau) = 300 share t/tau
    expected = np.sqrt((5 * share) ** 2 + (10 * (1 - share)) ** 2 + (300 * share * 0.05) ** 2)
    assert kelvin.std() == pytest.approx(expected, rel=0.03)


def test_the_share_in_equilibrium_is_uncertain_together_with_the_column():
    doubtful = dataclasses.replace(emission(column_error=3e14), lte_fraction=Estimate(0.5, 0.2))
    _, column = sample_states(doubtful, CONSTANT, "2021-01-01", 20_000, np.random.default_rng(9))
    assert np.log(column).std() == pytest.approx(np.hypot(0.3, 0.4), rel=4 / np.sqrt(2 * 20_000))


def test_trials_stay_within_the_line_list():
    law = dataclasses.replace(LINEAR, rate_k_s=Estimate(-8.0 / YEAR_S, 4.0 / YEAR_S))
    kelvin, _ = sample_states(emission(), law, "2070-01-01", 1000, np.random.default_rng(2))
    assert kelvin.min() == 150.0
    assert kelvin.max() > 200.0


def test_one_uncertainty_does_not_reshuffle_the_others():
    args = (LINEAR, "2030-01-01", 50)
    _, both = sample_states(emission(kelvin_error=9.0, column_error=1e14), *args, np.random.default_rng(4))
    _, one = sample_states(emission(column_error=1e14), *args, np.random.default_rng(4))
    np.testing.assert_array_equal(both, one)


@settings(deadline=None)
@given(st.floats(200, 1400), st.floats(-3, 3), st.integers(1, 20))
def test_a_date_alone_is_the_date_in_a_list(kelvin, rate_k_yr, years):
    law = dataclasses.replace(LINEAR, rate_k_s=Estimate(rate_k_yr / YEAR_S), floor_k=Estimate(180.0))
    dates = [f"{2020 + n}-03-01" for n in range(years)]
    together, _ = state_at(emission(kelvin), law, dates)
    alone = [state_at(emission(kelvin), law, date)[0][0] for date in dates]
    np.testing.assert_array_equal(together, alone)


def test_two_decades_of_cooling_leave_a_twentieth_of_the_light():
    # 3-4 micron light at constant column from 740 K to 480 K: some 5 % (common practice)
    law = dataclasses.replace(LINEAR, epoch="2000-01-01", rate_k_s=Estimate(-13.0 / YEAR_S))
    kelvin, column = state_at(emission(740.0), law, ["2000-01-01", "2020-01-01"])
    lines = load_lines().within(3e-6, 4e-6)
    light = line_radiance_w_m2_sr(lines, kelvin, column).sum(axis=1)
    assert 0.03 < light[1] / light[0] < 0.08


@pytest.mark.parametrize("law", [CONSTANT, LINEAR, EXPONENTIAL, TABLE], ids=lambda law: law.law)
def test_the_emission_of_a_later_date_has_the_spread_of_the_sampled_planets(law):
    # errors small enough to be carried on linearly; 20 000 trials know a standard deviation to 0.5 %
    unsure = dataclasses.replace(
        law,
        rate_k_s=Estimate(law.rate_k_s.value, 0.5 / YEAR_S if law.law == "linear" else 0.0),
        floor_k=None if law.floor_k is None else Estimate(law.floor_k.value, 10.0),
        time_scale_s=None if law.time_scale_s is None else Estimate(law.time_scale_s.value, 0.2 * YEAR_S),
    )
    start, date = emission(600.0, 1e15, 8.0, 2e13), "2028-07-01"
    later = emission_at(start, unsure, date)
    kelvin, column = state_at(start, unsure, date)
    assert later.temperature_k.value == kelvin[0]
    assert later.column_m2.value == column[0]
    trial_k, trial_m2 = sample_states(start, unsure, date, 20_000, np.random.default_rng(3))
    assert later.temperature_k.uncertainty == pytest.approx(trial_k.std(), rel=0.02)
    assert later.column_m2.uncertainty == pytest.approx(trial_m2.std(), rel=0.02)
