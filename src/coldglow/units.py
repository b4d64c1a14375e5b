"""Quantities as people write them (``8.2 m``, ``2e15 m-2``, ``-30:14:16``) to SI floats and back.

A small table of our own instead of `astropy.units`: reading a number must not cost the half second that
importing the large package takes. Angles are a dimension of their own (radian, steradian = radian^2), so
that an angle is never mistaken for a pure number; so are photons and electrons.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal
from functools import lru_cache

from coldglow.errors import UnitError

# dimension exponents: metre, second, kilogram, kelvin, radian, photon, electron
Dimension = tuple[int, int, int, int, int, int, int]


@dataclass(frozen=True, slots=True)
class Unit:
    """Factor to SI = ratio * 10**decade. The decade is kept apart so that 3.4 um is exactly 3.4e-6 m."""

    dimension: Dimension
    ratio: float
    decade: int


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of quantity: the unit it is kept in, the unit it is shown in, an example of how it is written.

    Kept in SI, except for what astronomers count in centuries and observers in minutes and hours: a rate
    read per second and multiplied up again would lose its last digit.
    """

    noun: str
    si: str
    shown: str
    example: str


KINDS = {
    "number": Kind("a plain number", "", "", "3"),
    "fraction": Kind("a fraction", "", "", "0.7` or `70 %"),
    "length": Kind("a length", "m", "m", "8.2 m"),
    "radius": Kind("a length", "m", "km", "25559 km"),
    "wavelength": Kind("a wavelength", "m", "um", "3.4 um"),
    "water": Kind("a depth of precipitable water", "m", "mm", "2 mm"),
    "angle": Kind("an angle", "rad", "deg", "30 deg"),
    "small angle": Kind("an angle", "rad", "arcsec", "0.5 arcsec"),
    "angle rate": Kind("a rate of turning", "rad s-1", "deg day-1", "536.3 deg/day"),
    "slow angle rate": Kind("a rate of turning", "rad century-1", "deg century-1", "0.01 deg/century"),
    "temperature": Kind("a temperature", "K", "K", "500 K"),
    "temperature difference": Kind("a temperature difference", "K", "K", "20 K"),
    "temperature rate": Kind("a temperature rate", "K s-1", "K yr-1", "-8 K/yr"),
    "fraction rate": Kind("a relative rate", "s-1", "% yr-1", "-1 %/yr"),
    "column": Kind("a column density", "m-2", "m-2", "2e15 m-2"),
    "time": Kind("a time", "s", "s", "300 s"),
    "hours": Kind("a time", "s", "h", "16 h"),
    "budget hours": Kind("a time", "h", "h", "40 h"),
    "minutes": Kind("a time", "min", "min", "30 min"),
    "years": Kind("a time", "s", "yr", "20 yr"),
    "velocity": Kind("a velocity", "m s-1", "km s-1", "10 km/s"),
    "charge": Kind("a number of electrons", "e-", "e-", "80000 e-"),
    "current": Kind("electrons per time", "e- s-1", "e- s-1", "0.1 e-/s"),
    "airglow": Kind(
        "a photon radiance per wavelength",
        "ph s-1 m-2 sr-1 m-1",
        "ph s-1 m-2 arcsec-2 um-1",
        "100 ph s-1 m-2 arcsec-2 um-1",
    ),
    "radiance": Kind("a radiance", "W m-2 sr-1", "W m-2 sr-1", "1e-6 W m-2 sr-1"),
    "spectral radiance": Kind(
        "a radiance per wavelength", "W m-2 sr-1 m-1", "W m-2 sr-1 um-1", "1e-4 W m-2 sr-1 um-1"
    ),
}

_ANGLES = {"rad": 1.0, "deg": math.pi / 180, "arcmin": math.pi / 10800, "arcsec": math.pi / 648000}
_TIMES = {"min": 60.0, "h": 3600.0, "d": 86400.0, "yr": 31557600.0, "century": 3155760000.0}
_PREFIXES = {"n": -9, "u": -6, "µ": -6, "μ": -6, "m": -3, "c": -2, "k": 3, "M": 6}
_NAMES = {
    "micron": "um", "microns": "um", "metre": "m", "metres": "m", "meter": "m", "meters": "m",
    "kelvin": "K", "degree": "deg", "degrees": "deg", "°": "deg", "'": "arcmin", '"': "arcsec",
    "hour": "h", "hours": "h", "hr": "h", "day": "d", "days": "d", "year": "yr", "years": "yr", "a": "yr",
    "minute": "min", "minutes": "min", "sec": "s", "second": "s", "seconds": "s",
    "photon": "ph", "photons": "ph", "electron": "e-", "electrons": "e-", "pixel": "pix",
}  # fmt: skip


