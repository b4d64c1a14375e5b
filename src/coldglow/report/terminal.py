"""A result as text: aligned columns under ruled headings, folded to the width of a terminal."""

from __future__ import annotations

import html
import textwrap
from collections.abc import Iterator
from dataclasses import dataclass

from coldglow.report import words
from coldglow.report.tables import Column, Findings, Table

WIDTH = 100
ROWS = 40
FOLDED = 28  # no text is folded to less
_GAP = "  "
_HTML_ROWS = 60


def result_text(result: Findings, width: int = WIDTH, rows: int = ROWS) -> str:
    """Return sentences, tables, header values and warnings, in this order, folded to `width`."""
    blocks = [textwrap.fill(sentence, width) for sentence in result.sentences]
    blocks += [table_text(table, width, rows) for table in result.tables.values() if _printed_rows(table, 1)]
    if result.header:
        blocks.append("\n".join(_header_lines(result, width)))
    if result.warnings:
        notes = (
            textwrap.fill(note, width, initial_indent="! ", subsequent_indent="  ")
            for note in result.warnings
        )
        blocks.append("\n".join(notes))
    return "\n\n".join(blocks)


def _header_lines(result: Findings, width: int) -> Iterator[str]:
    labels = {key: entry.heading(key) for key, entry in result.header.items()}
    indent = min(max(len(label) for label in labels.values()), width // 2) + 2
    for key, entry in result.header.items():
        yield textwrap.fill(
            str(entry), width, initial_indent=labels[key].ljust(indent), subsequent_indent=" " * indent
        )


def table_text(table: Table, width: int = WIDTH, rows: int = ROWS) -> str:
    """Return one table.

    Long texts are folded; columns that still do not fit go into a further panel that repeats the first.
    """
    chosen = list(_printed_rows(table, rows))
    shown = [column for column in table.columns if column.shown]
    with_units = any(column.unit for column in shown)
    blocks = [_Block.of(column, chosen, with_units) for column in shown]
    excess = sum(block.size for block in blocks) + len(_GAP) * (len(blocks) - 1) - width
    widest = max(range(len(blocks)), key=lambda i: (not blocks[i].right, blocks[i].size), default=0)
    if blocks and excess > 0 and not blocks[widest].right and blocks[widest].size > FOLDED:
        fold = max(blocks[widest].size - excess, FOLDED)
        blocks[widest] = _Block.of(shown[widest], chosen, with_units, fold)
    lines = [textwrap.fill(table.caption, width), ""] if table.caption else []
    for number, panel in enumerate(_panels(blocks, width)):
        if number:
            lines.append("")
        height = max(len(block.heading) for block in panel)
        lines += [
            _GAP.join(block.head(index, height) for block in panel).rstrip() for index in range(height + 1)
        ]
        for row in range(len(chosen)):
            tall = max(len(block.cells[row]) for block in panel)
            lines += [_GAP.join(block.cell(row, part) for block in panel).rstrip() for part in range(tall)]
    if len(chosen) < len(table):
        lines.append(f"({len(chosen)} of {len(table)} rows; a file written with --write holds them all)")
    return "\n".join(lines)


def _printed_rows(table: Table, rows: int) -> range | tuple[int, ...]:
    """Return the rows to print; a table with none, empty or meant for files only, is left out."""
    return range(min(len(table), rows)) if table.rows is None else table.rows


@dataclass(frozen=True, slots=True)
class _Block:
    """Heading lines (words folded to the width of the values, then the unit) and cells of one column.

    A cell is a list of lines, more than one where a long text was folded.
    """

    heading: list[str]
    cells: list[list[str]]
    size: int
    right: bool

    @classmethod
    def of(cls, column: Column, rows: list[int], with_units: bool, fold: int = 10_000) -> _Block:
        cells = [textwrap.wrap(text, fold) if len(text) > fold else [text] for text in map(column.text, rows)]
        widest = max((len(line) for cell in cells for line in cell), default=0)
        heading = textwrap.wrap(column.name.replace("_", " "), max(widest, 9), break_long_words=False)
        if with_units:
            heading.append(words.unit(column.unit))
        return cls(heading, cells, max(widest, *map(len, heading)), column.numeric)

    def head(self, index: int, height: int) -> str:
        """Return a line of the heading, flush with the rule below it, or the rule."""
        return self._set(([""] * (height - len(self.heading)) + self.heading + ["─" * self.size])[index])

    def cell(self, row: int, part: int) -> str:
        """Return one of the lines of a cell."""
        return self._set(self.cells[row][part] if part < len(self.cells[row]) else "")

    def _set(self, text: str) -> str:
        return text.rjust(self.size) if self.right else text.ljust(self.size)


def _panels(blocks: list[_Block], width: int) -> Iterator[list[_Block]]:
    panel: list[_Block] = []
    used = 0
    for block in blocks:
        if panel and used + block.size > width:
            yield panel
            panel, used = blocks[:1], blocks[0].size + len(_GAP)
        panel.append(block)
        used += block.size + len(_GAP)
    if panel:
        yield panel


def result_html(result: Findings) -> str:
    """Return the result for a notebook: sentences, tables with scoped headings, header values, warnings."""
    parts = [f"<p>{html.escape(sentence)}</p>" for sentence in result.sentences]
    parts += [table_html(table) for table in result.tables.values() if _printed_rows(table, 1)]
    if result.header:
        rows = (
            f'<tr><th scope="row">{html.escape(entry.heading(key))}</th>'
            f"<td>{html.escape(str(entry))}</td></tr>"
            for key, entry in result.header.items()
        )
        parts.append(f"<table><tbody>{''.join(rows)}</tbody></table>")
    parts += [f"<p><strong>Caution:</strong> {html.escape(note)}</p>" for note in result.warnings]
    return f"<div>{''.join(parts)}</div>"


def table_html(table: Table) -> str:
    """Return one table as HTML."""
    chosen = list(_printed_rows(table, _HTML_ROWS))
    shown = [column for column in table.columns if column.shown]
    caption = table.caption
    if len(chosen) < len(table):
        caption = f"{caption} ({len(chosen)} of {len(table)} rows)".strip()
    heads = "".join(f'<th scope="col">{heading_html(column)}</th>' for column in shown)
    body = "".join(
        f"<tr>{''.join(f'<td>{html.escape(column.text(row))}</td>' for column in shown)}</tr>"
        for row in chosen
    )
    title = f"<caption>{html.escape(caption)}</caption>" if caption else ""
    return f"<table>{title}<thead><tr>{heads}</tr></thead><tbody>{body}</tbody></table>"


def heading_html(column: Column) -> str:
    """Return name, unit and description of a column as the inside of a heading cell."""
    name = html.escape(column.name.replace("_", " "))
    title = f' title="{html.escape(column.description)}"' if column.description else ""
    below = f"<br>{html.escape(words.unit(column.unit))}" if column.unit else ""
    return f"<span{title}>{name}</span>{below}"
