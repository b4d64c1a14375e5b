"""The report as one self-contained page: no script, no network, everything escaped."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from coldglow.report import words
from coldglow.report.figures import look
from coldglow.report.record import Report
from coldglow.report.tables import Column, Table

ROWS = 30


@dataclass(frozen=True, slots=True)
class TableView:
    """A table as a template shows it: caption, headings (name, unit, description, numeric) and cells."""

    caption: str
    headings: tuple[tuple[str, str, str, bool], ...]
    rows: tuple[tuple[str, ...], ...]
    note: str = ""


@lru_cache(maxsize=1)
def templates() -> Environment:
    """Return the templates; every value is escaped unless it is markup that this package made."""
    environment = Environment(
        loader=PackageLoader("coldglow.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.filters["words"] = words.sentence_case
    environment.filters["day"] = words.day
    environment.filters["tie"] = lambda value: str(value).replace("± ", "±\u00a0")
    return environment


def render_page(report: Report, drawings: Mapping[str, str]) -> str:
    """Return the page. `drawings` maps the names of the report's pictures to their SVG texts."""
    inline: dict[str, Markup] = {}
    for picture in report.pictures():
        inline[picture.name] = Markup(look.inline_svg(drawings[picture.name], picture.name))
    views = {name: view(table, f"tables/{name}.ecsv") for name, table in report.tables().items()}
    return render("report.html.j2", report=report, drawings=inline, views=views)


def render(template: str, **context: Any) -> str:
    """Return a template filled in."""
    return templates().get_template(template).render(**context)


def view(table: Table, file: str = "", rows: int = ROWS) -> TableView:
    """Return a table for a template: at most `rows` rows, and where the others are.

    One without rows, because it is empty or meant for files only, becomes a line of text.
    """
    shown = [column for column in table.columns if column.shown]
    chosen = range(min(len(table), rows)) if table.rows is None else table.rows
    note = ""
    if not chosen:
        note = f"{len(table)} rows, in {file}" if file and len(table) else "no rows"
    elif len(chosen) < len(table):
        note = f"{len(chosen)} of {len(table)} rows" + (f"; all of them are in {file}" if file else "")
    return TableView(
        table.caption or "Table",
        tuple(_heading(column) for column in shown),
        tuple(tuple(column.text(row, words.number) for column in shown) for row in chosen),
        note,
    )


def _heading(column: Column) -> tuple[str, str, str, bool]:
    return words.sentence_case(column.name), words.unit(column.unit), column.description, column.numeric
