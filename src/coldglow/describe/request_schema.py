"""The request as it may be written (format ``coldglow-request/1``), compiled into a `Request` record.

Target and instruments are resolved by the loader, which hands the finished records to `record`.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterator
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, quantity, whole_number
from coldglow.describe.records import (
    Budget,
    Conditions,
    Coverage,
    Dates,
    Fade,
    Goal,
    Origin,
    Request,
    Target,
    Use,
    Weather,
)
from coldglow.units import parse_quantity

ANGLE_MAX_RAD = parse_quantity("60 deg", "angle")  # of a latitude of interest from the sub-observer point
_PROBABILITY = Annotated[float, quantity("fraction", "0.001", "0.999999")]
_SNR = Annotated[float | None, quantity("number", "0.1", "1e6")]
_KELVIN = Annotated[float | None, quantity("temperature difference", "0.001 K", "1000 K")]


class DatesBlock(Block):
    """Evening dates of the nights in question."""

    first: fields.Date
    last: fields.Date
    offered: fields.Nights = ()
    forbidden: fields.Nights = ()
    fixed: fields.Nights = ()
    unit: Annotated[Literal["night", "half-night"], fields.Word] = "night"
    step: Annotated[float, quantity("time", "10 s", "3600 s")] = 300.0

    def rules(self) -> Iterator[Refused]:
        """Yield spans that are empty or endless, and nights outside them."""
        first, last = (datetime.date.fromisoformat(date) for date in (self.first, self.last))
        if last < first:
            yield Refused(
                f"the last night, {self.last}, is before the first", f"{self.first} or later", "last"
            )
            return
        if (last - first).days >= 1100:
            yield Refused(f"{(last - first).days + 1} nights are too many", "at most 1100 nights", "last")
        for key in ("offered", "forbidden", "fixed"):
            for night in getattr(self, key):
                if not self.first <= night[:10] <= self.last:
                    what = f"the night {night} is not between the first and the last"
                    yield Refused(what, f"from {self.first} to {self.last}", key)
                if " " in night and self.unit == "night":
                    yield Refused(f"`{night}` is half a night", "`unit: half-night`, or whole nights", key)
        for night in self.fixed:
            named = {night, night[:10]}
            if named & {*self.forbidden} or (self.offered and not named & {*self.offered}):
                yield Refused(f"the fixed night {night} is not allowed", "a night that is offered", "fixed")


class GoalBlock(Block):
    """What counts as done."""

    snr: _SNR = None
    lines: fields.Texts = ()
    temperature_error: _KELVIN = None
    column_error: Annotated[float | None, quantity("fraction", "1e-4", "10")] = None
    probability: _PROBABILITY = 0.5

    def rules(self) -> Iterator[Refused]:
        """Yield a goal without any aim."""
        if self.snr is None and self.temperature_error is None and self.column_error is None:
            yield Refused("the goal asks for nothing", "`snr`, `temperature_error` or `column_error`")


class CoverageBlock(Block):
    """Goal per longitude bin."""

    bins: Annotated[int, whole_number(1, 72)] = 12
    snr: _SNR = None
    temperature_error: _KELVIN = None
    time: Annotated[float | None, quantity("minutes", "1 min", "1000 h")] = None
    latitude: Annotated[float | None, quantity("angle", "-90 deg", "90 deg")] = None
    angle_max: Annotated[float | None, quantity("angle", "1 deg", "90 deg")] = None
    lit: Annotated[Literal["any", "day", "night"], fields.Word] = "any"
    spot: fields.Name | None = None
    candidates: Annotated[Literal["night", "half-night", "stretch"], fields.Word] = "night"
    stretch: Annotated[float, quantity("hours", "1 min", "24 h")] = 7200.0
    consecutive: fields.Flag = False
    block_nights: Annotated[int, whole_number(1, 60)] = 1
    nights_max: Annotated[float | None, quantity("number", "0.5", "1100")] = None
    half_night_cost: Annotated[float, quantity("number", "0.05", "1")] = 0.5
    time_limit: Annotated[float, quantity("time", "1 s", "3600 s")] = 20.0

    def rules(self) -> Iterator[Refused]:
        """Yield two goals for a bin."""
        given = [key for key in ("snr", "temperature_error", "time") if getattr(self, key) is not None]
        for key in given[1:]:
            yield Refused(f"the bins have the goal `{given[0]}` already", "one goal per bin", key)
        if self.latitude is not None and self.spot is not None:
            yield Refused("a spot has a latitude of its own", "`spot` or `latitude`", "latitude")
        elif self.latitude is not None and given[:1] not in ([], ["time"]):
            what = f"`{given[0]}`: the light of a latitude does not come apart from the rest of the disk"
            yield Refused(what, "`time` with a `latitude`, or a `spot`", given[0])
        if self.latitude is None:
            for key, given_one in (("angle_max", self.angle_max is not None), ("lit", self.lit != "any")):
                if given_one:
                    yield Refused("this is asked of a `latitude`, and there is none", "both or none", key)


class ConditionsBlock(Block):
    """The night assumed."""

    name: Annotated[Literal["good", "median", "poor"], fields.Word] = "median"
    seeing: Annotated[float | None, quantity("small angle", "0.05 arcsec", "10 arcsec")] = None
    water: Annotated[float | None, quantity("water", "0 mm", "50 mm")] = None


class WeatherBlock(Block):
    """Clear and lost nights."""

    clear_fraction: Annotated[float, quantity("fraction", "0", "1")] = 0.7
    correlation: Annotated[float, quantity("number", "0", "0.99")] = 0.0
    probability: _PROBABILITY = 0.9
    scatter: fields.Flag = False
    trials: Annotated[int, whole_number(10, 1000000)] = 4000
    seed: Annotated[int, whole_number(0, 2**32 - 1)] = 1


class BudgetBlock(Block):
    """The most that can be asked for."""

    nights: Annotated[float | None, quantity("number", above="0", high="10000")] = None
    hours: Annotated[float | None, quantity("budget hours", above="0 h", high="100000 h")] = None


class FadeBlock(Block):
    """Years of the outlook."""

    first_year: Annotated[int | None, whole_number(1900, 2150)] = None
    last_year: Annotated[int | None, whole_number(1900, 2150)] = None
    trials: Annotated[int, whole_number(10, 1000000)] = 400
    significance: Annotated[float, quantity("number", "0.1", "1000")] = 3.0

    def rules(self) -> Iterator[Refused]:
        """Yield years the wrong way round."""
        if self.first_year is not None and self.last_year is not None:
            span = self.last_year - self.first_year
            if not 0 <= span <= 100:
                yield Refused("the years do not span 0 to 100 years", "the earlier first", "last_year")


def _name_or_block(value: object) -> object:
    """Let pass a whole description, or the name or path of one."""
    return value if isinstance(value, dict) else fields.as_text(value)


_NamedOrWhole = Annotated[Any, BeforeValidator(_name_or_block)]


def _one_use(value: object) -> object:
    """Let a bare name stand for a use of that instrument in its first setting."""
    return {"instrument": value} if isinstance(value, str) else value


class UseBlock(Block):
    """One instrument of the request; `instrument` is a name, a path, or a whole description."""

    instrument: _NamedOrWhole
    setting: fields.Name | None = None
    cost: Annotated[float, quantity("number", "0", "1e6")] = 1.0


class RequestSchema(Block):
    """A whole request file; `target` and `instruments` are loaded beforehand."""

    name: fields.Name
    target: _NamedOrWhole
    instruments: Annotated[
        tuple[Annotated[UseBlock, BeforeValidator(_one_use)], ...], BeforeValidator(fields.as_list)
    ]
    limits: dict[str, Any] = Field(default_factory=dict)  # laid over each instrument's own
    longitudes: fields.Name | None = None
    dates: DatesBlock
    goal: GoalBlock
    coverage: CoverageBlock = CoverageBlock()
    conditions: ConditionsBlock = ConditionsBlock()
    weather: WeatherBlock = WeatherBlock()
    budget: BudgetBlock = BudgetBlock()
    fade: FadeBlock = FadeBlock()
    ephemeris: fields.Text | None = None

    def rules(self) -> Iterator[Refused]:
        """Yield what one block says against another."""
        if not self.instruments:
            yield Refused("there is no instrument", "at least one", "instruments")
        if self.coverage.candidates == "half-night" and self.dates.unit == "night":
            what = "half-nights, but the telescope gives whole ones (`dates.unit: night`)"
            yield Refused(what, "`unit: half-night` there, or `night` here", "coverage.candidates")
        last = self.fade.last_year
        if last is not None and self.fade.first_year is None and last < int(self.dates.first[:4]):
            yield Refused("the outlook ends before the first night", "a later year", "fade.last_year")

    def record(self, target: Target, uses: tuple[Use, ...], origin: Origin) -> Request:
        """Return the frozen record."""
        dates, goal, cover, weather = self.dates, self.goal, self.coverage, self.weather
        snr = cover.snr
        kelvin, minutes = cover.temperature_error, cover.time
        if snr is None and kelvin is None and minutes is None:  # the goal of the whole, in every bin
            whole = cover.latitude is None
            snr = goal.snr if whole else None
            kelvin = goal.temperature_error if whole and snr is None else None
            minutes = 30.0 if snr is None and kelvin is None else None
        first_year = self.fade.first_year or int(dates.first[:4])
        return Request(
            name=self.name,
            target=target,
            uses=uses,
            longitudes=self.longitudes or target.rotation.systems[0].name,
            dates=Dates(
                first=dates.first,
                last=dates.last,
                offered=dates.offered,
                forbidden=dates.forbidden,
                fixed=dates.fixed,
                unit=dates.unit,
                step_s=dates.step,
            ),
            goal=Goal(goal.snr, goal.lines, goal.temperature_error, goal.column_error, goal.probability),
            coverage=Coverage(
                bins=cover.bins,
                snr=snr,
                temperature_error_k=kelvin,
                minutes=minutes,
                latitude_rad=cover.latitude,
                angle_max_rad=ANGLE_MAX_RAD if cover.angle_max is None else cover.angle_max,
                lit=cover.lit,
                spot=cover.spot or "",
                candidates=cover.candidates,
                stretch_s=cover.stretch,
                consecutive=cover.consecutive,
                block_nights=cover.block_nights,
                nights_max=cover.nights_max,
                half_night_cost=cover.half_night_cost,
                time_limit_s=cover.time_limit,
                asked="coverage" in self.model_fields_set,
            ),
            conditions=Conditions(self.conditions.name, self.conditions.seeing, self.conditions.water),
            weather=Weather(
                clear_fraction=weather.clear_fraction,
                correlation=weather.correlation,
                probability=weather.probability,
                scatter=weather.scatter,
                trials=weather.trials,
                seed=weather.seed,
            ),
            budget=Budget(self.budget.nights, self.budget.hours),
            fade=Fade(
                first_year=first_year,
                last_year=self.fade.last_year or first_year + 20,
                trials=self.fade.trials,
                significance=self.fade.significance,
            ),
            ephemeris=self.ephemeris or "",
            origin=origin,
        )
