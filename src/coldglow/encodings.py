"""Terminals and pipes whose encoding lacks some of our characters: they get plain ones instead."""

from __future__ import annotations

import codecs
import unicodedata
from io import TextIOWrapper
from typing import TextIO

PLAIN = {
    "″": '"', "′": "'", "“": '"', "”": '"', "‘": "'", "’": "'", "−": "-", "⁻": "-", "⁺": "+", "–": "-",
    "—": "-", "─": "-", "±": "+-", "×": "x", "·": ".", "°": "deg", "∞": "inf", "≥": ">=", "≤": "<=",
    "µ": "u", "μ": "u",
}  # fmt: skip


def allow_any_encoding(*streams: TextIO) -> None:
    """Let the streams write what their encoding lacks in plain characters."""
    codecs.register_error("coldglow-plain", _instead)
    for stream in streams:
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="coldglow-plain")


def plain_character(character: str) -> str:
    """Return a character in ASCII: by the table, the name of a Greek letter, its plain form, or '?'."""
    if character in PLAIN:
        return PLAIN[character]
    name = unicodedata.name(character, "")
    if name.startswith("GREEK SMALL LETTER ") and name.count(" ") == 3:
        return name.rpartition(" ")[2].lower()
    letters = unicodedata.normalize("NFKD", character).encode("ascii", "ignore").decode("ascii")
    return letters or "?"


def _instead(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    return "".join(map(plain_character, error.object[error.start : error.end])), error.end
