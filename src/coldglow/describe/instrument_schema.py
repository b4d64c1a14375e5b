"""The instrument as it may be written (format ``coldglow-instrument/1``), compiled into a record."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Annotated, Literal

from coldglow.describe import fields
from coldglow.describe.fields import Block, Refused, quantity
from coldglow.describe.operation_schema import DetectorBlock, OperationBlock
from coldglow.describe.place_schema import LimitsBlock, SiteBlock, SkyBlock
from coldglow.describe.records import (
    ImageQuality,
    Instrument,
    Limits,
    Opening,
    Orbit,
    Origin,
    Quartiles,
    Setting,
    Site,
    Sky,
    Telescope,
)
from coldglow.units import show_quantity

_WAVELENGTH = Annotated[float, quantity("wavelength", "1.9 um", "5.5 um")]
_FIELD = Annotated[float, quantity("small angle", "0.01 arcsec", "3600 arcsec")]


class TelescopeBlock(Block):
    """Collecting area and warmth."""

    aperture: Annotated[float, quantity("length", "0.05 m", "100 m")]
    obstruction: Annotated[float, quantity("fraction", "0", "0.9")] = 0.0
    temperature: Annotated[float, quantity("temperature", "4 K", "330 K")]
    emissivity: Annotated[float, quantity("fraction", "0", "1")]
    transmission: Annotated[float, quantity("fraction", above="0", high="1")]
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield more light than there is."""
        if self.transmission > 1 - self.emissivity + 1e-12:
            what = f"the transmission {self.transmission:g} is more than 1 - emissivity"
            yield Refused(what, f"at most {1 - self.emissivity:.6g}", "transmission")


class OpeningBlock(Block):
    """Slit, or field of an integral-field unit or imager."""

    kind: Annotated[Literal["slit", "ifu", "imager"], fields.Word]
    width: _FIELD
    length: _FIELD
    pixel: Annotated[float, quantity("small angle", "0.001 arcsec", "100 arcsec")]
    angle: Annotated[Literal["rotation-axis", "equator", "position-angle", "parallactic"], fields.Word] = (
        "position-angle"
    )
    position_angle: Annotated[float | None, quantity("angle", "-360 deg", "360 deg")] = None
    offset: Annotated[float, quantity("small angle", "-3600 arcsec", "3600 arcsec")] = 0.0

    def rules(self) -> Iterator[Refused]:
        """Yield openings that cannot be."""
        if self.kind == "slit" and self.width > self.length:
            yield Refused("the slit is wider than long", "the long side as `length`", "length")
        if self.pixel > self.length:
            yield Refused("one pixel is longer than the opening", "a smaller pixel", "pixel")
        if self.position_angle is not None and self.angle != "position-angle":
            what = f"a position angle has no meaning with angle `{self.angle}`"
            yield Refused(what, "`angle: position-angle` or no position angle", "position_angle")


class ImageBlock(Block):
    """What blurs the image."""

    kind: Annotated[Literal["seeing", "adaptive", "diffraction"], fields.Word]
    core_share: Annotated[float | None, quantity("fraction", above="0", high="1")] = None
    core_width: Annotated[float, quantity("small angle", "0 arcsec", "5 arcsec")] = 0.0
    drift: Annotated[float, quantity("small angle", "0 arcsec", "60 arcsec")] = 0.0

    def rules(self) -> Iterator[Refused]:
        """Yield a core where there is none, or none where one is needed."""
        if self.kind == "adaptive" and self.core_share is None:
            yield Refused("adaptive optics needs `core_share`", "the share of the light in the core", "kind")
        if self.kind != "adaptive" and self.core_share is not None:
            yield Refused(f"this key has no meaning with kind `{self.kind}`", "remove it", "core_share")
        if self.kind == "seeing" and self.core_width:
            yield Refused("this key has no meaning with kind `seeing`", "remove it", "core_width")

    def record(self) -> ImageQuality:
        """Return the frozen record."""
        share = {"seeing": 0.0, "diffraction": 1.0, "adaptive": self.core_share or 0.0}[self.kind]
        return ImageQuality(self.kind, share, self.core_width, self.drift)