def _unit_table() -> dict[str, Unit]:
    table = {
        "m": Unit((1, 0, 0, 0, 0, 0, 0), 1.0, 0),
        "s": Unit((0, 1, 0, 0, 0, 0, 0), 1.0, 0),
        "K": Unit((0, 0, 0, 1, 0, 0, 0), 1.0, 0),
        "W": Unit((2, -3, 1, 0, 0, 0, 0), 1.0, 0),
    }
    for prefix, decade in _PREFIXES.items():
        for name in ("m", "s", "K", "W", "rad"):
            dimension = table[name].dimension if name in table else (0, 0, 0, 0, 1, 0, 0)
            table[prefix + name] = Unit(dimension, 1.0, decade)
    for name, ratio in _ANGLES.items():
        table[name] = Unit((0, 0, 0, 0, 1, 0, 0), ratio, 0)
    for name, ratio in _TIMES.items():
        table[name] = Unit((0, 1, 0, 0, 0, 0, 0), ratio, 0)
    table["mas"] = Unit((0, 0, 0, 0, 1, 0, 0), _ANGLES["arcsec"], -3)
    table["sr"] = Unit((0, 0, 0, 0, 2, 0, 0), 1.0, 0)
    table["au"] = Unit((1, 0, 0, 0, 0, 0, 0), 149597870700.0, 0)
    table["ph"] = Unit((0, 0, 0, 0, 0, 1, 0), 1.0, 0)
    table["e-"] = Unit((0, 0, 0, 0, 0, 0, 1), 1.0, 0)
    table["pix"] = Unit((0, 0, 0, 0, 0, 0, 0), 1.0, 0)
    table["%"] = Unit((0, 0, 0, 0, 0, 0, 0), 1.0, -2)
    return table


_UNITS = _unit_table()
_NUMBER = re.compile(r"[+-]?(?:\d{1,3}(?:[ _\u2009\u202f]\d{3})+(?!\d)|\d+)?(?:\.\d*)?(?:[eE][+-]?\d+)?")
_SEXAGESIMAL = re.compile(r"([+-]?)(\d{1,3}):([0-5]?\d)(?::([0-5]?\d(?:\.\d*)?))?")
_TOKEN = re.compile(r"e-(?!\d)|[^\W\d_]+|[%°'\"]")
_POWER = re.compile(r"(?:\^|\*\*)?([+-]?\d{1,2})")
_SUPERSCRIPTS = str.maketrans("⁻⁺⁰¹²³⁴⁵⁶⁷⁸⁹−", "-+0123456789-")


def quoted(text: str) -> str:
    """Return the text between back quotes, shortened when it is long, on one line, controls as escapes."""
    line = " ".join(text.split())
    line = "".join(c if c.isprintable() else repr(c)[1:-1] for c in line)
    return f"`{line if len(line) <= 60 else line[:57] + '...'}`"


@lru_cache(maxsize=512)
def parse_unit(text: str) -> Unit:
    """Return the factor and dimension of a unit such as ``W m-2 sr-1`` or ``km/s``.

    Raises `UnitError` for a unit that is not in the table.
    """
    rest = text.translate(_SUPERSCRIPTS).strip()
    exponents = [0] * 7
    ratio, decade, sign = 1.0, 0, 1
    while rest:
        if rest[0] in "/*·. ":
            sign = -1 if rest[0] == "/" else sign if rest[0] == " " else 1
            rest = rest[1:]
            continue
        token = _TOKEN.match(rest)
        unit = _UNITS.get(_NAMES.get(token.group(), token.group())) if token else None
        if token is None or unit is None:
            raise UnitError(f"unknown unit {quoted(text)}")
        rest = rest[token.end() :]
        power = _POWER.match(rest)
        exponent = sign * (int(power.group(1)) if power else 1)
        rest = rest[power.end() :] if power else rest
        exponents = [old + exponent * new for old, new in zip(exponents, unit.dimension, strict=True)]
        ratio *= unit.ratio**exponent
        decade += unit.decade * exponent
        sign = 1
    return Unit(tuple(exponents), ratio, decade)  # type: ignore[arg-type]


