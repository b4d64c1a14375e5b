"""The chosen nights one by one: how high the target stands and which longitude faces us."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.colors import BoundaryNorm, ListedColormap
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look

_NAMED = 9


@dataclass(frozen=True, slots=True, eq=False)
class NightCurve:
    """One night: ndarray[time] of hours from 0 UTC of the evening date, degrees, and what is chosen."""

    night: str
    hour_utc: NDArray[np.float64]
    altitude_deg: NDArray[np.float64]
    longitude_deg: NDArray[np.float64]
    chosen: NDArray[np.bool_]


@look.styled
def chosen_nights(
    curves: Sequence[NightCurve], altitude_min_deg: float = 0.0, longitude_name: str = "central longitude"
) -> Figure:
    """Draw altitude and central longitude of the chosen nights against the hour; chosen parts are thick.

    Few nights are named; more than nine are told apart by colour only, from early to late.
    """
    figure, ((high,), (turn,)) = look.panels(
        5.2, rows=(1, 1), gap_in=(0.45, 0), margins_in=(0.5, 1.45, 0.35, 0.5), sharex=True
    )
    few = len(curves) <= len(look.SERIES)
    shades: Sequence[Any] = look.SERIES if few else list(look.GLOW(np.linspace(0.3, 0.9, len(curves))))
    for curve, shade, rank in zip(curves, shades, range(len(curves)), strict=False):
        dash = look.DASHES[rank] if few else "-"
        _draw(high, curve, curve.altitude_deg, shade, dash)
        _draw(turn, curve, _unbroken(curve.longitude_deg), shade, dash)
    if altitude_min_deg > 0:
        high.axhline(altitude_min_deg, color=look.BRICK, linewidth=1)
        high.annotate(
            f"limit {words.short(altitude_min_deg)}°",
            (0, altitude_min_deg),
            xycoords=("axes fraction", "data"),
            xytext=(4, 3),
            textcoords="offset points",
            color=look.BRICK,
            fontsize=8.5,
            path_effects=[withStroke(linewidth=2.5, foreground=look.PAPER)],
        )
    high.set_ylim(0, 90)
    high.set_yticks(range(0, 91, 30), [f"{mark}°" for mark in range(0, 91, 30)])
    turn.set_ylim(0, 360)
    turn.set_yticks(range(0, 361, 90), [f"{mark}°" for mark in range(0, 361, 90)])
    look.name_axes(high, "", "altitude")
    look.name_axes(turn, "hour of the night (UTC)", longitude_name)
    first = min(float(curve.hour_utc[0]) for curve in curves)
    last = max(float(curve.hour_utc[-1]) for curve in curves)
    marks = np.arange(np.ceil(first), last + 1e-9, 1 if last - first <= 10 else 2)
    turn.set_xlim(first, last)
    turn.set_xticks(marks, [f"{round(mark) % 24:02d}" for mark in marks])
    if len(curves) <= _NAMED:
        high.legend(loc="upper left", bbox_to_anchor=(1.02, 1.02), title="evening of", alignment="left")
    else:
        _date_scale(figure, curves, shades)
    return figure


def _draw(axes: Axes, curve: NightCurve, values: NDArray[np.float64], shade: Any, dash: Any) -> None:
    axes.plot(curve.hour_utc, values, color=shade, linewidth=0.8, linestyle=dash)
    thick = np.where(curve.chosen, values, np.nan)
    axes.plot(curve.hour_utc, thick, color=shade, linewidth=3, linestyle=dash, label=words.day(curve.night))


def _unbroken(longitude_deg: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the longitudes with a gap (nan) at each passage of 0/360."""
    broken = longitude_deg.astype(float).copy()
    broken[1:][np.abs(np.diff(longitude_deg)) > 180] = np.nan
    return broken


def _date_scale(figure: Figure, curves: Sequence[NightCurve], shades: Sequence[Any]) -> None:
    cax = figure.add_axes((0.8, 0.12, 0.02, 0.26))
    norm = BoundaryNorm(np.arange(len(curves) + 1), len(curves))
    bar = figure.colorbar(ScalarMappable(norm, ListedColormap(shades)), cax=cax)
    bar.outline.set_visible(False)
    ends = (0, len(curves) - 1)
    bar.set_ticks([i + 0.5 for i in ends], labels=[words.day(curves[i].night) for i in ends])
    cax.tick_params(length=0)
    cax.set_title("evening of")
