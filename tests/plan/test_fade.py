import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import binom

from coldglow.errors import RangeError
from coldglow.light.emission import photon_radiance_s_m2_sr
from coldglow.light.lines import load_lines
from coldglow.plan.fade import (
    InformationGrid,
    Rules,
    grid_axes,
    night_information,
    nights_for,
    nights_map,
    outlook,
    snr_of,
    spread,
)
from coldglow.plan.limits import coldest_temperature

YEARS = np.arange(2027, 2037)
LINES = load_lines().within(3.9e-6, 4.1e-6)


def information_of(kelvin, column, background, gain=1.0):
    """Matched filter over the lines of the list: signal^2 over signal and background."""
    signal = gain * 1e-9 * photon_radiance_s_m2_sr(LINES, kelvin, column)
    return (signal**2 / (signal + background)).sum(axis=-1)


def grid_over(kelvin, column, gains=None, background=10.0):
    gains = np.ones(YEARS.size) if gains is None else gains
    t, n = grid_axes(kelvin, column)
    return InformationGrid(
        t, n, np.stack([information_of(t[:, None], n[None, :], background, gain) for gain in gains])
    )


@pytest.mark.parametrize(
    ("coldest", "hottest", "least", "most", "error"),
    [(150, 1500, 1e13, 1e17, 2e-3), (300, 700, 3e14, 3e15, 1e-5)],
)
@pytest.mark.parametrize("background", [1e-3, 1.0, 1e2, 1e4])
def test_interpolation_is_as_good_as_stated(coldest, hottest, least, most, error, background):
    rng = np.random.default_rng(11)
    kelvin = rng.uniform(coldest, hottest, 500)
    column = np.exp(rng.uniform(np.log(least), np.log(most), 500))
    grid = grid_over(kelvin, column, np.ones(1), background)
    found = night_information(grid, 0, kelvin, column)
    np.testing.assert_allclose(found, information_of(kelvin, column, background), rtol=error)


def test_states_outside_the_grid_are_refused():
    grid = grid_over(np.array([400.0, 600.0]), np.array([1e15]))
    with pytest.raises(RangeError, match="temperature of 350 K lies outside"):
        night_information(grid, 0, 350.0, 1e15)
    with pytest.raises(RangeError, match=r"column of 1e\+16 m-2 lies outside"):
        night_information(grid, 0, 500.0, 1e16)


def test_one_certain_planet_is_the_deterministic_answer():
    kelvin = np.linspace(600.0, 320.0, YEARS.size)
    column = np.full(YEARS.size, 1e15)
    gains = np.linspace(1e-2, 2e-2, YEARS.size)
    grid = grid_over(kelvin, column, gains)
    rules = Rules(snr=5.0, budget_nights=4, visit_floor=0.02, common_floor=0.01)
    light = photon_radiance_s_m2_sr(LINES, kelvin, column).sum(axis=1)
    answer = outlook(YEARS, grid, kelvin[None], column[None], light[None], rules)
    for i in range(YEARS.size):  # by hand, from the definition of the floors
        information = information_of(kelvin[i], column[i], 10.0, gains[i])
        exact = (1 / information + 0.02**2) / (1 / 25.0 - 0.01**2)
        assert answer.nights_needed.median[i] == np.ceil(exact)
        expected = 1 / np.sqrt(1 / information + 0.02**2 + 0.01**2)
        assert answer.snr_one_night.median[i] == pytest.approx(expected, rel=1e-5)
    np.testing.assert_allclose(answer.relative_brightness.median, light / light[0])
    assert set(answer.probability_detectable) == {0.0, 1.0}
    lost = YEARS[answer.nights_needed.median > 4]
    assert answer.dropout_year.median == lost[0]
    for each in (answer.temperature_k, answer.nights_needed, answer.dropout_year, answer.snr_one_night):
        np.testing.assert_array_equal(each.low, each.median)
        np.testing.assert_array_equal(each.high, each.median)


def test_a_planet_that_stays_never_drops_out():
    kelvin, column = np.full((1, YEARS.size), 600.0), np.full((1, YEARS.size), 1e15)
    grid = grid_over(kelvin, column, np.full(YEARS.size, 1e4))
    answer = outlook(YEARS, grid, kelvin, column, column, Rules(snr=5.0, budget_nights=1))
    assert answer.dropout_year.median == np.inf
    assert answer.dropout_probability == 0.0


def test_a_year_without_a_night_needs_infinitely_many():
    kelvin, column = np.full((3, YEARS.size), 600.0), np.full((3, YEARS.size), 1e15)
    gains = np.full(YEARS.size, 1e4)
    gains[4] = 0.0
    answer = outlook(
        YEARS, grid_over(kelvin, column, gains), kelvin, column, column, Rules(snr=5.0, budget_nights=1)
    )
    assert answer.nights_needed.median[4] == np.inf
    assert answer.snr_one_night.median[4] == 0.0
    assert answer.dropout_year.median == YEARS[4]


def test_probability_is_the_share_of_the_planets():
    # information exactly proportional to N in a grid of its own: detectable in one night if N >= 1e15
    rng = np.random.default_rng(5)
    column = 1e15 * np.exp(0.4 * rng.standard_normal((4000, 1)))
    kelvin = np.full_like(column, 500.0)
    t, n = grid_axes(kelvin, column)
    grid = InformationGrid(t, n, np.broadcast_to(25.0 * n / 1e15, (1, t.size, n.size)))
    answer = outlook([2030], grid, kelvin, column, column, Rules(snr=5.0, budget_nights=1))
    assert answer.probability_detectable[0] == pytest.approx((column >= 1e15).mean(), abs=1e-3)
    assert answer.probability_detectable[0] == pytest.approx(0.5, abs=4 * answer.probability_error[0])
    assert answer.probability_error[0] == pytest.approx(0.5 / np.sqrt(4000), rel=0.01)


