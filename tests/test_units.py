"""Quantities as people write them: into SI and back, and what is said when they are wrong."""

import math
import subprocess
import sys

import astropy.units as u
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow import units
from coldglow.errors import UnitError


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("8.2 m", "length", 8.2),
        ("8.2m", "length", 8.2),
        ("820 cm", "length", 8.2),
        ("500K", "temperature", 500),
        ("0 degC", "temperature", 273.15),
        ("-10°C", "temperature", 263.15),
        ("3.4um", "wavelength", 3.4e-6),
        ("3.4 µm", "wavelength", 3.4e-6),
        ("3.4 microns", "wavelength", 3.4e-6),
        ("3400 nm", "wavelength", 3.4e-6),
        ("2e15 m-2", "column", 2e15),
        ("2e15 m^-2", "column", 2e15),
        ("2e15 m**-2", "column", 2e15),
        ("2e15 /m2", "column", 2e15),
        ("2e11 cm⁻²", "column", 2e15),
        ("10 km/s", "velocity", 1e4),
        ("10 km s-1", "velocity", 1e4),
        ("-70.4deg", "angle", math.radians(-70.4)),
        ("-30:14:16", "angle", math.radians(-(30 + 14 / 60 + 16 / 3600))),
        ("-0:30", "angle", math.radians(-0.5)),
        ("0.5 arcsec", "small angle", math.radians(0.5 / 3600)),
        ("500 mas", "small angle", math.radians(0.5 / 3600)),
        ("70 %", "fraction", 0.7),
        ("0.7", "fraction", 0.7),
        ("60 000", "number", 60000),
        ("60_000", "number", 60000),
        (".5", "number", 0.5),
        ("+5.", "number", 5),
        ("12 e-", "charge", 12),
        ("12e-", "charge", 12),
        ("1e4 e-", "charge", 1e4),
        ("0.1 e-/s", "current", 0.1),
        ("0.1 e-/s/pixel", "current", 0.1),
        ("2 h", "time", 7200),
        ("2 min", "minutes", 2),
        ("2 h", "minutes", 120),
        ("90 min", "budget hours", 1.5),
        ("-8 K/yr", "temperature rate", -8 / 31557600),
        ("1 %/yr", "fraction rate", 0.01 / 31557600),
        ("1 ph s-1 m-2 arcsec-2 um-1", "airglow", 1e6 * (180 * 3600 / math.pi) ** 2),
        ("1 W/m2/sr/um", "spectral radiance", 1e6),
        ("3 W m-2 sr-1", "radiance", 3),
        ("-501.1600928 deg/day", "angle rate", math.radians(-501.1600928) / 86400),
        ("1 deg/century", "slow angle rate", math.radians(1)),
        ("2 mm", "water", 0.002),
    ],
)
def test_what_people_write(text, kind, value):
    assert units.parse_quantity(text, kind) == pytest.approx(value, rel=4e-16)


