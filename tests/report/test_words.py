from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow.report import words


@pytest.mark.parametrize(
    ("value", "digits", "expected"),
    [
        (0.0, 3, "0"),
        (1.0, 3, "1.00"),
        (0.9996, 3, "1.00"),
        (99.96, 3, "100"),
        (1234.5, 3, "1230"),
        (0.00123456, 3, "0.00123"),
        (0.000999999, 3, "1.00e-3"),
        (1.23456e15, 3, "1.23e15"),
        (-2.5e-9, 2, "-2.5e-9"),
        (math.inf, 3, "∞"),
        (math.nan, 3, "–"),
    ],
)
def test_plain_numbers(value, digits, expected):
    assert words.plain(value, digits) == expected


def test_numbers_in_text_have_true_signs_and_raised_powers():
    assert words.number(1.23456e15) == "1.23×10¹⁵"
    assert words.number(-2.5e-9, 2) == "−2.5×10⁻⁹"
    assert words.number(math.inf, infinite="never") == "never"
    assert words.number(-math.inf) == "−∞"
    assert words.short(5.0) == "5"
    assert words.short(0.80) == "0.8"
    assert words.short(100.0) == "100"


@given(st.floats(1e-300, 1e300), st.integers(1, 8))
def test_a_printed_number_is_the_value_rounded_to_its_digits(value, digits):
    printed = float(words.plain(value, digits))
    assert (
        abs(printed - value)
        <= 0.51 * 10.0 ** (math.floor(math.log10(value)) - digits + 2) / 10 + 1e-15 * value
    )


@pytest.mark.parametrize(
    ("value", "error", "unit", "expected"),
    [
        (480.0, 12.3, "K", "480 ± 12 K"),
        (480.4, 7.3, "K", "480 ± 7 K"),
        (480.0, 0.96, "K", "480.00 ± 0.96 K"),
        (1.2345e15, 2.2e13, "m-2", "(1.234 ± 0.022)×10¹⁵ m⁻²"),
        (0.0034, 0.0004, "", "0.0034 ± 0.0004"),
        (-12.34, 0.5, "deg", "(−12.3 ± 0.5)°"),
        (3.3, 0.0, "h", "3.30 h"),
        (3.3, math.inf, "h", "3.30 h, not constrained"),
        (3.3, math.nan, "h", "3.30 h, error unknown"),
        (12.0, 340.0, "K", "0 ± 300 K"),
    ],
)
def test_value_and_error_end_at_the_same_place(value, error, unit, expected):
    assert words.with_error(value, error, unit) == expected


def test_the_larger_error_sets_the_place_of_all_three():
    assert words.with_errors(483.2, 2.1, 14.0, "K") == "483 ± 2 (random) ± 14 (systematic) K"
    assert words.with_errors(483.2, 0.01, 14.0, "K") == "483 ± 0.010 (random) ± 14 (systematic) K"
    assert words.with_errors(366.0, 340.0, 14.0, "K") == "400 ± 300 (random) ± 14 (systematic) K"
    assert words.with_errors(365.7, 97.0, 14.0, "K") == "366 ± 97 (random) ± 14 (systematic) K"
    assert words.with_errors(483.2, 0.0, 14.0, "K") == "483 ± 0 (random) ± 14 (systematic) K"
    assert words.with_errors(1.234e15, 2.2e13, 1e14, "m-2").startswith(
        "(1.23 ± 0.02 (random) ± 0.10 (systematic))"
    )


@pytest.mark.parametrize(
    ("seconds", "expected"),
    [
        (0.5, "0.50 s"),
        (45.2, "45 s"),
        (119.4, "119 s"),
        (119.7, "2 min"),
        (3599, "1 h"),
        (12000, "3 h 20 min"),
        (15.4 * 3600, "15 h 24 min"),
        (360000, "100 h"),
        (math.inf, "never"),
        (math.nan, "–"),
        (-60.0, "−60 s"),
    ],
)
def test_durations(seconds, expected):
    assert words.duration(seconds) == expected


@given(st.floats(1e-3, 1e7))
def test_a_duration_is_never_off_by_more_than_its_last_unit(seconds):
    scale = {"h": 3600, "min": 60, "s": 1}
    text = words.duration(seconds)
    parts = re.findall(r"([\d.]+) (h|min|s)", text)
    total = sum(float(amount) * scale[name] for amount, name in parts)
    last = scale[
        "h" if text.endswith("h") and seconds >= 100 * 3600 - 30 else "min" if seconds > 119 else "s"
    ]
    assert abs(total - seconds) <= 0.5 * last + 1e-6


@pytest.mark.parametrize(
    ("chance", "expected"),
    [
        (0.0, "0 %"),
        (1.0, "100 %"),
        (0.9999, "> 99.9 %"),
        (1e-5, "< 0.1 %"),
        (0.925, "92 %"),
        (0.987, "98.7 %"),
    ],
)
def test_probabilities_claim_no_certainty(chance, expected):
    assert words.probability(chance) == expected


def test_dates_and_counts():
    assert words.day("2027-11-05") == "5 Nov 2027"
    assert words.days("2027-11-05", "2027-11-05") == "5 Nov 2027"
    assert words.days("2027-11-05", "2027-11-28") == "5 to 28 Nov 2027"
    assert words.days("2027-11-05", "2027-12-02") == "5 Nov to 2 Dec 2027"
    assert words.days("2027-12-30", "2028-01-02") == "30 Dec 2027 to 2 Jan 2028"
    assert words.moment("2027-11-25T04:15:30.000") == "2027-11-25 04:15 UTC"
    assert words.count(1, "night") == "1 night"
    assert words.count(2.5, "night") == "2.5 nights"
    assert words.count(0, "visit") == "0 visits"
    assert words.listing(["a", "b", "c"]) == "a, b and c"
    assert words.listing(["a"]) == "a"
    assert words.listing([]) == ""


def test_units_as_people_write_them():
    assert words.unit("W m-2 sr-1") == "W m⁻² sr⁻¹"
    assert words.unit("arcsec / h") == "″ /h"
    assert words.unit("electron2 s-1") == "(e⁻)² s⁻¹"  # not "e to the minus two"
    assert words.quantity(12.34, "deg") == "12.3°"
    assert words.quantity(3.4, "um", 2) == "3.4 µm"
    assert words.quantity(3.4, "", 2) == "3.4"
