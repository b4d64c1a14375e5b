"""SNR against time, and which source of noise takes which share of the variance."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look


@look.styled
def snr_against_time(
    clock_h: NDArray[np.float64],
    snr: NDArray[np.float64],
    shares: Mapping[str, float],
    goal: float | None = None,
    time_to_goal_h: float = np.inf,
    snr_low: NDArray[np.float64] | None = None,
    snr_high: NDArray[np.float64] | None = None,
    probability: float | None = None,
) -> Figure:
    """Draw the SNR after a time on the clock, with the goal, above a bar of the variance shares.

    `clock_h`, `snr`, `snr_low`, `snr_high`: ndarray[time]; the latter two are the 1-sigma range that the
    uncertain brightness allows. `shares` sum to 1. An infinite `time_to_goal_h` is said in words;
    `probability` is the one with which the measured SNR reaches the goal by then (none: at expectation).
    """
    figure, ((main,), (bar,)) = look.panels(
        4.0, rows=(1, 0.1), gap_in=(0.95, 0), margins_in=(0.5, 0.25, 0.35, 0.75)
    )
    if snr_low is not None and snr_high is not None:
        main.fill_between(clock_h, snr_low, snr_high, color=look.BLUE, alpha=0.18, linewidth=0)
    main.plot(clock_h, snr, color=look.BLUE)
    main.set_xlim(0, float(clock_h[-1]))
    top = float(np.nan_to_num(snr if snr_high is None else snr_high).max())
    main.set_ylim(0, 1.12 * max(top, 0.0 if goal is None else goal, 1e-3))
    look.name_axes(main, "time on the clock, overheads included (h)", "SNR of the H₃⁺ lines")
    if goal is not None:
        _mark_goal(main, clock_h, snr, goal, time_to_goal_h, probability)
    _share_bar(bar, shares)
    return figure


def _mark_goal(
    main: Axes,
    clock_h: NDArray[np.float64],
    snr: NDArray[np.float64],
    goal: float,
    time_to_goal_h: float,
    probability: float | None,
) -> None:
    """Draw the goal and mark the curve where it is reached: above the goal when a probability is wanted."""
    main.axhline(goal, color=look.BRICK, linewidth=1, linestyle=look.DASHES[1])
    after = words.duration(3600 * time_to_goal_h)
    if time_to_goal_h <= clock_h[-1]:
        height = float(np.interp(time_to_goal_h, clock_h, snr))
        main.plot([time_to_goal_h] * 2, [0, height], color=look.BRICK, linewidth=1)
        main.plot(time_to_goal_h, height, "o", color=look.BRICK, markersize=5)
        says = f"after {after}"
    else:
        says = "is never reached" if np.isinf(time_to_goal_h) else f"needs {after}"
    sure = (
        "" if probability is None or np.isinf(time_to_goal_h) else f" (with {words.probability(probability)})"
    )
    main.set_title(f"goal {words.short(goal)} {says}{sure}", loc="right", color=look.BRICK)


def _share_bar(bar: Axes, shares: Mapping[str, float]) -> None:
    """Draw one stacked bar; wide shares carry their name, all are listed below in the same order."""
    bar.set_xlim(0, 1)
    bar.set_ylim(0, 1)
    bar.axis("off")
    if not shares:
        return
    bar.set_title("share of the variance")
    start = 0.0
    ranked = sorted(shares.items(), key=lambda item: -item[1])
    for index, (name, share) in enumerate(ranked):
        colour = look.SERIES[index % len(look.SERIES)]
        bar.barh(
            0.5,
            share,
            1,
            start,
            color=colour,
            edgecolor=look.PAPER,
            linewidth=1,
            label=f"{name} {_percent(share)}",
        )
        start += share
    bar.legend(
        loc="upper left",
        bbox_to_anchor=(-0.01, -0.1),
        ncols=3,
        handlelength=0.9,
        handleheight=0.9,
        columnspacing=1.5,
    )


def _percent(share: float) -> str:
    return words.percent(share) if share >= 0.001 else "< 0.1 %"
