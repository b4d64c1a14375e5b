"""The target as it may be written (format ``coldglow-target/1``), compiled into a `Target` record."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Annotated

from pydantic import Field

from coldglow.describe import fields
from coldglow.describe.column import vertical_column
from coldglow.describe.cooling_schema import CoolingBlock
from coldglow.describe.fields import Block, Refused, estimate, quantity
from coldglow.describe.records import Continuum, Emission, Estimate, Figure, Origin, Spot, Target
from coldglow.describe.rotation_schema import LATITUDE, LONGITUDE, RotationBlock, no_system
from coldglow.units import show_quantity

BODIES = ("jupiter", "saturn", "uranus", "neptune")  # whose places every ephemeris here knows


class FigureBlock(Block):
    """Size and shape."""

    equatorial_radius: Annotated[float, quantity("radius", "100 km", "1e6 km")]
    polar_radius: Annotated[float, quantity("radius", "100 km", "1e6 km")]
    shell_height: Annotated[float, quantity("radius", "0 km", "1e5 km")]
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield an impossible figure."""
        if self.polar_radius > self.equatorial_radius:
            yield Refused(
                "the polar radius is larger than the equatorial one", "an oblate body", "polar_radius"
            )
        elif self.polar_radius < 0.7 * self.equatorial_radius:
            yield Refused(
                "the body is flatter than any planet", "a polar radius of 0.7 or more", "polar_radius"
            )
        if self.shell_height > self.equatorial_radius:
            yield Refused("the shell is higher than one radius", "a height below the radius", "shell_height")


class SpotBlock(Block):
    """A round spot, or an oval ring when `inner_radius` is given."""

    latitude: LATITUDE
    longitude: LONGITUDE
    system: fields.Name | None = None
    radius: Annotated[float, quantity("angle", "0.1 deg", "90 deg")]
    inner_radius: Annotated[float, quantity("angle", "0 deg", "89.9 deg")] = 0.0
    share: Annotated[float, quantity("fraction", "0", "1")]

    def rules(self) -> Iterator[Refused]:
        """Yield an oval without width."""
        if self.inner_radius >= self.radius:
            yield Refused("the inner radius is not below the radius", "a smaller one", "inner_radius")


class PatternBlock(Block):
    """Where the ions are: a uniform share, the rest in spots fixed to the body."""

    uniform_share: Annotated[float | None, quantity("fraction", "0", "1")] = None
    spots: Annotated[dict[str, SpotBlock], fields.Entries] = Field(default_factory=dict)

    def rules(self) -> Iterator[Refused]:
        """Yield shares that do not add up."""
        total = math.fsum(spot.share for spot in self.spots.values())
        if total > 1 + 1e-9:
            yield Refused(f"the shares of the spots add up to {total:.6g}", "at most 1", "spots")
        elif self.uniform_share is not None and abs(total + self.uniform_share - 1) > 1e-6:
            yield Refused(
                f"the uniform share and the spots' shares add up to {total + self.uniform_share:.6g}",
                f"1, so that the uniform share is {1 - total:.6g}",
                "uniform_share",
            )


