"""How the target fades over the years: temperature, brightness, nights needed, each with its interval."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look

Interval = tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]
"""Lower bound, middle and upper bound, each ndarray[year]."""


@look.styled
def fade(
    year: NDArray[np.float64],
    temperature_k: Interval,
    relative_brightness: Interval,
    nights_needed: Interval,
    budget_nights: float | None = None,
    last_year: float | None = None,
    unit: str = "night",
) -> Figure:
    """Draw three panels over the years; `last_year` is the last in which the budget suffices.

    `unit` names what is needed, in the singular. Nights may be infinite ("never"): they leave the panel at
    its top.
    """
    figure, axes = look.panels(
        6.2, rows=(1, 1, 1), gap_in=(0.42, 0), margins_in=(0.65, 0.3, 0.35, 0.75), sharex=True
    )
    warm, bright, cost = axes[:, 0]
    _band(warm, year, temperature_k)
    look.name_axes(warm, "", "temperature of the ionosphere (K)")
    _band(bright, year, relative_brightness)
    bright.set_yscale("log")
    bright.yaxis.set_major_locator(LogLocator(subs=(1, 2, 5)))
    bright.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{words.short(100 * value)} %"))
    bright.yaxis.set_minor_formatter("")
    look.name_axes(bright, "", "brightness, relative to the first year")
    _nights(cost, year, nights_needed, budget_nights, unit)
    look.name_axes(cost, "year", f"{unit}s needed")
    for panel in axes[:, 0]:
        panel.set_xlim(float(year[0]), float(year[-1]) if len(year) > 1 else float(year[0]) + 1)
        if last_year is not None:
            panel.axvline(last_year, color=look.BRICK, linewidth=1, linestyle=look.DASHES[2])
    cost.xaxis.get_major_locator().set_params(integer=True)
    note = "bands: 16 to 84 % of the trials"
    if last_year is not None:
        note += f"; dotted: last year within the budget, {last_year:.0f}"
    figure.text(0.65 / look.WIDTH, 0.12 / 6.2, note, color=look.SOFT, fontsize=8.5)
    return figure


def _band(axes: Axes, year: NDArray[np.float64], interval: Interval) -> None:
    low, middle, high = interval
    axes.fill_between(year, low, high, color=look.BLUE, alpha=0.2, linewidth=0)
    axes.plot(year, middle, color=look.BLUE, marker="o", markersize=3.5)


def _nights(
    axes: Axes, year: NDArray[np.float64], interval: Interval, budget: float | None, unit: str
) -> None:
    finite = np.concatenate(
        [bound[np.isfinite(bound)] for bound in interval] + [np.array([1.0, budget or 1.0])]
    )
    top = max(3 * min(float(finite.max()), 300 * float(np.median(finite))), 3 * (budget or 0.0))
    low, middle, high = (np.minimum(bound, 10 * top) for bound in interval)
    _band(axes, year, (low, middle, high))
    axes.set_yscale("log")
    axes.set_ylim(min(0.7, 0.7 * float(finite[finite > 0].min())), top)
    look.powers_of_ten(axes.yaxis)
    if budget is not None:
        axes.axhline(budget, color=look.BRICK, linewidth=1, linestyle=look.DASHES[1])
        axes.annotate(
            f"budget {words.count(budget, unit)}", (0, budget), xycoords=("axes fraction", "data"),
            xytext=(4, 4), textcoords="offset points", color=look.BRICK,
        )  # fmt: skip
