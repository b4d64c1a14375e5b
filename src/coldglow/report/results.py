"""The result of a command: its findings, with the ways to print, store and show them."""

from __future__ import annotations

import sys
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, TextIO

from coldglow.report import files, terminal
from coldglow.report.tables import Column, Entry, Findings, Table, column, table

if TYPE_CHECKING:
    from astropy.table import QTable

__all__ = ["Column", "Entry", "Result", "Table", "column", "table"]


@dataclass(frozen=True, slots=True, eq=False)
class Result(Findings):
    """What one command found. The first table is the main one; `sentences` say the answer in words.

    It prints as a table, shows itself in a notebook, hands out astropy tables and writes files:

    >>> found = Result("demo", {"rows": table(column("night", ["2027-11-25"]), column("snr", [12.3]))})
    >>> print(found)
    night         snr
    ──────────  ─────
    2027-11-25  12.30
    >>> found["snr"]
    array([12.3])
    >>> found.qtable().colnames
    ['night', 'snr']
    """

    def qtable(self, name: str = "") -> QTable:
        """Return a table as an astropy QTable with units, header values and sentences in its metadata."""
        return files.to_qtable(self, name)

    def write(self, path: str | Path, table: str = "") -> Path:
        """Write to .ecsv, .csv, .json or .tex by extension, in full precision.

        .json holds everything; the others hold one table (the main one unless named), .ecsv with the
        header in its metadata.

        Raises:
            OutputError: The extension is unknown or the place cannot be written.

        """
        return files.write_result(self, Path(path), table)

    def __str__(self) -> str:
        """Return the result as plain text of at most 100 columns."""
        return terminal.result_text(self)

    def print(self, file: TextIO | None = None) -> None:
        """Print the result to a stream (standard output by default)."""
        print(self, file=file or sys.stdout)

    def _repr_html_(self) -> str:
        """Return the result for a notebook."""
        return terminal.result_html(self)
