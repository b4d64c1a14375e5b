"""Text, numbers, units and tables for TeX, with everything special escaped."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable, Sequence

from coldglow.report import words
from coldglow.report.tables import Column

_GREEK = {
    "α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "ε": "epsilon", "θ": "theta",
    "κ": "kappa", "λ": "lambda", "ν": "nu", "π": "pi", "ρ": "rho", "σ": "sigma", "τ": "tau",
    "φ": "phi", "χ": "chi", "ω": "omega", "Δ": "Delta", "Ω": "Omega",
}  # fmt: skip
_SPECIAL = {
    "\\": r"\textbackslash{}",
    "{": r"\{",
    "}": r"\}",
    "$": r"\$",
    "&": r"\&",
    "#": r"\#",
    "%": r"\%",
    "_": r"\_",
    "^": r"\textasciicircum{}",
    "~": r"\textasciitilde{}",
    "<": r"\textless{}",
    ">": r"\textgreater{}",
    "±": r"$\pm$",
    "×": r"$\times$",
    "−": r"$-$",
    "–": "--",
    "≥": r"$\geq$",
    "≤": r"$\leq$",
    "∞": r"$\infty$",
    "°": r"$^{\circ}$",
    "″": r"$''$",
    "′": r"$'$",
    "µ": r"$\mu$",
    **{letter: f"$\\{name}$" for letter, name in _GREEK.items()},
    "·": r"$\cdot$",
    "⁺": r"$^{+}$",
    **{digit: f"$_{{{value}}}$" for value, digit in enumerate("₀₁₂₃₄₅₆₇₈₉")},
    "…": r"\ldots{}",
    "’": "'",
    "‘": "`",
    "“": "``",
    "”": "''",
    "—": "---",
    "\u00a0": "~",
    "\u2009": r"\,",
}
_LETTERS = "ßæœøÆŒØŁłÐðÞþ"  # beside the accented ones
_RAISED = dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-", strict=True))


def escape(text: str) -> str:
    r"""Return a text that TeX prints as it stands; a run of raised digits becomes one exponent.

    Latin letters with accents stay (a UTF-8 TeX knows them); other characters that have no entry here are
    reduced to their plain form, or become a question mark. A line break becomes a space.
    """
    pieces: list[str] = []
    raised = ""
    for character in " ".join(text.split("\n")):
        if character in _RAISED:
            raised += _RAISED[character]
            continue
        if raised:
            pieces.append(f"$^{{{raised}}}$")
            raised = ""
        pieces.append(_SPECIAL.get(character) or _plain(character))
    if raised:
        pieces.append(f"$^{{{raised}}}$")
    return "".join(pieces)


def _plain(character: str) -> str:
    """Return a character that a UTF-8 TeX knows: itself, its plain form, or a question mark."""
    plain = unicodedata.normalize("NFKD", character).encode("ascii", "ignore").decode()
    if " " <= character <= "~" or character in _LETTERS or (plain.isalpha() and character < "\u0180"):
        return character
    if not character.isprintable():
        return ""
    return "".join(_SPECIAL.get(part, part) for part in plain) or "?"


def number(text: str) -> str:
    r"""Return the text of a number as TeX: ``1.5e-3`` becomes ``$1.5\times10^{-3}$``."""
    if text in ("nan", words.NOTHING):
        return "--"
    if text in ("inf", "-inf"):
        return r"$\infty$" if text == "inf" else r"$-\infty$"
    mantissa, _, exponent = text.partition("e")
    return f"${mantissa}\\times10^{{{int(exponent)}}}$" if exponent else f"${mantissa}$"


def unit(name: str) -> str:
    """Return a unit in upright letters with raised exponents."""
    return escape(words.unit(name))


def tabular(columns: Sequence[Column], cell: Callable[[Column, int], str]) -> str:
    """Return a ``tabular`` with names and units as its heading; `cell` gives the TeX of one value."""
    layout = "".join("r" if column.numeric else "l" for column in columns)
    names = " & ".join(escape(column.name.replace("_", " ")) for column in columns)
    units = " & ".join(unit(column.unit) for column in columns)
    rows = [
        " & ".join(cell(column, row) for column in columns) + r" \\" for row in range(len(columns[0].values))
    ]
    head = [rf"\begin{{tabular}}{{{layout}}}", r"\hline", names + r" \\", units + r" \\", r"\hline"]
    return "\n".join([*head, *rows, r"\hline", r"\end{tabular}"])
