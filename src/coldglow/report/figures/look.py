"""The look that all figures share, and how they become SVG or PDF that are the same byte for byte.

The colours differ in lightness as well as in hue, so that they stay apart for colour-blind eyes and in
grey; lines differ in dashes too. The name of the quantity on the vertical axis stands above its axis,
level, where it can be read.
"""

from __future__ import annotations

import functools
import io
import re
from collections.abc import Callable, Sequence
from typing import Any, ParamSpec

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.colors import LinearSegmentedColormap
from matplotlib.figure import Figure
from matplotlib.ticker import NullFormatter
from numpy.typing import NDArray

from coldglow.report import words

INK, SOFT, FAINT, PAPER = "#1e2a36", "#5c6875", "#d3d9df", "#fcfbf8"
BLUE, AMBER, BRICK, TEAL, PLUM, STONE = "#1d5596", "#dd9a1f", "#b8442f", "#4f9d96", "#74478f", "#97a1ab"
SERIES = (BLUE, AMBER, BRICK, TEAL, PLUM, STONE)
DASHES: tuple[Any, ...] = ("-", (0, (6, 2)), (0, (2, 1.5)), (0, (8, 2, 2, 2)), (0, (4, 1, 1, 1, 1, 1)), ":")
GLOW = LinearSegmentedColormap.from_list(
    "glow", ["#14233f", "#1f4e79", "#2f8287", "#7bb274", "#d6cf6a", "#f8e58c"]
)
"""Dark to light without a turn, from blue to yellow: keeps its order in grey and for colour-blind eyes."""

THEMED = {
    INK: "ink", SOFT: "soft", FAINT: "faint", PAPER: "paper", BLUE: "blue", AMBER: "amber", BRICK: "brick",
    TEAL: "teal", PLUM: "plum", STONE: "stone",
}  # fmt: skip
"""Colours that a page replaces by its own light or dark ones."""

WIDTH = 6.6
_STYLE: dict[str, Any] = {
    "font.family": ["DejaVu Sans"],
    "font.size": 9.0,
    "text.color": INK,
    "axes.labelcolor": SOFT,
    "axes.edgecolor": SOFT,
    "axes.facecolor": "none",
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.titlelocation": "left",
    "axes.titlesize": 9.0,
    "axes.titlecolor": INK,
    "axes.titlepad": 7.0,
    "axes.labelsize": 9.0,
    "axes.unicode_minus": True,
    "grid.color": FAINT,
    "grid.linewidth": 0.6,
    "xtick.color": SOFT,
    "ytick.color": SOFT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.labelsize": 8.5,
    "ytick.labelsize": 8.5,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "xtick.major.size": 3.5,
    "ytick.major.size": 0.0,
    "xtick.minor.size": 2.0,
    "ytick.minor.size": 0.0,
    "legend.frameon": False,
    "legend.fontsize": 8.5,
    "lines.linewidth": 1.8,
    "lines.solid_capstyle": "butt",
    "figure.facecolor": PAPER,
    "savefig.facecolor": "auto",
    "hatch.linewidth": 0.5,
    "svg.fonttype": "path",
    "svg.hashsalt": "coldglow",
    "pdf.fonttype": 42,
}

_P = ParamSpec("_P")


def styled(draw: Callable[_P, Figure]) -> Callable[_P, Figure]:
    """Let a drawing function work in the look of this module, whatever the user's own settings are."""

    @functools.wraps(draw)
    def wrapper(*args: _P.args, **kwargs: _P.kwargs) -> Figure:
        with _style():
            return draw(*args, **kwargs)

    return wrapper


def _style() -> Any:
    settings: dict[Any, Any] = {**matplotlib.rcParamsDefault, "backend": "agg", **_STYLE}
    return matplotlib.rc_context(settings)


def panels(
    height_in: float,
    rows: Sequence[float] = (1,),
    columns: Sequence[float] = (1,),
    margins_in: tuple[float, float, float, float] = (0.55, 0.2, 0.35, 0.5),
    gap_in: tuple[float, float] = (0.5, 0.5),
    **more: Any,
) -> tuple[Figure, NDArray[Any]]:
    """Return a figure and its axes, ndarray[row, column], with margins (left, right, top, bottom) in inches.

    `rows` and `columns` are relative sizes, `gap_in` the space between rows and between columns.
    """
    figure = Figure(figsize=(WIDTH, height_in))
    left, right, top, bottom = margins_in
    inner_height, inner_width = height_in - top - bottom, WIDTH - left - right
    row_height = (inner_height - gap_in[0] * (len(rows) - 1)) / len(rows)
    column_width = (inner_width - gap_in[1] * (len(columns) - 1)) / len(columns)
    axes = figure.subplots(
        len(rows),
        len(columns),
        squeeze=False,
        gridspec_kw={
            "height_ratios": rows,
            "width_ratios": columns,
            "left": left / WIDTH,
            "right": 1 - right / WIDTH,
            "top": 1 - top / height_in,
            "bottom": bottom / height_in,
            "hspace": gap_in[0] / row_height,
            "wspace": gap_in[1] / column_width,
        },
        **more,
    )
    return figure, axes


def name_axes(axes: Axes, across: str, up: str) -> None:
    """Name the axes: the vertical one level above its axis, the horizontal one below."""
    axes.set_xlabel(across)
    axes.set_title(up)
    axes.grid(axis="y")
    axes.set_axisbelow(True)


def powers_of_ten(axis: Axis) -> None:
    """Write the decades of a logarithmic axis plainly near 1, as powers elsewhere."""
    axis.set_major_formatter(lambda value, _: decade(value))
    axis.set_minor_formatter(NullFormatter())


def decade(value: float) -> str:
    """Return a power of ten as text: ``0.001`` to ``10000``, else ``10⁻⁹``."""
    exponent = round(np.log10(value))
    return words.short(value) if -4 < exponent < 5 else f"10{words.raised(exponent)}"


def as_svg(figure: Figure) -> str:
    """Return the figure as SVG text, the same for the same figure."""
    stream = io.StringIO()
    with _style():
        figure.savefig(stream, format="svg", metadata={"Date": None, "Creator": None})
    return stream.getvalue()


def as_pdf(figure: Figure) -> bytes:
    """Return the figure as PDF, without a date."""
    stream = io.BytesIO()
    with _style():
        figure.savefig(stream, format="pdf", metadata={"CreationDate": None})
    return stream.getvalue()


def inline_svg(svg: str, name: str) -> str:
    """Return an SVG to stand inside a page among others.

    The XML prologue goes, every id gets the figure's name, and the colours of the look become the page's
    own (CSS variables ``--figure-ink`` and so on, with the original colour where a page has none).
    """
    body = svg[svg.index("<svg") :]
    body = re.sub(r"<metadata>.*?</metadata>\s*", "", body, flags=re.S)
    body = re.sub(r'\bid="', f'id="{name}-', body)
    body = re.sub(r'((?:xlink:)?href="#|url\(#)', rf"\g<1>{name}-", body)
    for colour, role in THEMED.items():
        body = body.replace(f": {colour}", f": var(--figure-{role}, {colour})")
    return re.sub(r'^<svg ([^>]*?)width="[^"]*" ([^>]*?)height="[^"]*"', r"<svg \1\2", body, count=1)