def test_clear_nights_thin_the_budget():
    # two nights needed, three asked for, each clear with 0.6: binomial chance of two or more
    grid = InformationGrid(
        np.array([400.0, 500.0, 600.0]), np.array([1e14, 1e15, 1e16]), np.full((1, 3, 3), 13.0)
    )
    rules = Rules(snr=5.0, budget_nights=3, clear_nights=binom.pmf(np.arange(4), 3, 0.6))
    state = np.array([[500.0]]), np.array([[1e15]]), np.array([[1.0]])
    assert outlook([2030], grid, *state, rules).probability_detectable[0] == pytest.approx(
        binom.sf(1, 3, 0.6)
    )
    nothing = InformationGrid(grid.temperature_k, grid.column_m2, np.zeros((1, 3, 3)))
    assert outlook([2030], nothing, *state, rules).probability_detectable[0] == 0.0


def test_brightness_is_relative_to_the_same_planet():
    light = np.array([[2.0, 1.0], [8.0, 2.0], [4.0, 1.0]])
    kelvin, column = np.full((3, 2), 500.0), np.full((3, 2), 1e15)
    grid = grid_over(kelvin, column, np.ones(2))
    own = outlook([1, 2], grid, kelvin, column, light, Rules(5.0, 1)).relative_brightness
    np.testing.assert_allclose(own.median, [1.0, 0.25])


def test_interval_holds_two_thirds_of_a_normal():
    values = np.random.default_rng(8).standard_normal((40_000, 1))
    answer = spread(values)
    found = [answer.low[0], answer.median[0], answer.high[0]]
    np.testing.assert_allclose(found, [-1.0, 0.0, 1.0], atol=0.03)
    assert spread(np.array([1.0, np.inf, np.inf])).median == np.inf


@settings(deadline=None)
@given(st.floats(1e-6, 1e6), st.floats(0.5, 50), st.floats(0, 0.1), st.floats(0, 0.1))
def test_the_nights_needed_reach_the_goal_and_one_less_does_not(information, goal, visit_floor, common_floor):
    rules = Rules(goal, 1, visit_floor, common_floor)
    nights = float(nights_for(information, rules))
    if np.isinf(nights):
        assert goal * common_floor >= 1.0 - 1e-9
        return
    assert snr_of(information, rules, nights) >= goal * (1 - 1e-9)
    if nights > 1:
        assert snr_of(information, rules, nights - 1) < goal


@settings(deadline=None)
@given(st.floats(1e-3, 1e3), st.integers(1, 50))
def test_equal_nights_grow_as_the_square_root(information, nights):
    rules = Rules(5.0, 1)
    assert snr_of(information, rules, nights) == pytest.approx(np.sqrt(nights) * snr_of(information, rules))


@settings(max_examples=20, deadline=None)
@given(st.integers(0, 2**31))
def test_order_of_the_planets_does_not_matter(seed):
    rng = np.random.default_rng(seed)
    kelvin, column = rng.uniform(400, 700, (30, 10)), np.exp(rng.uniform(33, 36, (30, 10)))
    grid = grid_over(kelvin, column, np.full(10, 1e-2))
    mixed = rng.permutation(30)
    rules = Rules(5.0, 2)
    one = outlook(YEARS, grid, kelvin, column, kelvin, rules)
    other = outlook(YEARS, grid, kelvin[mixed], column[mixed], kelvin[mixed], rules)
    np.testing.assert_array_equal(one.nights_needed.median, other.nights_needed.median)
    np.testing.assert_array_equal(one.dropout_year.high, other.dropout_year.high)
    np.testing.assert_allclose(one.probability_detectable, other.probability_detectable)


def test_the_map_agrees_with_single_states_and_grows_toward_cold_and_thin():
    kelvin, column = np.linspace(350.0, 700.0, 8), np.geomspace(1e14, 1e16, 5)
    grid = grid_over(kelvin, column, np.array([1.0, 1e-2]))
    rules = Rules(5.0, 3)
    nights = nights_map(grid, 1, kelvin, column, rules)
    assert nights.shape == (8, 5)
    assert nights[2, 3] == nights_for(night_information(grid, 1, kelvin[2], column[3]), rules)
    assert np.all(np.diff(nights, axis=0) <= 0)
    assert np.all(np.diff(nights, axis=1) <= 0)


def test_the_coldest_temperature_of_a_year_costs_exactly_the_budget():
    column = 1e15
    grid = grid_over(np.array([250.0, 900.0]), np.array([column]), np.array([1e-2]))
    rules = Rules(5.0, 3, visit_floor=0.05)
    edge = coldest_temperature(
        lambda kelvin: snr_of(night_information(grid, 0, kelvin, column), rules, 3), 5.0, 250.0, 900.0
    )
    assert edge.kind == "found"
    assert nights_for(night_information(grid, 0, edge.value, column), rules) == 3
    assert nights_for(night_information(grid, 0, edge.value - 0.01, column), rules) == 4


def test_in_space_the_time_is_used_by_the_hour():
    rules = Rules(5.0, 1.67, whole=False)
    np.testing.assert_allclose(nights_for(np.array([10.0, 50.0, 0.0]), rules), [2.5, 0.5, np.inf])
    assert nights_for(np.array([10.0, 50.0]), Rules(5.0, 1.67)).tolist() == [3.0, 1.0]
