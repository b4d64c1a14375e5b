"""Pole, prime meridians and rates: the rotation block, compiled into a `Rotation` record."""

from __future__ import annotations

import datetime
import math
from collections.abc import Iterator
from typing import Annotated, Literal

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, quantity
from coldglow.describe.records import LongitudeSystem, PeriodicTerm, Rotation

LATITUDE = Annotated[float, quantity("angle", "-90 deg", "90 deg")]
LONGITUDE = Annotated[float, quantity("angle", "-360 deg", "360 deg")]
_SLOW = Annotated[float, quantity("slow angle rate", "-1000 deg/century", "1000 deg/century")]


class PoleBlock(Block):
    """Direction of the north pole in ICRS axes at J2000 and its change per Julian century."""

    right_ascension: LONGITUDE
    right_ascension_rate: _SLOW = 0.0
    declination: LATITUDE
    declination_rate: _SLOW = 0.0


class TermBlock(Block):
    """A periodic term: sin for right ascension and meridian, cos for declination."""

    angle: Annotated[float, quantity("angle", "-1000 deg", "1000 deg")]
    rate: Annotated[float, quantity("slow angle rate", "-1e6 deg/century", "1e6 deg/century")]
    right_ascension: Annotated[float, quantity("angle", "-10 deg", "10 deg")] = 0.0
    declination: Annotated[float, quantity("angle", "-10 deg", "10 deg")] = 0.0
    meridian: Annotated[float, quantity("angle", "-10 deg", "10 deg")] = 0.0


class SystemBlock(Block):
    """A longitude system: a prime meridian and a rate, or a rate anchored to another system."""

    prime_meridian: Annotated[float | None, quantity("angle", "-720 deg", "720 deg")] = None
    anchored_to: fields.Name | None = None
    rate: Annotated[float | None, quantity("angle rate", "-10000 deg/day", "10000 deg/day")] = None
    period: Annotated[float | None, quantity("hours", "0.5 h", "10000 h")] = None
    grows: Annotated[Literal["west", "east"], fields.Word]
    period_uncertainty: Annotated[float, quantity("hours", "0 h", "10 h")] = 0.0
    tie_epoch: fields.Date = "2000-01-01"
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield what contradicts itself."""
        if (self.prime_meridian is None) == (self.anchored_to is None):
            yield Refused(
                "a system has either a prime meridian or an anchor", "`prime_meridian` or `anchored_to`"
            )
        if self.rate is not None and self.period is not None:
            yield Refused("both `rate` and `period` are given", "one of them", "period")
        if self.rate is None and self.period is None and self.anchored_to is None:
            yield Refused("neither `rate` nor `period` is given", "one of them")
        if self.rate == 0:
            yield Refused("`rate` is zero", "a body that turns", "rate")
        elif self.rate is not None and (self.rate > 0) != (self.grows == "west"):
            yield Refused(
                "the sign of `rate` contradicts `grows`",
                "longitude grows west for a positive rate, east for a negative one, "
                "as a distant observer sees it",
                "grows",
            )

    def signed_rate(self) -> float | None:
        """Return the rate in rad/s, None when it is that of the anchor."""
        if self.period is not None:
            return math.copysign(2 * math.pi / self.period, 1 if self.grows == "west" else -1)
        return self.rate


class RotationBlock(Block):
    """How the body turns."""

    pole: PoleBlock
    periodic_terms: Annotated[tuple[TermBlock, ...], fields.Rows] = ()
    default: fields.Name
    reason: fields.Text
    systems: Annotated[dict[str, SystemBlock], fields.Entries]
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield references to systems that are not there."""
        if self.default not in self.systems:
            yield no_system(self.default, self.systems, "default")
        for name, system in self.systems.items():
            anchor = system.anchored_to
            if anchor is None:
                continue
            if anchor not in self.systems:
                yield no_system(anchor, self.systems, f"systems.{name}.anchored_to")
            elif self.systems[anchor].anchored_to is not None:
                yield Refused(
                    f"the system `{anchor}` is anchored itself",
                    "a system with a prime meridian",
                    f"systems.{name}.anchored_to",
                )

    def record(self) -> Rotation:
        """Return the frozen record, the default system first."""
        order = [self.default, *(name for name in self.systems if name != self.default)]
        pole = self.pole
        return Rotation(
            pole_ra_rad=(pole.right_ascension, pole.right_ascension_rate),
            pole_dec_rad=(pole.declination, pole.declination_rate),
            terms=tuple(
                PeriodicTerm(term.angle, term.rate, term.right_ascension, term.declination, term.meridian)
                for term in self.periodic_terms
            ),
            systems=tuple(self._system(name) for name in order),
            source=self.source,
            reason=self.reason,
        )

    def _system(self, name: str) -> LongitudeSystem:
        block = self.systems[name]
        tie_s = _seconds_from_j2000(block.tie_epoch)
        rate = block.signed_rate()
        meridian = block.prime_meridian
        if block.anchored_to is not None:
            anchor = self.systems[block.anchored_to]
            anchor_rate = anchor.signed_rate()
            assert anchor_rate is not None  # the rules saw to both
            assert anchor.prime_meridian is not None
            rate = anchor_rate if rate is None else rate
            meridian = (anchor.prime_meridian + (anchor_rate - rate) * tie_s) % (2 * math.pi)
        assert rate is not None  # the rules saw to both
        assert meridian is not None
        return LongitudeSystem(
            name=name,
            prime_meridian_rad=meridian,
            rate_rad_s=rate,
            grows=block.grows,
            period_s=2 * math.pi / abs(rate),
            period_uncertainty_s=block.period_uncertainty,
            tie_epoch_s=tie_s,
            source=block.source,
        )


def no_system(name: str, systems: dict[str, SystemBlock], key: str) -> Refused:
    """Return the refusal of a longitude system that the rotation block does not have."""
    return Refused(f"there is no longitude system `{name}`", f"one of {', '.join(systems)}", key)


def _seconds_from_j2000(date: str) -> float:
    """Return TDB seconds from J2000 (noon of 1 January 2000) to the first instant of a date."""
    return (datetime.datetime.fromisoformat(date) - datetime.datetime(2000, 1, 1, 12)).total_seconds()
