"""The report as a record: everything that the page and the folder show, already in words and pictures."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from matplotlib.figure import Figure

from coldglow.report.results import Entry, Result, Table


@dataclass(frozen=True, slots=True, eq=False)
class Picture:
    """A figure: name of its files (letters, digits, hyphens), text in its stead, and what to see.

    `alt` says what a reader who cannot see the figure needs; `caption` tells the others what to look at.
    """

    name: str
    figure: Figure
    alt: str
    caption: str


@dataclass(frozen=True, slots=True, eq=False)
class Section:
    """A part of the report: sentences, then pictures, then tables (name of the file -> table)."""

    title: str
    sentences: Sequence[str] = ()
    pictures: Sequence[Picture] = ()
    tables: Mapping[str, Table] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Assumption:
    """A value that the user did not write: what it is, its value in words, and where it comes from."""

    what: str
    value: str
    origin: str


@dataclass(frozen=True, slots=True, eq=False)
class Report:
    """A whole report. `verdict` is a few words ("Feasible in 3 nights"); `answer` the sentences below it.

    `figures_of_merit` are the headline numbers; `inputs` maps what the user asked for to words;
    `versions` names each program and data set with its version.
    """

    title: str
    verdict: str
    feasible: bool
    answer: Sequence[str]
    figures_of_merit: Mapping[str, Entry] = field(default_factory=dict)
    sections: Sequence[Section] = ()
    inputs: Mapping[str, str] = field(default_factory=dict)
    assumptions: Sequence[Assumption] = ()
    sources: Sequence[str] = ()
    cautions: Sequence[str] = ()
    versions: Mapping[str, str] = field(default_factory=dict)
    seed: int | None = None

    def pictures(self) -> tuple[Picture, ...]:
        """Return all pictures in order."""
        return tuple(picture for section in self.sections for picture in section.pictures)

    def tables(self) -> dict[str, Table]:
        """Return all tables in order, by the names of their files."""
        return {name: table for section in self.sections for name, table in section.tables.items()}

    def as_result(self, command: str = "plan") -> Result:
        """Return tables, headline numbers, answer and cautions as a result that prints and is stored."""
        return Result(
            command, self.tables(), self.figures_of_merit, self.answer, self.cautions, self.feasible
        )
