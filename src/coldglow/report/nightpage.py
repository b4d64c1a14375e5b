"""A plain page for each night at the telescope: when, where to point, what to take."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from coldglow.report.page import render, view
from coldglow.report.tables import Entry, Table

_ROWS = 60


@dataclass(frozen=True, slots=True, eq=False)
class NightPlan:
    """One night: its evening date, place, facts (sunset, dusk, set-up), what to do, and tables.

    `track` has the columns that the observer follows (time, airmass, central longitude, rates), `steps`
    the actions in order of time, `standards` the stars before and after.
    """

    night: str
    place: str
    facts: Mapping[str, Entry] = field(default_factory=dict)
    steps: Sequence[str] = ()
    track: Table | None = None
    standards: Table | None = None
    notes: Sequence[str] = ()


def night_pages(title: str, plans: Sequence[NightPlan]) -> str:
    """Return one HTML page with a sheet of paper for each night."""
    sheets = [
        (
            plan,
            None if plan.track is None else view(plan.track, rows=_ROWS),
            None if plan.standards is None else view(plan.standards, rows=_ROWS),
        )
        for plan in plans
    ]
    return render("nights.html.j2", title=title, sheets=sheets)
