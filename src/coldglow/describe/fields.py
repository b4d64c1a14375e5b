"""The typed leaves of a description: text in, SI value out, or a sentence that says what is wrong.

Everything here is used in the annotation of a field of the schemas: ``quantity("length", "0.1 m", "100 m")``
is a float in metres read from a text with a unit and held within a range.
"""

from __future__ import annotations

import datetime
import math
import re
from collections.abc import Callable, Iterator
from typing import Annotated

from pydantic import BaseModel, BeforeValidator, ConfigDict, model_validator

from coldglow.describe.records import Estimate
from coldglow.errors import UnitError
from coldglow.units import parse_quantity, quoted


class Refused(ValueError):
    """A value that cannot be used: what is wrong, what is accepted, and where (relative key path)."""

    def __init__(self, what: str, accepted: str = "", key: str = "") -> None:
        """Keep the parts of the sentence as attributes."""
        self.what, self.accepted, self.key = what, accepted, key
        super().__init__(what)


class Refusals(ValueError):
    """Several mistakes in one block."""

    def __init__(self, all_of_them: list[Refused]) -> None:
        """Keep the mistakes as an attribute."""
        self.all = all_of_them
        super().__init__("; ".join(one.what for one in all_of_them))


class Block(BaseModel):
    """A block of a description: no unknown keys, and rules between its keys."""

    model_config = ConfigDict(extra="forbid", frozen=True, arbitrary_types_allowed=True, defer_build=True)

    def rules(self) -> Iterator[Refused]:
        """Yield every rule between keys that is broken (the keys themselves are right already)."""
        yield from ()

    @model_validator(mode="after")
    def _check_rules(self) -> Block:
        if broken := list(self.rules()):
            raise Refusals(broken)
        return self


def as_text(value: object) -> str:
    """Return the value when it is a text that is not empty."""
    if isinstance(value, dict | list):
        raise Refused(f"a {'mapping' if isinstance(value, dict) else 'list'} stands here", "a single value")
    text = str(value).strip()
    if not text:
        raise Refused("the value is missing", "write it after the colon")
    return text


def _in_range(
    text: str, kind: str, low: str | None, high: str | None, above: str | None, value: float
) -> float:
    if low is not None and value < parse_quantity(low, kind):
        raise Refused(f"{quoted(text)} is too small", _span(low, high, above))
    if above is not None and value <= parse_quantity(above, kind):
        raise Refused(f"{quoted(text)} is too small", _span(low, high, above))
    if high is not None and value > parse_quantity(high, kind):
        raise Refused(f"{quoted(text)} is too large", _span(low, high, above))
    return value


def _span(low: str | None, high: str | None, above: str | None) -> str:
    if above is not None:
        return f"more than {above}" + (f", at most {high}" if high is not None else "")
    return f"from {low} to {high}"


def _reader(
    kind: str, low: str | None = None, high: str | None = None, above: str | None = None, **words: float
) -> Callable[[object], float]:
    def read(value: object) -> float:
        text = as_text(value)
        if text.lower() in words:
            return words[text.lower()]
        try:
            return _in_range(text, kind, low, high, above, parse_quantity(text, kind))
        except UnitError as error:
            what, _, accepted = str(error).partition("; ")
            raise Refused(what, accepted + "".join(f" or `{word}`" for word in words)) from None

    return read


def quantity(
    kind: str, low: str | None = None, high: str | None = None, *, above: str | None = None, **words: float
) -> BeforeValidator:
    """Return the validator of a quantity of a kind within a range; `words` stand for special values."""
    return BeforeValidator(_reader(kind, low, high, above, **words))


def whole_number(low: int, high: int) -> BeforeValidator:
    """Return the validator of a whole number within a range."""
    number = _reader("number", str(low), str(high))

    def read(value: object) -> int:
        found = number(value)
        if found != int(found):
            raise Refused(f"{quoted(as_text(value))} is not a whole number", f"from {low} to {high}")
        return int(found)

    return BeforeValidator(read)


def _estimate(kind: str, low: str, high: str, difference: str) -> Callable[[object], Estimate]:
    value_of = _reader(kind, low, high)

    def read(node: object) -> Estimate:
        if not isinstance(node, dict):
            return Estimate(value_of(node))
        unknown = [key for key in node if key not in ("value", "uncertainty", "scatter")]
        broken = [
            Refused("this key is not known here", "value, uncertainty, scatter", key) for key in unknown
        ]
        parts = {"uncertainty": 0.0, "scatter": 0.0, "value": math.nan}
        if "value" not in node:
            broken.append(Refused("the key `value` is missing", "value, uncertainty, scatter"))
        for key in [key for key in ("value", "uncertainty", "scatter") if key in node]:
            try:
                parts[key] = value_of(node[key]) if key == "value" else _spread(node[key], difference, parts)
            except Refused as refused:
                broken.append(Refused(refused.what, refused.accepted, key))
        if broken:
            raise Refusals(broken)
        return Estimate(**parts)

    return read


