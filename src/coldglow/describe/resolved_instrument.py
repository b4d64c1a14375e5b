"""An instrument record as a description again."""

from __future__ import annotations

import math
from typing import Any

from coldglow.describe.records import Instrument, Limits, Operation, Quartiles, Setting, Site
from coldglow.units import write_quantity


def resolved_instrument(instrument: Instrument) -> dict[str, Any]:
    """Return the instrument as nested texts in the format ``coldglow-instrument/1``."""
    place, telescope, detector = instrument.place, instrument.telescope, instrument.detector
    block: dict[str, Any] = {"format": "coldglow-instrument/1", "name": instrument.name}
    if isinstance(place, Site):
        block["site"] = {
            "longitude": write_quantity(place.longitude_rad, "angle"),
            "latitude": write_quantity(place.latitude_rad, "angle"),
            "height": write_quantity(place.height_m, "length"),
        }
    else:
        block["orbit"] = place.kind
    block["sky"] = _sky(instrument)
    block["limits"] = _limits(instrument.limits, isinstance(place, Site))
    block["telescope"] = {
        "aperture": write_quantity(telescope.aperture_m, "length"),
        "obstruction": write_quantity(telescope.obstruction, "fraction"),
        "temperature": write_quantity(telescope.temperature_k, "temperature"),
        "emissivity": write_quantity(telescope.emissivity, "fraction"),
        "transmission": write_quantity(telescope.transmission, "fraction"),
        "source": telescope.source,
    }
    block["opening"] = _opening(instrument)
    block["image"] = _image(instrument)
    block["settings"] = {setting.name: _setting(setting) for setting in instrument.settings}
    block["detector"] = {
        "dark": write_quantity(detector.dark_e_s, "current"),
        "read_noise_pair": write_quantity(detector.read_noise_pair_e, "charge"),
        "reads": str(detector.reads),
        "sampling": detector.sampling,
        "full_well": write_quantity(detector.full_well_e, "charge"),
        "usable_fraction": write_quantity(detector.usable_fraction, "fraction"),
        "shortest": write_quantity(detector.shortest_s, "time"),
        "longest": write_quantity(detector.longest_s, "time"),
        "readout": write_quantity(detector.readout_s, "time"),
        "source": detector.source,
    }
    block["operation"] = _operation(instrument.operation)
    if instrument.atmosphere:
        block["atmosphere"] = instrument.atmosphere
    return block


def _sky(instrument: Instrument) -> dict[str, Any]:
    sky = instrument.sky
    if not isinstance(instrument.place, Site):
        return {"zodiacal_scale": write_quantity(sky.zodiacal_scale, "number"), "source": sky.source}
    return {
        "water": _quartiles(sky.water_m, "water"),
        "seeing": _quartiles(sky.seeing_rad, "small angle"),
        "temperature": write_quantity(sky.temperature_k, "temperature"),
        "airglow": write_quantity(sky.airglow_photon_s_m2_sr_m, "airglow"),
        "source": sky.source,
    }


def _quartiles(quartiles: Quartiles, kind: str) -> dict[str, str]:
    return {
        "good": write_quantity(quartiles.good, kind),
        "median": write_quantity(quartiles.median, kind),
        "poor": write_quantity(quartiles.poor, kind),
    }


def _or_none(value: float, kind: str) -> str:
    return "none" if math.isinf(value) else write_quantity(value, kind)


def _limits(limits: Limits, ground: bool) -> dict[str, str]:
    block = {
        "sun_separation_min": write_quantity(limits.sun_separation_min_rad, "angle"),
        "moon_separation_min": write_quantity(limits.moon_separation_min_rad, "angle"),
    }
    if ground:
        return block | {
            "airmass_max": _or_none(limits.airmass_max, "number"),
            "altitude_min": write_quantity(limits.altitude_min_rad, "angle"),
            "altitude_max": write_quantity(limits.altitude_max_rad, "angle"),
            "sun_altitude_max": write_quantity(limits.sun_altitude_max_rad, "angle"),
            "daytime": "yes" if limits.daytime else "no",
        }
    return block | {
        "elongation_min": write_quantity(limits.elongation_min_rad, "angle"),
        "elongation_max": write_quantity(limits.elongation_max_rad, "angle"),
        "longest_visit": _or_none(limits.longest_visit_s, "hours"),
    }


def _opening(instrument: Instrument) -> dict[str, str]:
    opening = instrument.opening
    block: dict[str, str] = {
        "kind": opening.kind,
        "width": write_quantity(opening.width_rad, "small angle"),
        "length": write_quantity(opening.length_rad, "small angle"),
        "pixel": write_quantity(opening.pixel_rad, "small angle"),
        "angle": opening.angle,
        "offset": write_quantity(opening.offset_rad, "small angle"),
    }
    if opening.angle == "position-angle":
        block["position_angle"] = write_quantity(opening.position_angle_rad, "angle")
    return block


def _image(instrument: Instrument) -> dict[str, str]:
    image = instrument.image
    block: dict[str, str] = {"kind": image.kind, "drift": write_quantity(image.drift_rad, "small angle")}
    if image.kind == "adaptive":
        block["core_share"] = write_quantity(image.core_share, "fraction")
    if image.kind != "seeing":
        block["core_width"] = write_quantity(image.core_fwhm_rad, "small angle")
    return block


def _setting(setting: Setting) -> dict[str, Any]:
    block: dict[str, Any] = {"band": [write_quantity(edge, "wavelength") for edge in setting.band_m]}
    if setting.resolving_power:
        block["resolving_power"] = write_quantity(setting.resolving_power, "number")
    block["pixels_per_element"] = write_quantity(setting.pixels_per_element, "number")
    block["throughput"] = write_quantity(setting.throughput, "fraction")
    if setting.off_band_m is not None:
        block["off_band"] = [write_quantity(edge, "wavelength") for edge in setting.off_band_m]
        block["on_band_share"] = write_quantity(setting.on_band_share, "fraction")
    block["continuum_prior"] = _or_none(setting.continuum_prior, "fraction")
    block["source"] = setting.source
    return block


def _operation(operation: Operation) -> dict[str, str]:
    block: dict[str, str] = {"nod": operation.nod}
    if operation.nod == "off-slit":
        block["on_fraction"] = write_quantity(operation.on_fraction, "fraction")
    if operation.nod == "stare":
        rows = operation.background_rows
        block["background_rows"] = "model" if math.isinf(rows) else write_quantity(rows, "number")
    return block | {
        "nod_time": write_quantity(operation.nod_time_s, "time"),
        "nod_overhead": write_quantity(operation.nod_overhead_s, "time"),
        "acquisition": write_quantity(operation.acquisition_s, "time"),
        "calibration": write_quantity(operation.calibration_share, "fraction"),
        "standards": write_quantity(operation.standards_s, "time"),
        "visit_floor": write_quantity(operation.visit_floor, "fraction"),
        "common_floor": write_quantity(operation.common_floor, "fraction"),
        "flux_error": write_quantity(operation.flux_error, "fraction"),
        "relative_error": write_quantity(operation.relative_error, "fraction"),
        "source": operation.source,
    }
