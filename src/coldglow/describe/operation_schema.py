"""Detector and operation of an instrument: the two blocks that say what a second of open shutter costs."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Annotated, Literal

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, quantity, whole_number
from coldglow.describe.records import Detector, Operation

_SECONDS = Annotated[float, quantity("time", "0 s", "100000 s")]
_POSITIVE = Annotated[float, quantity("time", "1e-6 s", "100000 s")]
_ERROR = Annotated[float, quantity("fraction", "0", "1")]


class DetectorBlock(Block):
    """Electrons and their noise, per pixel."""

    dark: Annotated[float, quantity("current", "0 e-/s", "1e6 e-/s")]
    read_noise_pair: Annotated[float, quantity("charge", "0 e-", "10000 e-")]
    reads: Annotated[int, whole_number(2, 1000)] = 2
    sampling: Annotated[Literal["pairs", "ramp"], fields.Word] = "pairs"
    full_well: Annotated[float, quantity("charge", "100 e-", "1e9 e-")]
    usable_fraction: Annotated[float, quantity("fraction", above="0", high="1")] = 1.0
    shortest: _POSITIVE
    longest: _POSITIVE
    readout: _SECONDS = 0.0
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield integrations out of order and reads that do not pair."""
        if self.shortest > self.longest:
            yield Refused("the shortest integration is longer than the longest", "a smaller one", "shortest")
        if self.sampling == "pairs" and self.reads % 2:
            yield Refused(f"{self.reads} reads do not make pairs", "an even number", "reads")

    def record(self) -> Detector:
        """Return the frozen record."""
        return Detector(
            dark_e_s=self.dark,
            read_noise_pair_e=self.read_noise_pair,
            reads=self.reads,
            sampling=self.sampling,
            full_well_e=self.full_well,
            usable_fraction=self.usable_fraction,
            shortest_s=self.shortest,
            longest_s=self.longest,
            readout_s=self.readout,
            source=self.source,
        )


class OperationBlock(Block):
    """How an observation runs."""

    nod: Annotated[Literal["on-slit", "off-slit", "stare"], fields.Word]
    on_fraction: Annotated[float | None, quantity("fraction", "0.01", "0.99")] = None
    background_rows: Annotated[float | None, quantity("number", "0.01", "1e6", model=math.inf)] = None
    nod_time: Annotated[float, quantity("time", "0.1 s", "100000 s")] = 60.0
    nod_overhead: _SECONDS = 0.0
    acquisition: _SECONDS = 0.0
    calibration: Annotated[float, quantity("fraction", "0", "0.9")] = 0.0
    standards: _SECONDS = 0.0
    visit_floor: _ERROR = 0.0
    common_floor: _ERROR = 0.0
    flux_error: _ERROR = 0.0
    relative_error: _ERROR = 0.0
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield keys that the nod pattern needs or has no use for."""
        if self.nod == "off-slit" and self.on_fraction is None:
            yield Refused("nods off the slit need `on_fraction`", "e.g. `on_fraction: 50 %`", "nod")
        if self.nod != "off-slit" and self.on_fraction is not None:
            yield Refused(f"this key has no meaning with nod `{self.nod}`", "remove it", "on_fraction")
        if self.nod == "stare" and self.background_rows is None:
            yield Refused(
                "a stare needs `background_rows`", "rows of background per row of source, or `model`", "nod"
            )
        if self.nod != "stare" and self.background_rows is not None:
            yield Refused(f"this key has no meaning with nod `{self.nod}`", "remove it", "background_rows")

    def record(self) -> Operation:
        """Return the frozen record."""
        return Operation(
            nod=self.nod,
            on_fraction=1.0 if self.on_fraction is None else self.on_fraction,
            background_rows=math.inf if self.background_rows is None else self.background_rows,
            nod_time_s=self.nod_time,
            nod_overhead_s=self.nod_overhead,
            acquisition_s=self.acquisition,
            calibration_share=self.calibration,
            standards_s=self.standards,
            visit_floor=self.visit_floor,
            common_floor=self.common_floor,
            flux_error=self.flux_error,
            relative_error=self.relative_error,
            source=self.source,
        )
