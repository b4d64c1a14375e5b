"""Chapter: the settings of the request's instruments against each other."""

from __future__ import annotations

import numpy as np

from coldglow.report.figures.compare import comparison
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result

HOPELESS_H = 1e4  # of clock time; drawn as never


def comparison_chapter(result: Result) -> Section:
    """Return the chapter of a comparison."""
    table = result.table()
    labels = [f"{i}, {s}" for i, s in zip(table["instrument"], table["setting"], strict=True)]
    time_h = np.where(table["time_to_goal"] < HOPELESS_H, table["time_to_goal"], np.inf)
    figure = comparison(labels, time_h, list(table["limited_by"]), table["feasible"])
    best = labels[0] if table["feasible"][0] else "none of them"
    picture = Picture(
        "comparison",
        figure,
        f"Time to the goal of {len(labels)} settings; best is {best}.",
        "Time on the clock to the goal on the whole disk at the median observable moment, for every setting "
        f"of the request's instruments, and what limits it; best is {best}.",
    )
    said = [
        "Each setting by itself, for the goals on the whole disk: neither coverage nor the help of another "
        "instrument counts here.",
        *result.sentences,
    ]
    return Section("Which setting does it best", said, [picture], {"comparison": table})


def worth_comparing(result: Result) -> bool:
    """Return whether there is more than one setting, and a time to show."""
    table = result.table()
    return len(table) > 1 and bool(np.isfinite(table["time_to_goal"]).any())
