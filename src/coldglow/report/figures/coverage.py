"""Which longitudes the chosen visits cover, and how well each bin meets its goal."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import LineCollection
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from numpy.typing import NDArray

from coldglow.report.figures import look

_PIECES = 40
_FAR = 12.0  # times the goal


@dataclass(frozen=True, slots=True, eq=False)
class VisitTrack:
    """One chosen visit: label, and ndarray[time] of central longitude (degrees) and information rate."""

    label: str
    longitude_deg: NDArray[np.float64]
    rate: NDArray[np.float64]


@look.styled
def coverage(
    visits: Sequence[VisitTrack],
    bin_edges_deg: NDArray[np.float64],
    reached: NDArray[np.float64],
    goal: float,
    reachable: NDArray[np.bool_],
    reached_name: str = "SNR per bin",
    rate_name: str = "SNR of one hour",
    longitude_name: str = "central longitude (°)",
) -> Figure:
    """Draw, over longitude, what each bin has gathered against its goal, and below it the visits in time.

    `bin_edges_deg`: ndarray[bin + 1]; `reached`, `reachable`: ndarray[bin]. Bins that no visit can reach
    are hatched and say so; bins below their goal are marked by colour and by an open top.
    """
    room = min(0.24 * max(len(visits), 3), 5.0)
    longest = max((len(visit.label) for visit in visits), default=0)
    names_in = min(max(1.3, 0.25 + 0.07 * longest), 2.6)
    figure, ((bins, blank), (rows, scale)) = look.panels(
        2.75 + room,
        rows=(1.35, room),
        columns=(1, 0.022),
        gap_in=(0.55, 0.2),
        margins_in=(names_in, 0.5, 0.35, 0.5),
    )
    blank.axis("off")
    width = np.diff(bin_edges_deg)
    reached = np.nan_to_num(reached)
    met = reached >= goal * (1 - 1e-9)
    bins.bar(
        bin_edges_deg[:-1][met], reached[met], width[met], align="edge", color=look.BLUE, edgecolor=look.PAPER
    )
    short = ~met & reachable
    bins.bar(
        bin_edges_deg[:-1][short],
        reached[short],
        width[short],
        align="edge",
        color=look.AMBER,
        edgecolor=look.PAPER,
    )
    most = max(float(reached.max()), goal)
    far = most > _FAR * goal  # the goal would be lost at the foot of an even scale
    top = 2.5 * most if far else 1.25 * most
    bins.bar(
        bin_edges_deg[:-1][~reachable], np.full((~reachable).sum(), top), width[~reachable], align="edge",
        facecolor="none", edgecolor=look.STONE, hatch="////", linewidth=0,
    )  # fmt: skip
    bins.axhline(goal, color=look.BRICK, linewidth=1.2, linestyle=look.DASHES[1])
    bins.annotate(
        "goal", (1, goal), xycoords=("axes fraction", "data"), xytext=(4, -3), textcoords="offset points",
        color=look.BRICK,
    )  # fmt: skip
    if far:
        bins.set_yscale("log")
        look.powers_of_ten(bins.yaxis)
    bins.set_ylim(0.3 * goal if far else 0.0, top)
    look.name_axes(bins, "", reached_name)
    handles = [
        (met, look.BLUE, "", "goal met"),
        (short, look.AMBER, "", "goal missed"),
        (~reachable, "none", "////", "out of reach"),
    ]
    shown = [
        bins.fill_between(
            [], [], [], facecolor=colour, hatch=hatch, edgecolor=look.STONE if hatch else "none", label=name
        )
        for present, colour, hatch, name in handles
        if present.any()
    ]
    bins.legend(
        handles=shown,
        loc="lower right",
        bbox_to_anchor=(1.0, 1.0),
        ncols=3,
        handlelength=1,
        handleheight=0.9,
        borderaxespad=0,
    )
    _visit_rows(figure, rows, scale, visits, bin_edges_deg, rate_name)
    rows.set_xlabel(longitude_name)
    for axes in (bins, rows):
        axes.set_xlim(0, 360)
        axes.set_xticks(range(0, 361, 60))
    return figure


def _visit_rows(
    figure: Figure,
    rows: Axes,
    scale: Axes,
    visits: Sequence[VisitTrack],
    edges: NDArray[np.float64],
    rate_name: str,
) -> None:
    """Draw one row per visit, first on top, as a line whose colour is the information rate."""
    largest = max((float(np.nanmax(visit.rate)) for visit in visits), default=1.0)
    norm = Normalize(0, largest)
    for row, visit in enumerate(visits):
        every = max(1, len(visit.rate) // _PIECES)
        x, rate = np.asarray(visit.longitude_deg, float)[::every], np.asarray(visit.rate)[::every]
        step = np.diff(x)
        keep = np.abs(step) < 180
        # every piece reaches a little under the next one, so that no seam shows between them
        pieces = np.column_stack([x[:-1], x[:-1] + 2.2 * step])
        ends = np.stack([pieces, np.full((len(x) - 1, 2), float(row))], axis=-1)
        thick = min(7.0, 300 / max(len(visits), 1))
        rim = LineCollection(list(ends[keep]), colors=look.SOFT, linewidths=thick + 1.2)
        lines = LineCollection(list(ends[keep]), cmap=look.GLOW, norm=norm, linewidths=thick)
        lines.set_array(rate[:-1][keep])
        rows.add_collection(rim)
        rows.add_collection(lines)
    for edge in edges:
        rows.axvline(edge, color=look.FAINT, linewidth=0.6, zorder=0)
    rows.set_ylim(max(len(visits), 1) - 0.4, -0.6)
    every = max(1, -(-len(visits) // 24))
    marks = range(0, len(visits), every)
    rows.set_yticks(marks, [visits[i].label for i in marks])
    rows.set_title("chosen visits, in order of time")
    bar = figure.colorbar(ScalarMappable(norm, look.GLOW), cax=scale)
    bar.outline.set_visible(False)
    scale.tick_params(length=0)
    scale.set_title(rate_name, loc="right")
