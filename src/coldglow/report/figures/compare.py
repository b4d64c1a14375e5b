"""Instruments side by side: clock time to the goal, best first, and what limits each."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import NullFormatter
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look

_ROW_IN = 0.36
_LETTERS = 34
_DECADES = 4  # named along the axis


@look.styled
def comparison(
    labels: Sequence[str],
    time_to_goal_h: NDArray[np.float64],
    limited_by: Sequence[str],
    feasible: NDArray[np.bool_],
) -> Figure:
    """Draw a ruled row per instrument and setting, in the order given, with its time on a log scale.

    `time_to_goal_h`: ndarray[row], inf or nan where the goal is out of reach, as it is beyond 10 000 h;
    `limited_by` says why, or what limits.
    """
    time_to_goal_h = np.where(time_to_goal_h <= words.LONG_H, time_to_goal_h, np.inf)
    count = len(labels)
    left = min(0.3 + 0.068 * max(map(len, labels), default=10), 2.6)
    figure, ((main,),) = look.panels(1.0 + _ROW_IN * count, margins_in=(left, 2.15, 0.45, 0.5))
    finite = time_to_goal_h[np.isfinite(time_to_goal_h)]
    low, high = (float(finite.min()), float(finite.max())) if finite.size else (0.1, 10.0)
    low = 10 ** np.floor(np.log10(low) - 0.3)
    high = min(10 ** np.ceil(np.log10(high) + 0.1), words.LONG_H)
    main.set_xscale("log")
    main.set_xlim(low, high)
    main.set_ylim(count - 0.5, -0.5)
    for row in range(count):
        main.axhline(row, color=look.FAINT, linewidth=0.6, zorder=0)
        time = float(time_to_goal_h[row])
        colour, inside = (look.BLUE, look.BLUE) if feasible[row] else (look.STONE, look.PAPER)
        if np.isfinite(time):
            main.plot([low, time], [row, row], color=colour, linewidth=2)
            main.plot(time, row, "o", color=colour, markerfacecolor=inside, markersize=7)
            says = words.duration(3600 * time) + ("" if feasible[row] else ", not feasible")
        else:
            main.plot(high, row, "x", color=look.BRICK, markersize=6, clip_on=False)
            says = "not feasible"
        _beside(main, row, says, limited_by[row])
    main.set_yticks(range(count), labels)
    decades = np.arange(round(np.log10(low)), round(np.log10(high)) + 1)
    main.set_xticks(10.0 ** decades[:: -(-len(decades) // _DECADES)])
    main.xaxis.set_major_formatter(lambda value, _: words.duration(3600 * value))
    main.xaxis.set_minor_formatter(NullFormatter())
    main.set_xlabel("time on the clock to the goal")
    main.spines["left"].set_visible(False)
    return figure


def _beside(axes: Axes, row: int, says: str, why: str) -> None:
    """Write the time and, smaller below it, the reason at the right of a row."""
    if len(why) > _LETTERS:
        why = why[: _LETTERS - 1].rstrip() + "…"
    for text, size, colour in ((f"{says}\n", 8.5, look.INK), (f"\n{why}", 7.5, look.SOFT)):
        axes.annotate(
            text,
            (1, row),
            xycoords=("axes fraction", "data"),
            xytext=(10, -1),
            textcoords="offset points",
            va="center",
            fontsize=size,
            color=colour,
        )