class EmissionBlock(Block):
    """Temperature and column of the ions."""

    temperature: Annotated[Estimate, estimate("temperature", "100 K", "3000 K", "temperature difference")]
    column: Annotated[Estimate | None, estimate("column", "1e8 m-2", "1e20 m-2")] = None
    line_of_sight_column: Annotated[Estimate | None, estimate("column", "1e8 m-2", "1e20 m-2")] = None
    lte_fraction: Annotated[Estimate, estimate("fraction", "0.001", "1")] = Estimate(1.0)
    pattern: PatternBlock = Field(default_factory=PatternBlock)
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield two columns or none."""
        if (self.column is None) == (self.line_of_sight_column is None):
            yield Refused(
                "exactly one kind of column is wanted", "`column` (vertical) or `line_of_sight_column`"
            )

    def record(self, figure: Figure, default_system: str) -> Emission:
        """Return the frozen record; a line-of-sight column becomes a vertical one."""
        line_of_sight = self.line_of_sight_column
        if line_of_sight is not None:
            column = vertical_column(line_of_sight, figure)
        else:
            assert self.column is not None  # the rules saw to it
            column = self.column
        return Emission(
            temperature_k=self.temperature,
            column_m2=column,
            given_as="vertical" if line_of_sight is None else "line-of-sight",
            lte_fraction=self.lte_fraction,
            spots=tuple(
                Spot(
                    name=name,
                    latitude_rad=spot.latitude,
                    longitude_rad=spot.longitude,
                    system=spot.system or default_system,
                    radius_rad=spot.radius,
                    inner_radius_rad=spot.inner_radius,
                    share=spot.share,
                )
                for name, spot in self.pattern.spots.items()
            ),
            source=self.source,
        )


_WAVELENGTH = Annotated[float, quantity("wavelength", "1 um", "10 um")]
_RADIANCE = Annotated[float, quantity("spectral radiance", "0 W m-2 sr-1 um-1", "1e6 W m-2 sr-1 um-1")]


class ContinuumBlock(Block):
    """Light under the lines."""

    albedo: Annotated[
        tuple[tuple[_WAVELENGTH, Annotated[float, quantity("fraction", "0", "1")]], ...], fields.Rows
    ]
    thermal: Annotated[
        tuple[tuple[_WAVELENGTH, _RADIANCE], ...],
        fields.Rows,
    ] = ()
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield tables that are empty or not in order."""
        if not self.albedo:
            yield Refused("the table is empty", "one row or more, e.g. `- [3.4 um, 0.01]`", "albedo")
        for key in ("albedo", "thermal"):
            table = getattr(self, key)
            for index in range(1, len(table)):
                if table[index][0] <= table[index - 1][0]:
                    wavelength = show_quantity(table[index][0], "wavelength")
                    what = f"the wavelength {wavelength} is not above the one before"
                    yield Refused(what, "rows in order of wavelength", f"{key}.{index}")

    def record(self) -> Continuum:
        """Return the frozen record."""
        return Continuum(
            albedo_wavelength_m=tuple(row[0] for row in self.albedo),
            albedo=tuple(row[1] for row in self.albedo),
            thermal_wavelength_m=tuple(row[0] for row in self.thermal),
            thermal_radiance_w_m2_m_sr=tuple(row[1] for row in self.thermal),
            source=self.source,
        )


class TargetSchema(Block):
    """A whole target file."""

    name: fields.Name
    body: fields.Text
    rotation: RotationBlock
    figure: FigureBlock
    emission: EmissionBlock
    continuum: ContinuumBlock
    cooling: CoolingBlock

    def rules(self) -> Iterator[Refused]:
        """Yield what one block says against another."""
        if self.body.lower() not in BODIES and not self.body.endswith(".ecsv"):
            yield Refused(
                f"the body `{self.body[:60]}` is not known",
                f"one of {', '.join(BODIES)}, or a stored table (.ecsv)",
                "body",
            )
        systems = self.rotation.systems
        for name, spot in self.emission.pattern.spots.items():
            if spot.system is not None and spot.system not in systems:
                yield no_system(spot.system, systems, f"emission.pattern.spots.{name}.system")
        floor = self.cooling.floor
        temperature = self.emission.temperature
        falling = self.cooling.law == "exponential" or (self.cooling.rate or Estimate(0.0)).value < 0
        if floor is not None and falling and floor.value > temperature.value:
            what = f"the floor of {floor.value:g} K is above today's {temperature.value:g} K"
            yield Refused(what, "a floor below the temperature", "cooling.floor")

    def record(self, origin: Origin) -> Target:
        """Return the frozen record."""
        figure = Figure(
            self.figure.equatorial_radius,
            self.figure.polar_radius,
            self.figure.shell_height,
            self.figure.source,
        )
        return Target(
            name=self.name,
            body=self.body.lower() if self.body.lower() in BODIES else self.body,
            rotation=self.rotation.record(),
            figure=figure,
            emission=self.emission.record(figure, self.rotation.default),
            continuum=self.continuum.record(),
            cooling=self.cooling.record(),
            origin=origin,
        )
