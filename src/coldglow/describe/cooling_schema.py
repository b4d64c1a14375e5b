"""How a target goes on from its epoch: the cooling block, compiled into a `Cooling` record."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Annotated, Literal

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, estimate, quantity
from coldglow.describe.records import Cooling, Estimate

_TEMPERATURE = Annotated[float, quantity("temperature", "100 K", "3000 K")]
_COLUMN = Annotated[float, quantity("column", "1e8 m-2", "1e20 m-2")]
_USES = {  # law: keys it needs, keys it may have
    "constant": (set(), {"column_rate"}),
    "linear": ({"rate"}, {"floor", "column_rate"}),
    "exponential": ({"floor", "time_scale"}, {"column_rate"}),
    "table": ({"table"}, set()),
}


class CoolingBlock(Block):
    """What becomes of temperature and column."""

    law: Annotated[Literal["constant", "linear", "exponential", "table"], fields.Word]
    epoch: fields.Date
    rate: Annotated[Estimate | None, estimate("temperature rate", "-1000 K/yr", "1000 K/yr")] = None
    floor: Annotated[Estimate | None, estimate("temperature", "50 K", "3000 K", "temperature difference")] = (
        None
    )
    time_scale: Annotated[Estimate | None, estimate("years", "0.01 yr", "10000 yr")] = None
    column_rate: Annotated[Estimate | None, estimate("fraction rate", "-100 %/yr", "100 %/yr")] = None
    table: Annotated[tuple[tuple[fields.Date, _TEMPERATURE, _COLUMN], ...], fields.Rows] = ()
    valid_until: fields.Date | None = None
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield keys that the law needs or has no use for, and dates out of order."""
        needed, possible = _USES[self.law]
        given = {key for key in ("rate", "floor", "time_scale", "column_rate", "table") if getattr(self, key)}
        for key in sorted(needed - given):
            yield Refused(f"the law `{self.law}` needs the key `{key}`", "add it", "law")
        for key in sorted(given - needed - possible):
            yield Refused(f"this key has no meaning with the law `{self.law}`", "remove it", key)
        if self.law == "linear" and self.floor is None and self.valid_until is None:
            yield Refused(
                "a straight line reaches zero some day",
                "a `floor` where it stops or a date `valid_until` up to which it holds",
                "law",
            )
        if self.valid_until is not None and self.valid_until <= self.epoch:
            yield Refused("this date is not after `epoch`", f"a date after {self.epoch}", "valid_until")
        if self.law == "table" and len(self.table) == 1:
            yield Refused("the table has one row", "two rows or more", "table")
        for index in range(1, len(self.table)):
            if self.table[index][0] <= self.table[index - 1][0]:
                what = f"the date {self.table[index][0]} is not after the one before"
                yield Refused(what, "rows in order of date", f"table.{index}")

    def record(self) -> Cooling:
        """Return the frozen record."""
        return Cooling(
            law=self.law,
            epoch=self.epoch,
            rate_k_s=self.rate or Estimate(0.0),
            floor_k=self.floor,
            time_scale_s=self.time_scale,
            column_rate_s=self.column_rate or Estimate(0.0),
            table_dates=tuple(row[0] for row in self.table),
            table_temperature_k=tuple(row[1] for row in self.table),
            table_column_m2=tuple(row[2] for row in self.table),
            valid_until=self.valid_until,
            source=self.source,
        )
