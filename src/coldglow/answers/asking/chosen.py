"""The stretches that a request asks for: one row for each visit, ready for calendar, pages and chapters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.requesting import Plan, planned
from coldglow.answers.common.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.common.offers import PARTS, Offers
from coldglow.answers.common.scenes import Also, scenes
from coldglow.answers.covering.choice import choose
from coldglow.describe.records import Request
from coldglow.report.results import Table, column, table
from coldglow.scenario import Scenario
from coldglow.sky.clock import iso_from_tt

MINUTES = (5, 10, 15, 20, 30, 60, 120, 180, 240, 360, 480, 720)
FEW = 3  # nights shown where no number of them is enough and no budget is stated


@dataclass(frozen=True, slots=True)
class Stretch:
    """One visit: steps `first` ... `end`-1 of a scene; the times include half a step to either side."""

    scene: Scenario
    night: str  # evening date
    part: str
    first: int
    end: int
    start_tt_s: float
    end_tt_s: float
    longitude_end_rad: float
    snr: float

    @property
    def start(self) -> str:
        """Begin, ISO to the minute, UTC."""
        return str(iso_from_tt(self.start_tt_s, "m"))

    @property
    def stop(self) -> str:
        """End, ISO to the minute, UTC."""
        return str(iso_from_tt(self.end_tt_s, "m"))

    @property
    def exposing_tt_s(self) -> float:
        """Instant of the first integration, after acquisition and standard stars."""
        return min(self.start_tt_s + self.scene.overhead_s, self.end_tt_s)

    @property
    def open_s(self) -> float:
        """Open shutter in it."""
        share = float(self.scene.steps.shutter_share[self.first : self.end].mean())
        return share * (self.end_tt_s - self.exposing_tt_s)

    @property
    def longitudes_deg(self) -> tuple[float, float]:
        """Central longitude at the first and at the last integration."""
        end = np.degrees(self.longitude_end_rad)
        turn = 360.0 * (self.end_tt_s - self.exposing_tt_s) / self.scene.track.system.period_s
        return float((end - turn) % 360.0), float(end % 360.0)

    @property
    def setup(self) -> tuple[float, int, float]:
        """Integration in seconds, co-adds at one position and fill of the well, at the moment nearest."""
        exposure = self.scene.exposure
        assert exposure is not None  # a stretch holds usable steps
        middle = 0.5 * (self.first + self.end - 1)
        nearest = int(np.argmin(np.abs(self.scene.moments - middle)))
        return (
            float(exposure.integration_s[nearest]),
            int(exposure.coadds[nearest]),
            float(exposure.well_fill[nearest]),
        )

    def marks(self, rows: int = 12) -> NDArray[np.int64]:
        """Return steps spread evenly through the stretch, both ends among them, about `rows` of them."""
        step_s = self.scene.steps.step_s
        wanted_s = (self.end - self.first) * step_s / rows
        spacing_s = next((60.0 * m for m in MINUTES if 60.0 * m >= wanted_s - 1e-6), wanted_s)
        stride = max(round(spacing_s / step_s), 1)
        return np.unique(np.append(np.arange(self.first, self.end, stride), self.end - 1))


def requested(request: NamePath | Request, also: Also = None) -> tuple[Stretch, ...]:
    """Return the stretches that the answer `nights` asks for, in order of time; arguments as there.

    Each holds its scenario, whose `track` serves, say, `coldglow.bridges.astroplan.observing_blocks`.
    """
    record = as_request(request)
    with place_errors(*described(record)):
        found = scenes(record, also=also)
        choice = choose(record, found) if record.coverage.asked else None
        return asked_for(record, planned(record, found, choice))


def asked_for(request: Request, plan: Plan | None) -> tuple[Stretch, ...]:
    """Return the stretches of the nights that the request would ask for, in order of time.

    These are the nights of a plan; where no number of nights is enough, its best ones within the budget.
    """
    if plan is None:
        return ()
    if plan.chosen is not None:
        count = plan.chosen + 1
    else:
        most = FEW if request.budget.nights is None else request.budget.nights
        count = max(int(np.searchsorted(plan.nights, most + 1e-9, "right")), 1)
    return stretches_of(plan.offers, plan.order[:count])


def stretches_of(given: Offers, chosen: NDArray[np.int64]) -> tuple[Stretch, ...]:
    """Return the visits of chosen offers, in order of time."""
    rows = []
    for k, scene in enumerate(given.scenes):
        visits, owner = given.visits[k], given.owner[k]
        origin = float(scene.track.grid.tt_s[0] - scene.steps.time_s[0])
        rows += [
            Stretch(
                scene,
                str(given.date[owner[v]]),
                PARTS[given.part[owner[v]]],
                int(visits.first[v]),
                int(visits.end[v]),
                origin + float(visits.start_s[v]),
                origin + float(visits.end_s[v]),
                float(visits.longitude_end_rad[v]),
                float(visits.snr[v]),
            )
            for v in np.flatnonzero(np.isin(owner, chosen))
        ]
    return tuple(sorted(rows, key=lambda row: (row.start_tt_s, row.scene.use.instrument.name)))


def stretches_table(rows: Sequence[Stretch]) -> Table:
    """Return the stretches as a table."""
    airmass = [row.scene.track.airmass[row.first : row.end] for row in rows]
    longitude = np.array([row.longitudes_deg for row in rows]).reshape(-1, 2)
    several = len({row.scene.use for row in rows}) > 1
    return table(
        column("night", [row.night for row in rows], description="evening date"),
        column("start", [row.start for row in rows], description="UTC"),
        column("end", [row.stop for row in rows], description="UTC"),
        column("part", [row.part for row in rows]),
        column("airmass_min", [each.min() for each in airmass], decimals=2),
        column("airmass_max", [each.max() for each in airmass], decimals=2),
        column("longitude_start", longitude[:, 0], "deg", decimals=0),
        column("longitude_end", longitude[:, 1], "deg", decimals=0),
        column("shutter_time", [row.open_s / 3600.0 for row in rows], "h", decimals=2),
        column("snr", [row.snr for row in rows], digits=3),
        column("instrument", [row.scene.use.instrument.name for row in rows], shown=several),
        column("setting", [row.scene.use.setting.name for row in rows], shown=several),
        caption="The stretches to ask for, in order of time",
        rows=range(min(len(rows), 40)),
    )