class SettingBlock(Block):
    """One way to use the instrument."""

    band: tuple[_WAVELENGTH, _WAVELENGTH]
    resolving_power: Annotated[float | None, quantity("number", "10", "1e6")] = None
    pixels_per_element: Annotated[float, quantity("number", "0.5", "20")] = 2.0
    throughput: Annotated[float, quantity("fraction", above="0", high="1")]
    off_band: tuple[_WAVELENGTH, _WAVELENGTH] | None = None
    on_band_share: Annotated[float, quantity("fraction", above="0", high="1")] = 1.0
    continuum_prior: Annotated[float, quantity("fraction", above="0", none=math.inf)] = math.inf
    source: fields.Text

    def rules(self) -> Iterator[Refused]:
        """Yield bands the wrong way round and shares without a second filter."""
        for key in ("band", "off_band"):
            band = getattr(self, key)
            if band is not None and band[0] >= band[1]:
                yield Refused("the band ends before it begins", "the shorter wavelength first", key)
        if self.off_band is None and self.on_band_share != 1:
            yield Refused("there is no off-band filter to share the time with", "1", "on_band_share")
        if self.off_band is not None and self.on_band_share == 1:
            yield Refused("no time is left for the off-band filter", "less than 1", "on_band_share")

    def record(self, name: str) -> Setting:
        """Return the frozen record."""
        return Setting(
            name=name,
            band_m=self.band,
            resolving_power=self.resolving_power or 0.0,
            pixels_per_element=self.pixels_per_element,
            throughput=self.throughput,
            off_band_m=self.off_band,
            on_band_share=self.on_band_share,
            continuum_prior=self.continuum_prior,
            source=self.source,
        )


