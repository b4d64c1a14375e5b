import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from coldglow.plan.goal import demanded_information, without_floor
from coldglow.plan.limits import coldest_temperature, smallest_column

C2_E_K = 1.4388 * 2500.0  # c2 times an upper level of 2500 cm-1


def signal(kelvin):
    """A line with a partition function that takes over near 1000 K."""
    return 1e4 * np.exp(-C2_E_K / kelvin) / kelvin**3.6


def snr_of_temperature(time_s):
    return lambda kelvin: (
        1e10 * signal(kelvin) * time_s / np.sqrt(1e10 * signal(kelvin) * time_s + 50.0 * time_s)
    )


def snr_of_column(background):
    return lambda column: 1e-13 * column / np.sqrt(1e-13 * column + background)


@settings(deadline=None)
@given(st.floats(100, 1e6), st.floats(1, 50))
def test_the_coldest_temperature_put_back_gives_the_goal(time_s, goal):
    measure = snr_of_temperature(time_s)
    edge = coldest_temperature(measure, goal)
    if edge.kind == "found":
        assert measure(np.array([edge.value]))[0] == pytest.approx(goal, rel=1e-11)
        colder = np.linspace(150.0, edge.value * 0.999, 200)
        assert np.all(measure(colder) < goal)
    else:
        assert (edge.kind == "below") == (measure(np.array([150.0]))[0] >= goal)


@settings(deadline=None)
@given(st.floats(0.0, 1e6), st.floats(1, 50))
def test_the_smallest_column_put_back_gives_the_goal(background, goal):
    measure = snr_of_column(background)
    edge = smallest_column(measure, goal)
    assert edge.kind == "found"
    assert measure(np.array([edge.value]))[0] == pytest.approx(goal, rel=1e-11)


def test_column_in_closed_form_when_the_noise_is_photons_and_background():
    # S / sqrt(S + B) = g  <=>  S = g^2/2 (1 + sqrt(1 + 4 B / g^2)), the positive root of S^2 = g^2 (S + B)
    for background in (0.0, 3.0, 1e5):
        expected = 0.5 * 25.0 * (1.0 + np.sqrt(1.0 + 4.0 * background / 25.0)) / 1e-13
        assert smallest_column(snr_of_column(background), 5.0).value == pytest.approx(expected, rel=1e-10)


def test_column_is_linear_only_in_the_background_limit():
    deep, bright = snr_of_column(1e10), snr_of_column(0.0)
    ratio = [smallest_column(m, 10.0).value / smallest_column(m, 5.0).value for m in (deep, bright)]
    assert ratio == pytest.approx([2.0, 4.0], rel=1e-3)


def test_nothing_detectable_is_an_answer():
    edge = coldest_temperature(snr_of_temperature(1e-6), 5.0)
    assert edge.kind == "none"
    assert np.isnan(edge.value)
    assert (edge.low, edge.high) == (150.0, 1500.0)


def test_everything_detectable_is_an_answer():
    edge = coldest_temperature(lambda kelvin: np.full(kelvin.shape, 9.0), 5.0)
    assert (edge.kind, edge.value) == ("below", 150.0)


def test_the_far_side_of_the_maximum_does_not_confuse():
    # falls again above 1000 K: reached between, not at the hot end
    edge = coldest_temperature(lambda kelvin: 10.0 - ((kelvin - 900.0) / 100.0) ** 2, 6.0)
    assert edge.value == pytest.approx(700.0, rel=1e-9)


def test_longer_times_reach_colder():
    rate = snr_of_temperature(1.0)
    edges = [
        coldest_temperature(lambda kelvin: rate(kelvin) ** 2, 25.0 / t).value for t in (1e2, 1e3, 1e4, 1e5)
    ]
    assert edges == sorted(edges, reverse=True)
    for time_s, value in zip((1e2, 1e3, 1e4, 1e5), edges, strict=True):
        assert snr_of_temperature(time_s)(np.array([value]))[0] == pytest.approx(5.0, rel=1e-9)


def test_a_floor_above_the_goal_leaves_nothing_however_bright():
    needed = float(without_floor(demanded_information(5.0), 0.25))  # SNR of at most 4 per visit
    assert smallest_column(snr_of_column(1.0), needed).kind == "none"
