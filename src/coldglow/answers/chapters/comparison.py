"""Chapter: the settings of the request's instruments against each other."""

from __future__ import annotations

import numpy as np

from coldglow.report.figures.compare import comparison
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result


def comparison_chapter(result: Result) -> Section:
    """Return the chapter of a comparison."""
    table = result.table()
    labels = [f"{i}, {s}" for i, s in zip(table["instrument"], table["setting"], strict=True)]
    figure = comparison(labels, table["time_to_goal"], list(table["limited_by"]), table["feasible"])
    best = labels[0] if table["feasible"][0] else "none of them"
    picture = Picture(
        "comparison",
        figure,
        f"Time to the goal of {len(labels)} settings; best is {best}.",
        "Time on the clock to the goal on the whole disk at the median observable moment, for every setting "
        f"of the request's instruments, and what limits it; best is {best}.",
    )
    return Section("Which setting does it best", result.sentences, [picture], {"comparison": table})


def worth_comparing(result: Result) -> bool:
    """Return whether there is more than one setting, and a time to show."""
    table = result.table()
    return len(table) > 1 and bool(np.isfinite(table["time_to_goal"]).any())