class InstrumentSchema(Block):
    """A whole instrument file."""

    name: fields.Name
    site: SiteBlock | None = None
    orbit: Annotated[Literal["sun-earth-l2"] | None, fields.Word] = None
    sky: SkyBlock
    limits: LimitsBlock = LimitsBlock()
    telescope: TelescopeBlock
    opening: OpeningBlock
    image: ImageBlock
    settings: Annotated[dict[str, SettingBlock], fields.Entries]
    detector: DetectorBlock
    operation: OperationBlock
    atmosphere: fields.Text | None = None

    def rules(self) -> Iterator[Refused]:
        """Yield what one block says against another."""
        if (self.site is None) == (self.orbit is None):
            yield Refused("an instrument stands either at a site or on an orbit", "`site` or `orbit`")
        elif self.site is not None:
            yield from self._ground_rules()
        else:
            yield from self._space_rules()
        if not self.settings:
            yield Refused("there is no setting", "at least one", "settings")
        for name, setting in self.settings.items():
            key = f"settings.{name}"
            if self.opening.kind == "imager":
                if setting.resolving_power is not None:
                    yield Refused("an imager has no resolving power", "remove it", f"{key}.resolving_power")
                if setting.off_band is None and math.isinf(setting.continuum_prior):
                    yield Refused(
                        "an imager cannot separate line and continuum in one band",
                        "an `off_band` filter or a `continuum_prior`",
                        key,
                    )
            else:
                if setting.resolving_power is None:
                    yield Refused("the key `resolving_power` is missing", "e.g. `60000`", key)
                if setting.off_band is not None:
                    yield Refused("only an imager has an off-band filter", "remove it", f"{key}.off_band")
        yield from self._nod_rules()

    def _ground_rules(self) -> Iterator[Refused]:
        for key in ("water", "seeing", "temperature"):
            if getattr(self.sky, key) is None:
                yield Refused(f"the key `{key}` is missing", "every site on the ground has one", "sky")
        if self.image.kind == "diffraction":
            yield Refused("no site on the ground is free of seeing", "seeing or adaptive", "image.kind")
        for key in ("elongation_min", "elongation_max", "longest_visit"):
            if key in self.limits.model_fields_set:
                yield Refused("this limit has a meaning only in space", "remove it", f"limits.{key}")
        if self.sky.zodiacal_scale is not None:
            yield Refused("this key has a meaning only in space", "remove it", "sky.zodiacal_scale")

    def _space_rules(self) -> Iterator[Refused]:
        for key in ("water", "seeing", "temperature", "airglow"):
            if getattr(self.sky, key) is not None:
                yield Refused("there is no air in space", "remove it", f"sky.{key}")
        if self.image.kind != "diffraction":
            yield Refused("there is no seeing in space", "diffraction", "image.kind")
        if self.opening.angle == "parallactic":
            yield Refused("there is no parallactic angle in space", "another angle", "opening.angle")
        if self.atmosphere is not None:
            yield Refused("there is no air in space", "remove it", "atmosphere")
        for key in ("airmass_max", "altitude_min", "altitude_max", "sun_altitude_max", "daytime"):
            if key in self.limits.model_fields_set:
                yield Refused("this limit has a meaning only on the ground", "remove it", f"limits.{key}")

    def _nod_rules(self) -> Iterator[Refused]:
        if self.operation.nod == "on-slit" and self.sky.seeing is not None:
            half, needed = self.opening.length / 2, 2 * self.sky.seeing.median
            if half < needed:
                yield Refused(
                    "half the opening is shorter than twice the median seeing: no room to nod inside it",
                    f"off-slit or stare, or a length of {show_quantity(2 * needed, 'small angle')}",
                    "operation.nod",
                )

    def record(self, origin: Origin) -> Instrument:
        """Return the frozen record."""
        opening, limits, telescope = self.opening, self.limits, self.telescope
        return Instrument(
            name=self.name,
            place=Orbit()
            if self.site is None
            else Site(self.site.longitude, self.site.latitude, self.site.height),
            sky=self._sky(),
            limits=Limits(
                airmass_max=limits.airmass_max,
                altitude_min_rad=limits.altitude_min,
                altitude_max_rad=limits.altitude_max,
                sun_altitude_max_rad=limits.sun_altitude_max,
                daytime=limits.daytime,
                sun_separation_min_rad=limits.sun_separation_min,
                moon_separation_min_rad=limits.moon_separation_min,
                elongation_min_rad=limits.elongation_min,
                elongation_max_rad=limits.elongation_max,
                longest_visit_s=limits.longest_visit,
            ),
            telescope=Telescope(
                telescope.aperture,
                telescope.obstruction,
                telescope.temperature,
                telescope.emissivity,
                telescope.transmission,
                telescope.source,
            ),
            opening=Opening(
                kind=opening.kind,
                width_rad=opening.width,
                length_rad=opening.length,
                pixel_rad=opening.pixel,
                angle=opening.angle,
                position_angle_rad=opening.position_angle or 0.0,
                offset_rad=opening.offset,
            ),
            image=self.image.record(),
            settings=tuple(block.record(name) for name, block in self.settings.items()),
            detector=self.detector.record(),
            operation=self.operation.record(),
            atmosphere=self.atmosphere or "",
            origin=origin,
        )

    def _sky(self) -> Sky:
        water, seeing = self.sky.water, self.sky.seeing
        none = Quartiles(0.0, 0.0, 0.0)
        scale = self.sky.zodiacal_scale
        return Sky(
            water_m=Quartiles(water.good, water.median, water.poor) if water else none,
            seeing_rad=Quartiles(seeing.good, seeing.median, seeing.poor) if seeing else none,
            temperature_k=self.sky.temperature or 0.0,
            airglow_photon_s_m2_sr_m=self.sky.airglow or 0.0,
            zodiacal_scale=(1.0 if scale is None else scale) if self.site is None else 0.0,
            source=self.sky.source,
        )
