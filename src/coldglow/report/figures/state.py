"""Plane of temperature and column: nights needed over it, and how well one visit can tell the two."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.colors import LogNorm
from matplotlib.figure import Figure
from matplotlib.patches import Ellipse, Rectangle
from matplotlib.patheffects import AbstractPathEffect, withStroke
from matplotlib.ticker import MaxNLocator, NullFormatter
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look

_COLUMN = "vertical column (m⁻²)"
_MOST = 1000.0  # nights; more is as good as never
_FAR = 1000.0  # factor; ellipses that reach further are cut by the frame
_HALO: list[AbstractPathEffect] = [withStroke(linewidth=2.2, foreground=look.PAPER)]


@look.styled
def nights_map(
    temperature_k: NDArray[np.float64],
    column_m2: NDArray[np.float64],
    nights_needed: NDArray[np.float64],
    state: tuple[float, float],
    state_error: tuple[float, float],
    when: str,
    years: Sequence[str] = (),
    path_k: NDArray[np.float64] | None = None,
    path_m2: NDArray[np.float64] | None = None,
    budget_nights: float | None = None,
    unit: str = "night",
) -> Figure:
    """Draw the nights needed, ndarray[column, temperature] (inf = never), and the target's way through them.

    The grid has at least two steps each way. `state` is (T in K, N in m-2), `state_error` their 1-sigma
    errors (K, m-2), `when` its year; `path_k`, `path_m2`: ndarray[year], named by `years`; `unit` names what
    is needed, in the singular.
    """
    figure, ((main, scale),) = look.panels(
        4.5, columns=(1, 0.025), margins_in=(0.65, 0.6, 0.4, 0.85), gap_in=(0, 0.3)
    )
    finite = nights_needed[np.isfinite(nights_needed)]
    low = 10 ** np.floor(np.log10(max(float(finite.min()), 0.1))) if finite.size else 1.0
    high = 10 ** np.ceil(np.log10(min(float(finite.max()), _MOST))) if finite.size else 10.0
    high = max(high, 10 * low)
    filled = np.clip(nights_needed, low, 1e3 * high)
    image = main.contourf(
        temperature_k,
        column_m2,
        filled,
        np.geomspace(low, high, round(8 * np.log10(high / low)) + 1),
        norm=LogNorm(low, high),
        cmap=look.GLOW.reversed().with_extremes(over=look.FAINT),
        extend="max",
    )
    main.set_yscale("log")
    look.powers_of_ten(main.yaxis)
    _draw_levels(main, temperature_k, column_m2, filled, high, budget_nights, unit)
    main.set_xlim(float(temperature_k[0]), float(temperature_k[-1]))
    main.set_ylim(float(column_m2[0]), float(column_m2[-1]))
    if path_k is not None and path_m2 is not None and len(path_k) > 1:
        _draw_way(main, years, path_k, path_m2)
    _draw_state(main, state, state_error, when)
    main.set_xlabel("temperature (K)")
    main.set_title(_COLUMN)
    main.legend(loc="upper center", bbox_to_anchor=(0.5, -0.16), ncols=3, borderaxespad=0)
    bar = figure.colorbar(image, cax=scale)
    bar.set_ticks([10.0**power for power in range(round(np.log10(low)), round(np.log10(high)) + 1)])
    bar.outline.set_visible(False)  # type: ignore[operator]
    scale.yaxis.set_major_formatter(lambda value, _: words.short(value))
    scale.yaxis.set_minor_formatter(NullFormatter())
    scale.tick_params(length=0, which="both")
    scale.set_title(f"{unit}s")
    return figure


def _draw_levels(
    axes: Axes,
    temperature_k: NDArray[np.float64],
    column_m2: NDArray[np.float64],
    filled: NDArray[np.float64],
    high: float,
    budget_nights: float | None,
    unit: str,
) -> None:
    """Draw and number the lines of equal nights, and the line of the budget."""
    low, top = float(filled.min()), min(high, float(filled.max()))
    levels = [
        level for level in (0.3, 1, 3, 10, 30, 100, 300) if low < level < top and level != budget_nights
    ]
    if levels:
        lines = axes.contour(temperature_k, column_m2, filled, levels, colors=look.INK, linewidths=0.7)
        names = axes.clabel(lines, fmt=lambda level: words.short(level), fontsize=8, inline_spacing=3)
        for name in names or ():
            name.set_path_effects(_HALO)
    if budget_nights is not None and low < budget_nights < float(filled.max()):
        axes.contour(temperature_k, column_m2, filled, [budget_nights], colors=look.BRICK, linewidths=2)
        axes.plot([], [], color=look.BRICK, label=f"budget {words.count(budget_nights, unit)}")


def _draw_way(
    axes: Axes, years: Sequence[str], path_k: NDArray[np.float64], path_m2: NDArray[np.float64]
) -> None:
    """Draw the coming years; the last is named, earlier ones where their names have room."""
    axes.plot(
        path_k, path_m2, color=look.INK, lw=1.2, marker="o", ms=3.5, mec=look.PAPER, label="coming years"
    )
    place = axes.transAxes.inverted().transform(axes.transData.transform(np.column_stack([path_k, path_m2])))
    taken = [place[0]]
    for i in range(len(place) - 1, 0, -1):
        if min(float(np.hypot(*(place[i] - other))) for other in taken) > 0.1:
            taken.append(place[i])
            axes.annotate(
                years[i],
                (path_k[i], path_m2[i]),
                xytext=(0, -6),
                textcoords="offset points",
                ha="center",
                va="top",
                fontsize=8,
                path_effects=_HALO,
            )


def _draw_state(axes: Axes, state: tuple[float, float], error: tuple[float, float], when: str) -> None:
    angle = np.linspace(0, 2 * np.pi, 100)
    ring = state[1] * np.exp(np.sin(angle) * error[1] / state[1])
    axes.plot(state[0] + error[0] * np.cos(angle), ring, color=look.INK, lw=1.2, path_effects=_HALO)
    axes.plot(
        *state, "*", color=look.INK, mec=look.PAPER, ms=12, linestyle="none", label=f"{when}, ring: its 1σ"
    )


@look.styled
def error_ellipse(
    temperature_k: float,
    column_m2: float,
    covariance: NDArray[np.float64],
    systematic: tuple[float, float] = (0.0, 0.0),
) -> Figure:
    """Draw the 1- and 2-sigma ellipses of temperature and column, and a box of the systematic errors.

    `covariance` is ndarray[2, 2] of (ln N, T in K); `systematic` holds the errors of (ln N, T in K).
    The ellipses contain 39 % and 86 % of the outcomes, as for any two parameters.
    """
    figure, ((main,),) = look.panels(3.9, margins_in=(0.75, 1.9, 0.4, 0.5))
    variances, vectors = np.linalg.eigh(covariance)
    angle = np.degrees(np.arctan2(vectors[0, 1], vectors[1, 1]))
    for sigma, alpha, label in ((2, 0.22, "2σ random (86 %)"), (1, 0.5, "1σ random (39 %)")):
        width, height = 2 * sigma * np.sqrt(np.maximum(variances[::-1], 0))
        main.add_patch(
            Ellipse(
                (temperature_k, 0),
                width,
                height,
                angle=angle,
                color=look.BLUE,
                alpha=alpha,
                lw=0,
                label=label,
            )
        )
    if any(systematic):
        main.add_patch(
            Rectangle(
                (temperature_k - systematic[1], -systematic[0]),
                2 * systematic[1],
                2 * systematic[0],
                fill=False,
                edgecolor=look.BRICK,
                linestyle=look.DASHES[1],
                linewidth=1.4,
                label="1σ systematic",
            )
        )
    main.plot(temperature_k, 0, "+", color=look.INK, markersize=9)
    reach = np.maximum(2.6 * np.sqrt(np.diag(covariance)), 1.5 * np.asarray(systematic))
    reach = np.maximum(reach, (1e-6, 1e-6 * temperature_k))
    reach[0] = min(reach[0], np.log(_FAR))
    main.set_xlim(max(temperature_k - reach[1], 0.0), min(temperature_k + reach[1], _FAR * temperature_k))
    main.set_ylim(-reach[0], reach[0])
    _column_ticks(main, column_m2)
    look.name_axes(main, "temperature (K)", _COLUMN)
    main.grid(axis="x")
    main.legend(loc="upper left", bbox_to_anchor=(1.02, 1.0))
    return figure


def _column_ticks(axes: Axes, column_m2: float) -> None:
    """Write the column at the marks of the logarithmic scale about it."""
    low, high = np.exp(axes.get_ylim()) * column_m2
    write: Callable[[float], str] = look.decade
    if high < 30 * low:
        marks, write = np.asarray(MaxNLocator(6).tick_values(low, high)), words.number
    else:
        marks = 10.0 ** np.arange(np.floor(np.log10(low)), np.ceil(np.log10(high)) + 1)
    marks = marks[(marks > low) & (marks < high)]
    axes.set_yticks(np.log(marks / column_m2), [write(mark) for mark in marks])