def parse_quantity(text: str, kind: str, default_unit: str | None = None) -> float:
    """Return the value of a quantity written with its unit, in SI (or in what its `Kind` is kept in).

    `default_unit` is what a bare number means (command line only; in a description a bare number is a
    mistake unless the kind has no unit). Angles may be written as ``-30:14:16`` (degrees, minutes,
    seconds), fractions in percent, temperatures also in degC.

    Raises `UnitError` with a sentence that says what is wrong and how the quantity is written.
    """
    wanted = KINDS[kind]
    advice = f"write e.g. `{wanted.example}`"
    stripped = text.strip().translate(_SUPERSCRIPTS)
    angle = parse_unit(wanted.si).dimension == _UNITS["rad"].dimension
    if angle and (parts := _SEXAGESIMAL.fullmatch(stripped)):
        sign, degrees, minutes, seconds = parts.groups()
        value = int(degrees) + int(minutes) / 60 + float(seconds or 0) / 3600
        return math.radians(-value if sign == "-" else value)
    if angle and re.match(r"[+-]?\d+:", stripped):
        raise UnitError(f"{quoted(text)} is no angle; minutes and seconds are whole numbers below 60")
    number = _NUMBER.match(stripped)
    if not number or not re.match(r"[+-]?\.?\d", number.group()):
        raise UnitError(f"{quoted(text)} is not a number; {advice}")
    digits = re.sub(r"[ _\u2009\u202f]", "", number.group())
    unit_text = stripped[number.end() :].strip()
    if unit_text.startswith(","):
        raise UnitError(f"{quoted(text)} is not a number; write a decimal point, e.g. `{wanted.example}`")
    if not unit_text and wanted.si and default_unit is None:
        raise UnitError(
            f"{quoted(text)} has no unit; write a unit, e.g. `{stripped} {wanted.example.partition(' ')[2]}`"
        )
    if unit_text in ("degC", "°C") and kind == "temperature":
        value = float(digits) + 273.15
    else:
        value = _to_si(digits, text, unit_text or default_unit or "", wanted, advice)
    if not math.isfinite(value):
        raise UnitError(f"{quoted(text)} is too large a number; {advice}")
    return value


def _to_si(digits: str, text: str, unit_text: str, wanted: Kind, advice: str) -> float:
    try:
        unit = parse_unit(unit_text)
    except UnitError:
        raise UnitError(f"{quoted(text)} has the unknown unit {quoted(unit_text)}; {advice}") from None
    except OverflowError:
        raise UnitError(f"{quoted(text)} has an absurd unit; {advice}") from None
    kept = parse_unit(wanted.si)
    if unit.dimension != kept.dimension:
        raise UnitError(f"{quoted(text)} is not {wanted.noun}; {advice}")
    mantissa, _, exponent = digits.lower().partition("e")
    if len(exponent) > 5:
        raise UnitError(f"{quoted(text)} is too large or too small a number; {advice}")
    return float(f"{mantissa}e{int(exponent or 0) + unit.decade}") * (unit.ratio / kept.ratio)


def from_si(value: float, unit: str) -> float:
    """Return an SI value in another unit of the same kind, such as ``arcsec`` for an angle."""
    parsed = parse_unit(unit)
    return float(Decimal(repr(float(value) / parsed.ratio)).scaleb(-parsed.decade))


def write_quantity(value: float, kind: str) -> str:
    """Return a quantity with its unit such that `parse_quantity` gives back the very same float.

    The kind's usual unit is used; where the last digit would be lost in it, the unit in which it is kept.
    """
    shown, kept = KINDS[kind].shown, KINDS[kind].si
    guess = from_si(value * parse_unit(kept).ratio, shown)
    short = float(f"{guess:.12g}")  # as somebody would have written it
    for number in (short, guess, math.nextafter(guess, math.inf), math.nextafter(guess, -math.inf)):
        text = f"{_plain(number)} {shown}".strip()
        if parse_quantity(text, kind) == value:
            return text
    return f"{_plain(value)} {kept}".strip()


def show_quantity(value: float, kind: str, digits: int = 6) -> str:
    """Return a quantity for people: its usual unit and at most so many significant digits."""
    shown, kept = KINDS[kind].shown, KINDS[kind].si
    return f"{from_si(value * parse_unit(kept).ratio, shown):.{digits}g} {shown}".strip()


def _plain(number: float) -> str:
    if number == int(number) and abs(number) < 1e6:
        return str(int(number))
    mantissa, _, exponent = repr(float(number)).partition("e")
    if abs(number) >= 1e6 and not exponent:
        mantissa, _, exponent = f"{Decimal(mantissa).normalize():E}".partition("E")
    return f"{mantissa}e{int(exponent)}" if exponent else mantissa
