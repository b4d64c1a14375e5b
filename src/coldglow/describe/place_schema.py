"""Where an instrument stands, what lies above it and when it may look: site, sky and limits."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Annotated

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, quantity
from coldglow.units import parse_quantity, show_quantity

_WATER = Annotated[float, quantity("water", "0 mm", "50 mm")]
_SEEING = Annotated[float, quantity("small angle", "0.05 arcsec", "10 arcsec")]


class SiteBlock(Block):
    """Geodetic place on the Earth, longitude positive east."""

    longitude: Annotated[float, quantity("angle", "-180 deg", "360 deg")]
    latitude: Annotated[float, quantity("angle", "-90 deg", "90 deg")]
    height: Annotated[float, quantity("length", "-500 m", "9000 m")]


class WaterBlock(Block):
    """Quartiles of the precipitable water."""

    good: _WATER
    median: _WATER
    poor: _WATER

    def rules(self) -> Iterator[Refused]:
        """Yield quartiles out of order."""
        yield from _quartiles_in_order(self.good, self.median, self.poor)


class SeeingBlock(Block):
    """Quartiles of the seeing at 0.5 micron at the zenith (full width at half maximum)."""

    good: _SEEING
    median: _SEEING
    poor: _SEEING

    def rules(self) -> Iterator[Refused]:
        """Yield quartiles out of order."""
        yield from _quartiles_in_order(self.good, self.median, self.poor)


class SkyBlock(Block):
    """The sky over the site; in space only the zodiacal light."""

    water: WaterBlock | None = None
    seeing: SeeingBlock | None = None
    temperature: Annotated[float | None, quantity("temperature", "150 K", "320 K")] = None
    airglow: Annotated[
        float | None,
        quantity("airglow", "0 ph s-1 m-2 arcsec-2 um-1", "1e6 ph s-1 m-2 arcsec-2 um-1"),
    ] = None
    zodiacal_scale: Annotated[float | None, quantity("number", "0", "100")] = None
    source: fields.Text


class LimitsBlock(Block):
    """When the telescope may look; defaults are common practice, the observatory's own rules come first."""

    airmass_max: Annotated[float, quantity("number", "1", "40", none=math.inf)] = 2.0
    altitude_min: Annotated[float, quantity("angle", "-5 deg", "89 deg")] = 0.0
    altitude_max: Annotated[float, quantity("angle", "1 deg", "90 deg")] = parse_quantity("88 deg", "angle")
    sun_altitude_max: Annotated[float, quantity("angle", "-90 deg", "90 deg")] = parse_quantity(
        "-12 deg", "angle"
    )
    daytime: fields.Flag = False
    sun_separation_min: Annotated[float, quantity("angle", "0 deg", "180 deg")] = parse_quantity(
        "30 deg", "angle"
    )
    moon_separation_min: Annotated[float, quantity("angle", "0 deg", "180 deg")] = parse_quantity(
        "10 deg", "angle"
    )
    elongation_min: Annotated[float, quantity("angle", "0 deg", "180 deg")] = 0.0
    elongation_max: Annotated[float, quantity("angle", "0 deg", "180 deg")] = math.pi
    longest_visit: Annotated[float, quantity("hours", "0.1 h", "10000 h", none=math.inf)] = math.inf

    def rules(self) -> Iterator[Refused]:
        """Yield limits that leave nothing between them."""
        if self.altitude_min >= self.altitude_max:
            what = (
                f"the lowest altitude, {show_quantity(self.altitude_min, 'angle')}, is not below the highest"
            )
            yield Refused(what, f"below {show_quantity(self.altitude_max, 'angle')}", "altitude_min")
        if self.elongation_min >= self.elongation_max:
            what = "the smallest elongation is not below the largest"
            yield Refused(what, f"below {show_quantity(self.elongation_max, 'angle')}", "elongation_min")
        if self.daytime and self.sun_separation_min < parse_quantity("5 deg", "angle"):
            yield Refused(
                "work by day this close to the Sun can destroy a telescope",
                "a `sun_separation_min` of 5 deg or more, and the observatory's own rules",
                "sun_separation_min",
            )


def _quartiles_in_order(good: float, median: float, poor: float) -> Iterator[Refused]:
    if not good <= median <= poor:
        yield Refused("the quartiles are not in order", "good, median, poor from small to large", "median")
