"""The season at a glance: which hours of which nights are worth most."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Polygon
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look

_NARROW = 0.4  # rates that differ by less than this fill the scale of colours; others start at zero
_WIDE = 6.0  # points; of a run of nights that can carry a frame


@look.styled
def season_chart(
    nights: Sequence[str],
    hour_utc: NDArray[np.float64],
    rate: NDArray[np.float64],
    dark_start_h: NDArray[np.float64] | None = None,
    dark_end_h: NDArray[np.float64] | None = None,
    chosen: Sequence[tuple[int, float, float]] = (),
) -> Figure:
    """Draw `rate` (ndarray[night, hour]; nan where nothing can be observed) as colour, date against hour.

    `nights` are ISO evening dates, evenly spaced by one day; `hour_utc` (ndarray[hour], evenly spaced bin
    centres) counts hours from 0 UTC of the evening date and may be negative or pass 24. `dark_start_h`
    and `dark_end_h` (ndarray[night], the same count, nan for none) outline the night; `chosen` holds
    (index of the night, first hour, last hour) of stretches to be framed.
    """
    figure, ((main, scale),) = look.panels(
        4.3, columns=(1, 0.025), margins_in=(0.55, 0.55, 0.4, 0.55), gap_in=(0, 0.35)
    )
    step = float(hour_utc[1] - hour_utc[0])
    bottom, top = float(hour_utc[0]) - step / 2, float(hour_utc[-1]) + step / 2
    main.set_facecolor(look.FAINT)
    seen = rate[np.isfinite(rate)]
    largest = float(seen.max(initial=0.0)) or 1.0
    smallest = float(seen.min(initial=largest))
    image = main.imshow(
        rate.T,
        origin="lower",
        aspect="auto",
        interpolation="nearest",
        extent=(-0.5, len(nights) - 0.5, bottom, top),
        cmap=look.GLOW,
        vmin=smallest if _NARROW * largest < smallest < largest else 0.0,
        vmax=largest,
    )
    index = np.arange(len(nights))
    for edge in (dark_start_h, dark_end_h):
        if edge is not None:
            main.plot(index, edge, color=look.INK, linewidth=1, linestyle=look.DASHES[2])
    _frame(main, chosen, 72 * look.WIDTH / len(nights))
    main.set_xlim(-0.5, len(nights) - 0.5)
    main.set_ylim(top, bottom)
    _date_ticks(main, nights)
    _hour_ticks(main, bottom, top)
    main.set_title("hour (UTC)" if dark_start_h is None else "hour of the night (UTC)")
    bar = figure.colorbar(image, cax=scale)
    bar.outline.set_visible(False)
    scale.tick_params(length=0)
    scale.set_title("SNR of one hour", loc="right")
    return figure


def _frame(axes: Axes, chosen: Sequence[tuple[int, float, float]], night_points: float) -> None:
    """Frame each run of chosen nights; one too narrow for a frame is marked at start and end alone."""
    for outline in _outlines(chosen):
        left, right = outline[0][0], max(corner[0] for corner in outline)
        if (right - left) * night_points > _WIDE:
            axes.add_patch(Polygon(outline, fill=False, edgecolor=look.BRICK, linewidth=1.3))
        else:
            for end in (outline[0][1], outline[-1][1]):
                axes.hlines(end, left, right, color=look.BRICK, linewidth=2.2)


def _outlines(chosen: Sequence[tuple[int, float, float]]) -> list[list[tuple[float, float]]]:
    """Return one outline for each run of successive nights whose stretches overlap, as corners."""
    runs: list[list[tuple[int, float, float]]] = []
    for night, first, last in sorted(chosen):
        if runs and runs[-1][-1][0] == night - 1 and runs[-1][-1][1] < last and first < runs[-1][-1][2]:
            runs[-1].append((night, first, last))
        else:
            runs.append([(night, first, last)])
    return [
        [(night + side, first) for night, first, _ in run for side in (-0.5, 0.5)]
        + [(night + side, last) for night, _, last in reversed(run) for side in (0.5, -0.5)]
        for run in runs
    ]


def _date_ticks(axes: Axes, nights: Sequence[str]) -> None:
    """Mark months (or days in a short season) by name."""
    dates = [date.fromisoformat(night) for night in nights]
    if len(dates) > 45:
        every = max(1, len(dates) // 330 + 1)
        marks = [i for i, day in enumerate(dates) if day.day == 1 and (day.month - 1) % every == 0]
        axes.set_xticks([i for i, day in enumerate(dates) if day.day in (11, 21)], minor=True)
        labels = [words.day(nights[i])[2:] for i in marks]
    else:
        every = max(1, -(-len(dates) // 8))
        marks = list(range(0, len(dates), every))
        labels = [words.day(nights[i]).rsplit(" ", 1)[0] for i in marks]
        axes.set_xlabel(f"evening date, {words.days(nights[0], nights[-1])}")
    axes.set_xticks(marks, labels)


def _hour_ticks(axes: Axes, first: float, last: float) -> None:
    every = 1 if last - first <= 9 else 2 if last - first <= 18 else 3
    marks = np.arange(np.ceil(first / every) * every, last + 1e-9, every)
    axes.set_yticks(marks, [f"{round(mark) % 24:02d} h" for mark in marks])