@pytest.mark.parametrize(
    ("text", "kind", "message"),
    [
        ("8.2", "length", "`8.2` has no unit; write a unit, e.g. `8.2 m`"),
        ("1e5", "column", "`1e5` has no unit; write a unit, e.g. `1e5 m-2`"),
        ("8.2 s", "length", "`8.2 s` is not a length; write e.g. `8.2 m`"),
        ("8.2 deg", "number", "`8.2 deg` is not a plain number"),
        ("5 s", "angle", "`5 s` is not an angle; write e.g. `30 deg`"),
        ("5 parsnips", "length", "has the unknown unit `parsnips`"),
        ("5 m^", "length", "has the unknown unit `m^`"),
        ("5 m:s", "length", "has the unknown unit `m:s`"),
        ("5 m999", "length", "has the unknown unit `m999`"),
        ("5 century-99", "time", "is not a time"),
        ("5 arcsec-99", "number", "has an absurd unit"),
        ("", "length", "`` is not a number"),
        ("m", "length", "`m` is not a number"),
        ("e15 m-2", "column", "`e15 m-2` is not a number"),
        (".e3 m", "length", "`.e3 m` is not a number"),
        ("nan m", "length", "`nan m` is not a number"),
        ("inf", "number", "`inf` is not a number"),
        ("1,5 m", "length", "write a decimal point, e.g. `8.2 m`"),
        ("1e999 m", "length", "`1e999 m` is too large a number"),
        ("1e-999999999 m", "length", "too large or too small a number"),
        ("1e999999 m", "length", "too large or too small a number"),
        ("5 degC", "temperature difference", "has the unknown unit `degC`"),
        ("30:61:00", "angle", "whole numbers below 60"),
        ("x" * 500, "length", "xxx...` is not a number"),
    ],
)
def test_what_is_wrong_and_how_it_is_written(text, kind, message):
    with pytest.raises(UnitError) as raised:
        units.parse_quantity(text, kind)
    assert message in str(raised.value)
    assert len(str(raised.value)) < 250


def test_a_bare_number_means_the_unit_that_the_help_names():
    assert units.parse_quantity("3.4", "wavelength", "um") == 3.4e-6
    assert units.parse_quantity("3400 nm", "wavelength", "um") == 3.4e-6


@pytest.mark.parametrize("kind", sorted(units.KINDS))
def test_every_kind_reads_its_own_example(kind):
    for example in units.KINDS[kind].example.split("` or `"):
        assert math.isfinite(units.parse_quantity(example, kind))


# The factors, against the large library that the program does not load for them.
NAMES = {"e-": u.electron, "ph": u.photon, "%": u.percent, "century": 100 * u.yr}


@pytest.mark.parametrize("kind", sorted(units.KINDS))
def test_factors_are_those_of_astropy(kind):
    def theirs(text):
        product = u.dimensionless_unscaled
        for token in text.split():
            name = token.rstrip("-0123456789") or token
            power = token[len(name) :]
            if token.startswith("e-"):
                name, power = "e-", token[2:]
            product *= u.Unit(NAMES.get(name, name)) ** int(power or 1)
        return product

    shown, kept = units.KINDS[kind].shown, units.KINDS[kind].si
    expected = theirs(shown).to(theirs(kept)) if shown else 1
    assert units.parse_quantity(f"1 {shown}", kind) == pytest.approx(expected, rel=1e-14)


numbers = st.floats(-1e12, 1e12, allow_nan=False)
kinds = st.sampled_from(sorted(units.KINDS))


@given(numbers, kinds)
def test_writing_and_reading_gives_the_very_same_float(value, kind):
    assert units.parse_quantity(units.write_quantity(value, kind), kind) == value


@given(numbers, kinds)
def test_what_is_shown_is_the_value_to_six_digits(value, kind):
    shown = units.parse_quantity(units.show_quantity(value, kind), kind)
    assert shown == pytest.approx(value, rel=6e-6, abs=1e-300)


@given(st.floats(1e-3, 1e3), kinds)
def test_from_si_undoes_reading(number, kind):
    shown = units.KINDS[kind].shown
    kept = units.parse_unit(units.KINDS[kind].si)
    value = units.parse_quantity(f"{number!r} {shown}", kind)
    assert units.from_si(value * kept.ratio, shown) == pytest.approx(number, rel=1e-14)


@given(st.text(max_size=30), kinds)
def test_any_text_is_a_finite_number_or_a_sentence(text, kind):
    try:
        value = units.parse_quantity(text, kind)
    except UnitError as refused:
        value = float(len(str(refused)) > 20)
    assert math.isfinite(value)
    assert value is not None


def test_reading_a_number_loads_no_large_library():
    code = (
        "import sys, coldglow.units as u; u.parse_quantity('3 um', 'wavelength'); "
        "print([m for m in ('astropy', 'numpy', 'pydantic') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
