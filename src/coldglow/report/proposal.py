"""Text for the proposal: a justification in TeX and in Markdown, and its bibliography.

A paragraph is plain text in which ``[@key]`` or ``[@one; @two]`` cites references by their keys.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from coldglow.report import tex, words
from coldglow.report.references import METHODS, Reference
from coldglow.report.tables import Column, Entry, Table

_CITATION = re.compile(r"\[(@[\w:-]+(?:;\s*@[\w:-]+)*)\]")

_HEAD = r"""% Compiles on its own (pdflatex, bibtex with references.bib) and by \input in a document of yours.
\expandafter\ifx\csname @notprerr\endcsname\documentclass
  \let\coldglowend\relax
\else
  \documentclass[11pt]{article}
  \usepackage[utf8]{inputenc}
  \usepackage[T1]{fontenc}
  \begin{document}
  \def\coldglowend{\bibliographystyle{plain}\bibliography{references}\end{document}}
\fi
"""


@dataclass(frozen=True, slots=True, eq=False)
class Justification:
    """What a proposal says: a title, paragraphs, the headline numbers by name, and a table of the nights."""

    title: str
    paragraphs: Sequence[str]
    numbers: Sequence[tuple[str, Entry]] = ()
    nights: Table | None = None
    references: Sequence[Reference] = METHODS

    def cited(self) -> tuple[Reference, ...]:
        """Return the references that the paragraphs cite, in the order of the list.

        Raises: KeyError for a key that no reference has.
        """
        keys = {key for text in self.paragraphs for group in _CITATION.findall(text) for key in _keys(group)}
        unknown = keys - {reference.key for reference in self.references}
        if unknown:
            raise KeyError(f"no reference has the key {', '.join(sorted(unknown))}")
        return tuple(reference for reference in self.references if reference.key in keys)


def _keys(group: str) -> list[str]:
    return [part.strip().removeprefix("@") for part in group.split(";")]


def justification_tex(text: Justification) -> str:
    r"""Return the justification as TeX that compiles alone and by ``\input``."""
    parts = [_HEAD, rf"\section*{{{tex.escape(text.title)}}}", ""]
    for paragraph in text.paragraphs:
        parts += [_with_citations(paragraph, tex.escape, lambda keys: rf"\cite{{{','.join(keys)}}}"), ""]
    if text.numbers:
        rows = [rf"{tex.escape(name)} & {tex.escape(rounded(entry))} \\" for name, entry in text.numbers]
        parts += [r"\begin{center}", r"\begin{tabular}{ll}", r"\hline", *rows, r"\hline", r"\end{tabular}"]
        parts += [r"\end{center}", ""]
    if text.nights is not None:
        shown = [column for column in text.nights.columns if column.shown]
        body = tex.tabular(shown, _cell)
        caption = tex.escape(text.nights.caption)
        parts += [r"\begin{center}", rf"{caption}\\[1ex]", r"\small", body, r"\end{center}", ""]
    return "\n".join([*parts, r"\coldglowend", ""])


def _cell(column: Column, row: int) -> str:
    return tex.escape(column.text(row, words.number))


def justification_markdown(text: Justification) -> str:
    """Return the same text as Markdown, references written out at the end."""
    short = {reference.key: reference.short for reference in text.references}
    parts = [f"# {_markdown(text.title)}", ""]
    for paragraph in text.paragraphs:
        cite = _with_citations(
            paragraph, _markdown, lambda keys: f"({_markdown('; '.join(short[key] for key in keys))})"
        )
        parts += [cite, ""]
    if text.numbers:
        parts += ["| Quantity | Value |", "|---|---|"]
        parts += [f"| {_markdown(name)} | {_markdown(rounded(entry))} |" for name, entry in text.numbers]
        parts.append("")
    if text.nights is not None:
        parts += [_markdown(text.nights.caption), "", *_markdown_rows(text.nights), ""]
    if text.cited():
        parts += ["## References", "", *(f"* {_markdown(reference.full)}" for reference in text.cited()), ""]
    return "\n".join(parts)


def _markdown_rows(table: Table) -> list[str]:
    shown = [column for column in table.columns if column.shown]
    heads = [
        words.sentence_case(column.name) + (f" ({words.unit(column.unit)})" if column.unit else "")
        for column in shown
    ]
    rows = [[column.text(row, words.number) for column in shown] for row in range(len(table))]
    ruler = "|".join("---:" if column.numeric else "---" for column in shown)
    lines = ["| " + " | ".join(map(_markdown, cells)) + " |" for cells in (heads, *rows)]
    return [lines[0], f"|{ruler}|", *lines[1:]]


def bibliography(references: Sequence[Reference]) -> str:
    """Return the references as a BibTeX file."""
    return "\n".join(_bibtex(reference) for reference in references)


def _bibtex(reference: Reference) -> str:
    fields = {
        "author": " and ".join(map(tex.escape, reference.authors)),
        "year": str(reference.year),
        "title": "{" + tex.escape(reference.title) + "}",
        "journal": tex.escape(reference.journal),
        "volume": tex.escape(reference.volume),
        "pages": tex.escape(reference.page),
        "doi": reference.doi,
    }
    lines = [f"  {name} = {{{value}}}," for name, value in fields.items() if value]
    return "\n".join([f"@article{{{reference.key},", *lines, "}", ""])


def rounded(entry: Entry) -> str:
    """Return a headline number as a careful author writes it.

    The digits follow the larger of the random and the systematic error, so that no digit is printed that
    the data cannot bear.
    """
    errors = [error for error in (entry.random_error, entry.systematic_error) if error is not None]
    if entry.text or not errors or isinstance(entry.value, str | bool):
        return str(entry)
    value = float(entry.value)
    if len(errors) == 1:
        kind = "random" if entry.systematic_error is None else "systematic"
        return f"{words.with_error(value, errors[0], entry.unit)} ({kind})"
    return words.with_errors(value, errors[0], errors[1], entry.unit)


def _with_citations(paragraph: str, escape: Callable[[str], str], cite: Callable[[list[str]], str]) -> str:
    pieces = _CITATION.split(paragraph)
    return "".join(cite(_keys(piece)) if index % 2 else escape(piece) for index, piece in enumerate(pieces))


def _markdown(text: str) -> str:
    """Return a text in which Markdown sees nothing special."""
    return re.sub(r"([\\`*_{}\[\]<>#|$~])", r"\\\1", " ".join(text.split("\n")))
