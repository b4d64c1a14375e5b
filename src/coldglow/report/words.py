"""Numbers, errors, durations, chances and dates as a careful author writes them.

Every text for people takes its numbers from here, so that the terminal, the page and the proposal round
alike. Nothing depends on the locale.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from datetime import date

_MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")
_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")
_UNIT_WORDS = {
    "um": "µm",
    "uJy": "µJy",
    "deg": "°",
    "deg2": "deg²",
    "arcsec": "″",
    "electron": "e⁻",
    "%": "%",
}
_SHORT_NAMES = {"snr": "SNR", "ra": "RA", "dec": "Dec", "icrs": "ICRS", "utc": "UTC", "lte": "LTE"}
NOTHING = "–"
LONG_H = 10000  # a time beyond is told as such


def decimals_for(value: float, digits: int) -> int:
    """Return how many decimals show `digits` significant digits of a value (negative: tens, hundreds)."""
    if value == 0 or not math.isfinite(value):
        return digits - 1
    exponent = math.floor(math.log10(abs(value)))
    if round(abs(value) / 10.0**exponent, digits - 1) >= 10:
        exponent += 1
    return digits - 1 - exponent


def plain(value: float, digits: int = 3, infinite: str = "∞") -> str:
    """Return a number for a terminal: ``0.0123``, ``1.23e15``; missing is a dash, infinite a word."""
    if math.isnan(value):
        return NOTHING
    if math.isinf(value):
        return infinite if value > 0 else f"-{infinite}"
    if value == 0:
        return "0"
    if not 1e-3 <= abs(value) < 1e6:
        mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
        return f"{mantissa}e{int(exponent)}"
    decimals = decimals_for(value, digits)
    return f"{round(value, decimals):.{max(decimals, 0)}f}"


def number(value: float, digits: int = 3, infinite: str = "∞") -> str:
    """Return a number for running text: as `plain`, with ``1.23×10¹⁵`` and a true minus sign."""
    text = plain(value, digits, infinite)
    if "e" in text and text != infinite:
        mantissa, exponent = text.split("e")
        text = f"{mantissa}×10{raised(int(exponent))}"
    return true_minus(text)


def true_minus(text: str) -> str:
    """Return the text of a number with a true minus sign in front instead of a hyphen."""
    return "−" + text[1:] if text.startswith("-") else text


def raised(power: int) -> str:
    """Return an exponent in raised digits."""
    return str(power).translate(_RAISED)


def short(value: float, digits: int = 3) -> str:
    """Return `number` without trailing zeros, for round values that somebody chose: ``5``, ``0.8``."""
    text = number(value, digits)
    return text.rstrip("0").rstrip(".") if "." in text and "×" not in text else text


def unit(name: str) -> str:
    """Return a unit as people write it: ``W m-2 sr-1`` becomes ``W m⁻² sr⁻¹``, ``um`` becomes ``µm``."""
    parts = []
    for part in name.replace("/ ", "/").split():
        slash = "/" if part.startswith("/") else ""
        part = part.removeprefix("/")
        base = part.rstrip("0123456789-")
        word, power = _UNIT_WORDS.get(base, base), part[len(base) :].translate(_RAISED)
        parts.append(slash + (f"({word}){power}" if power and word.endswith("⁻") else word + power))
    return " ".join(parts)


def quantity(value: float, unit_name: str = "", digits: int = 3) -> str:
    """Return value and unit, as in ``480 K``, ``35 %`` or ``12.3°``."""
    return join_unit(number(value, digits), unit_name)


def join_unit(text: str, unit_name: str) -> str:
    """Put a unit behind a number; no space before the degree and arc-second signs."""
    pretty = unit(unit_name)
    return text + (pretty if pretty in ("°", "″") else f" {pretty}" if pretty else "")


def error_digits(error: float) -> int:
    """Return how many digits an error deserves: one, two when it begins with 1 or 2 or would round to 1.

    So ± 97 keeps both of its digits: rounded to ± 100, it would take a digit too many from the value.
    """
    return 2 if f"{abs(error):.1e}"[0] in "12" or f"{abs(error):.0e}"[0] == "1" else 1


def with_error(value: float, error: float, unit_name: str = "") -> str:
    """Return ``value ± error`` with the error to one or two digits and the value to the same place.

    An error of zero, missing or infinite is said as such: ``480 K``, ``480 K, error unknown``,
    ``480 K, not constrained``.
    """
    if not math.isfinite(error) or error == 0 or not math.isfinite(value):
        tail = ", not constrained" if math.isinf(error) else ", error unknown" if math.isnan(error) else ""
        return quantity(value, unit_name) + tail
    text, spread, power = rounded_pair(value, error)
    joined = f"{text} ± {spread}".replace("-", "−")
    if power:
        joined = f"({joined})×10{raised(power)}"
    elif unit(unit_name) in ("°", "″", "%"):
        joined = f"({joined})"
    return join_unit(joined, unit_name)


def with_errors(value: float, random: float, systematic: float, unit_name: str = "") -> str:
    """Return ``480 ± 12 (random) ± 9 (systematic) K``, all to the place that the larger error allows.

    An error of which nothing would be left at that place keeps its own digits: none is lost.
    """
    larger = max(random, systematic)
    if not math.isfinite(larger) or larger == 0 or not math.isfinite(value):
        return with_error(value, larger, unit_name)
    text, _, power = rounded_pair(value, larger)
    scale = 10.0**power
    decimals = decimals_for(larger / scale, error_digits(larger))
    spreads = [_spread(error / scale, decimals) for error in (random, systematic)]
    joined = f"{true_minus(text)} ± {spreads[0]} (random) ± {spreads[1]} (systematic)"
    if power:
        return join_unit(f"({joined})×10{raised(power)}", unit_name)
    return join_unit(f"({joined})" if unit(unit_name) in ("°", "″", "%") else joined, unit_name)


def _spread(error: float, decimals: int) -> str:
    """Return an error to so many decimals, or to its own digits where they would leave nothing of it."""
    if error and not round(error, decimals):
        return number(error, error_digits(error))
    return f"{round(error, decimals):.{max(decimals, 0)}f}" if error else "0"


def rounded_pair(value: float, error: float) -> tuple[str, str, int]:
    """Return value and error rounded to the same place, and the power of ten taken out of both."""
    largest = max(abs(value), abs(error))
    power = 0 if 1e-3 <= largest < 1e5 else math.floor(math.log10(largest))
    scaled, spread = value / 10.0**power, abs(error) / 10.0**power
    decimals = decimals_for(spread, error_digits(spread))
    places = max(decimals, 0)
    return f"{round(scaled, decimals) + 0.0:.{places}f}", f"{round(spread, decimals):.{places}f}", power


def duration(seconds: float) -> str:
    """Return a length of time in plain words: ``3 h 20 min``, ``45 s``, ``never`` for infinity.

    Beyond what any telescope gives it is only "more than 10 000 h".
    """
    if math.isnan(seconds):
        return NOTHING
    if math.isinf(seconds):
        return "never"
    if seconds > 3600.0 * LONG_H:
        return f"more than {LONG_H // 1000} 000 h"
    if seconds < 0:
        return "−" + duration(-seconds)
    if seconds < 10:
        return f"{plain(seconds, 2)} s"
    if round(seconds) < 120:
        return f"{round(seconds)} s"
    minutes = round(seconds / 60)
    if minutes < 60:
        return f"{minutes} min"
    if minutes >= 100 * 60:
        return f"{round(seconds / 3600)} h"
    hours, rest = divmod(minutes, 60)
    return f"{hours} h {rest} min" if rest else f"{hours} h"


def percent(share: float, digits: int = 2) -> str:
    """Return a share as per cent: ``35 %``, ``0.42 %``."""
    return f"{number(100 * share, digits)} %"


def probability(chance: float) -> str:
    """Return a probability in per cent that never claims certainty it has not: ``> 99.9 %``, ``< 0.1 %``."""
    if math.isnan(chance):
        return NOTHING
    if chance in (0.0, 1.0):
        return f"{round(100 * chance)} %"
    if chance > 0.999:
        return "> 99.9 %"
    if chance < 0.001:
        return "< 0.1 %"
    if 0.02 <= chance <= 0.98:
        return f"{round(100 * chance)} %"
    return f"{100 * chance:.1f} %"


def day(iso: str) -> str:
    """Return the date of an ISO string as ``25 Nov 2027``."""
    moment = date.fromisoformat(iso[:10])
    return f"{moment.day} {_MONTHS[moment.month - 1]} {moment.year}"


def days(first: str, last: str) -> str:
    """Return a span of dates as ``25 to 28 Nov 2027``, naming month and year once where they agree."""
    one, two = date.fromisoformat(first[:10]), date.fromisoformat(last[:10])
    if one == two:
        return day(first)
    if (one.year, one.month) == (two.year, two.month):
        return f"{one.day} to {day(last)}"
    if one.year == two.year:
        return f"{one.day} {_MONTHS[one.month - 1]} to {day(last)}"
    return f"{day(first)} to {day(last)}"


def moment(iso: str) -> str:
    """Return an ISO time to the minute, ``2027-11-25 04:15 UTC``."""
    return f"{iso[:10]} {iso[11:16]} UTC"


def count(amount: float, noun: str, plural: str = "") -> str:
    """Return a count with its noun: ``1 night``, ``3 nights``, ``2.5 nights``."""
    text = short(amount) if amount != round(amount) else f"{round(amount)}"
    return f"{text} {noun if amount == 1 else plural or noun + 's'}"


def listing(items: Sequence[str], last: str = "and") -> str:
    """Return ``a, b and c``."""
    if len(items) < 2:
        return "".join(items)
    return f"{', '.join(items[:-1])} {last} {items[-1]}"


def sentence_case(name: str) -> str:
    """Return the name of a column or table as words: ``snr_one_night`` becomes ``SNR one night``."""
    text = " ".join(_SHORT_NAMES.get(word, word) for word in name.replace("-", " ").split("_"))
    return text[:1].upper() + text[1:]
