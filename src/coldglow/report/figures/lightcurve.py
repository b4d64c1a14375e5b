"""The rotational light curve: how the light in the opening changes as the planet turns."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look


@look.styled
def light_curve(
    longitude_deg: NDArray[np.float64],
    relative_brightness: NDArray[np.float64],
    spot_share: NDArray[np.float64] | None = None,
    spot_name: str = "spot",
) -> Figure:
    """Draw the light over its mean against the central longitude and, below, the share of a spot in it.

    All are ndarray[time], over one turn in order of time.
    """
    rows = (1,) if spot_share is None else (1, 0.7)
    figure, axes = look.panels(
        2.6 if spot_share is None else 4.0, rows=rows, margins_in=(0.6, 0.25, 0.35, 0.5)
    )
    order = np.argsort(longitude_deg, kind="stable")
    curves = [(relative_brightness, "light in the opening, over its mean", look.BLUE)]
    if spot_share is not None:
        curves.append((spot_share, f"share of {spot_name} in it", look.BRICK))
    for row, (values, name, colour) in zip(axes[:, 0], curves, strict=True):
        row.plot(longitude_deg[order], values[order], color=colour)
        row.set_xlim(0, 360)
        row.set_xticks(range(0, 361, 60))
        look.name_axes(row, "central longitude (°)" if row is axes[-1, 0] else "", name)
    axes[0, 0].axhline(1, color=look.SOFT, linewidth=1, linestyle=look.DASHES[1])
    if spot_share is not None:
        axes[1, 0].set_ylim(0, None)
        axes[1, 0].yaxis.set_major_formatter(lambda value, _: f"{words.short(100 * value)} %")
    return figure
