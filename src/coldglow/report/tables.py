"""Named tables with units, header values, sentences and warnings: what a command found, as plain records.

The records hold numbers in display units and compute nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.report import words

Scalar = float | int | bool | str


@dataclass(frozen=True, slots=True, eq=False)
class Column:
    """One column: `values` is ndarray[row] of float, int, bool or str, in `unit` (astropy's spelling).

    `digits` significant digits are printed, or exactly `decimals` decimals where given (better for
    angles and times of day); files always hold full precision. `infinite` is the word for infinity
    (``never`` for a time to the goal). Columns with ``shown=False`` go to files only. Times are ISO
    strings in UTC.
    """

    name: str
    values: NDArray[Any]
    unit: str = ""
    digits: int = 4
    description: str = ""
    decimals: int | None = None
    infinite: str = "∞"
    shown: bool = True

    def __post_init__(self) -> None:
        """Turn a list into an array and refuse what a table cannot hold."""
        values = np.asarray(self.values)
        if values.ndim != 1:
            raise ValueError(f"column {self.name!r} must have one dimension, not shape {values.shape}")
        if values.dtype.kind == "O" or values.dtype.kind not in "fiubU":
            values = np.asarray([str(value) for value in values])
        object.__setattr__(self, "values", values)

    def text(self, row: int, write: Callable[[float, int, str], str] = words.plain) -> str:
        """Return one value as printed; `write` words a float (`words.plain` for terminals)."""
        value = self.values[row]
        kind = self.values.dtype.kind
        if kind == "U":
            return str(value)
        if kind == "b":
            return "yes" if value else "no"
        if kind in "iu":
            return str(int(value))
        if self.decimals is not None and np.isfinite(value):
            text = f"{round(float(value), self.decimals) + 0.0:.{self.decimals}f}"
            return text if write is words.plain else words.true_minus(text)
        return write(float(value), self.digits, self.infinite)

    @property
    def numeric(self) -> bool:
        """True where the column holds numbers (set flush right)."""
        return self.values.dtype.kind in "fiu"


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """Columns of equal length with a caption.

    `rows` picks the rows that are printed (None: from the first on, as many as fit; an empty tuple: the
    table is for files only); files hold all.
    """

    columns: tuple[Column, ...]
    caption: str = ""
    rows: tuple[int, ...] | None = None

    def __post_init__(self) -> None:
        """Refuse columns of unequal length and names that occur twice."""
        object.__setattr__(self, "columns", tuple(self.columns))
        lengths = {column.name: len(column.values) for column in self.columns}
        if len(lengths) != len(self.columns):
            raise ValueError(f"two columns have the same name: {[column.name for column in self.columns]}")
        if len(set(lengths.values())) > 1:
            raise ValueError(f"the columns differ in length: {lengths}")

    def __len__(self) -> int:
        return len(self.columns[0].values) if self.columns else 0

    def __getitem__(self, name: str) -> NDArray[Any]:
        return self.column(name).values

    def column(self, name: str) -> Column:
        """Return the column of that name; KeyError with the names there are."""
        for column in self.columns:
            if column.name == name:
                return column
        raise KeyError(f"no column {name!r}; there are {', '.join(column.name for column in self.columns)}")


@dataclass(frozen=True, slots=True)
class Entry:
    """One header value with its unit and, where they are known, its random and systematic 1-sigma errors.

    `text` replaces the automatic wording; `label` the name of the key.
    """

    value: Scalar
    unit: str = ""
    text: str = ""
    random_error: float | None = None
    systematic_error: float | None = None
    digits: int = 4
    label: str = ""

    def heading(self, key: str) -> str:
        """Return the label, or the key in words, with a capital."""
        text = self.label or words.sentence_case(key)
        return text[:1].upper() + text[1:]

    def __str__(self) -> str:
        """Return the value in words: ``480 ± 12 K (random), ± 15 K (systematic)``."""
        if self.text:
            return self.text
        if isinstance(self.value, bool):
            return "yes" if self.value else "no"
        if isinstance(self.value, str):
            return self.value
        if isinstance(self.value, int):
            return words.join_unit(str(self.value), self.unit)
        if self.random_error is None:
            text = words.quantity(self.value, self.unit, self.digits)
        else:
            text = f"{words.with_error(self.value, self.random_error, self.unit)} (random)"
        if self.systematic_error is not None:
            digits = words.error_digits(self.systematic_error)
            text += f", ± {words.quantity(self.systematic_error, self.unit, digits)} (systematic)"
        return text


@dataclass(frozen=True, slots=True, eq=False)
class Findings:
    """What one command found. The first table is the main one; `sentences` say the answer in words."""

    command: str
    tables: Mapping[str, Table]
    header: Mapping[str, Entry] = field(default_factory=dict)
    sentences: Sequence[str] = ()
    warnings: Sequence[str] = ()
    feasible: bool = True

    @property
    def main(self) -> str:
        """Name of the main table."""
        return next(iter(self.tables))

    def table(self, name: str = "") -> Table:
        """Return a table by name, the main one without; KeyError with the names there are."""
        if name and name not in self.tables:
            raise KeyError(f"no table {name!r}; there are {', '.join(self.tables)}")
        return self.tables[name or self.main]

    def __getitem__(self, column: str) -> NDArray[Any]:
        return self.table()[column]


def column(name: str, values: ArrayLike, unit: str = "", **more: Any) -> Column:
    """Return a `Column` from anything that numpy turns into an array."""
    return Column(name, np.asarray(values), unit, **more)


def table(*columns: Column, caption: str = "", rows: Sequence[int] | None = None) -> Table:
    """Return a `Table` of these columns."""
    return Table(columns, caption, None if rows is None else tuple(int(row) for row in rows))