def _spread(node: object, kind: str, parts: dict[str, float]) -> float:
    """Return an uncertainty: a quantity of the kind, or a share of the value in percent."""
    text = as_text(node)
    if text.endswith("%") and kind not in ("fraction", "fraction rate"):
        return abs(parts["value"]) * _reader("fraction", "0 %", "1000 %")(text)
    found = _reader(kind)(text)
    if found < 0:
        raise Refused(f"{quoted(text)} is negative", "an uncertainty or scatter of zero or more")
    return found


def estimate(kind: str, low: str, high: str, difference: str | None = None) -> BeforeValidator:
    """Return the validator of a value with optional uncertainty and scatter (``{value: ...}``)."""
    return BeforeValidator(_estimate(kind, low, high, difference or kind))


def read_date(text: str) -> str:
    """Return an ISO date as it stands, refusing what is not one."""
    try:
        date = datetime.date.fromisoformat(text)
    except ValueError:
        date = None
    if date is None or not re.fullmatch(r"\d{4}-\d\d-\d\d", text):
        raise Refused(f"{quoted(text)} is not a date", "year-month-day, e.g. `2027-11-25`")
    if not 1900 <= date.year <= 2150:
        raise Refused(f"{quoted(text)} is out of range", "a date from 1900 to 2150")
    return text


def _read_dates(value: object) -> tuple[str, ...]:
    """Return the dates of a list whose entries are dates or spans ``2027-11-25 to 2027-11-30``."""
    entries = value if isinstance(value, list) else [value]
    found: list[str] = []
    broken: list[Refused] = []
    for index, entry in enumerate(entries):
        try:
            found.extend(_one_entry(as_text(entry)))
        except Refused as refused:
            key = str(index) if isinstance(value, list) else ""
            broken.append(Refused(refused.what, refused.accepted, key))
    if broken:
        raise Refusals(broken)
    return tuple(dict.fromkeys(found))


def _one_entry(text: str) -> list[str]:
    first, middle, last = text.partition(" to ")
    if not middle:
        day, _, half = text.partition(" ")
        if half not in ("", "first", "second"):
            raise Refused(
                f"{quoted(text)} is not a night or half of one",
                "`2027-11-25`, `2027-11-25 first` (or second), `2027-11-25 to 2027-11-30`",
            )
        return [f"{read_date(day)} {half}".strip()]
    start = datetime.date.fromisoformat(read_date(first.strip()))
    days = (datetime.date.fromisoformat(read_date(last.strip())) - start).days
    if not 0 <= days <= 1100:
        raise Refused(f"{quoted(text)} is not a span of dates", "the earlier first, at most 1100 nights")
    return [(start + datetime.timedelta(days=day)).isoformat() for day in range(days + 1)]


def _read_flag(value: object) -> bool:
    text = as_text(value)
    if text.lower() not in ("yes", "no", "true", "false"):
        raise Refused(f"{quoted(text)} is neither yes nor no", "yes or no")
    return text.lower() in ("yes", "true")


def _read_name(value: object) -> str:
    text = as_text(value)
    if len(text) > 80 or not text.isprintable():
        raise Refused(f"{quoted(text)} is not a name", "at most 80 printable characters")
    return text


def _read_table(value: object) -> object:
    if isinstance(value, list):
        return value
    raise Refused("this is not a table", "a list of rows, e.g. `- [3.4 um, 0.01]`")


def _read_texts(value: object) -> tuple[str, ...]:
    entries = value if isinstance(value, list) else [value]
    return tuple(as_text(entry) for entry in entries)


def as_list(value: object) -> object:
    """Let one entry stand for a list of one."""
    return value if isinstance(value, list) else [value]


def _read_entries(value: object) -> object:
    """Refuse names of entries that could not be told from a key path."""
    if isinstance(value, dict):
        broken = [
            Refused("this name is not usable", "letters, digits, spaces and - + _, up to 60 of them", key)
            for key in value
            if not re.fullmatch(r"[\w+-][\w +-]{0,59}", key)
        ]
        if broken:
            raise Refusals(broken)
    return value


Word = BeforeValidator(lambda value: as_text(value).lower())
Text = Annotated[str, BeforeValidator(as_text)]
Name = Annotated[str, BeforeValidator(_read_name)]
Flag = Annotated[bool, BeforeValidator(_read_flag)]
Date = Annotated[str, BeforeValidator(lambda value: read_date(as_text(value)))]
Nights = Annotated[tuple[str, ...], BeforeValidator(_read_dates)]
Texts = Annotated[tuple[str, ...], BeforeValidator(_read_texts)]
Rows = BeforeValidator(_read_table)
Entries = BeforeValidator(_read_entries)
