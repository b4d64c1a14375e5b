"""A target record as a description again."""

from __future__ import annotations

import datetime
import math
from typing import Any

from coldglow.describe.column import line_of_sight_column
from coldglow.describe.records import (
    Continuum,
    Cooling,
    Emission,
    Estimate,
    Figure,
    LongitudeSystem,
    Rotation,
    Target,
)
from coldglow.units import write_quantity


def resolved_target(target: Target) -> dict[str, Any]:
    """Return the target as nested texts in the format ``coldglow-target/1``."""
    return {
        "format": "coldglow-target/1",
        "name": target.name,
        "body": target.body,
        "rotation": _rotation(target.rotation),
        "figure": {
            "equatorial_radius": write_quantity(target.figure.equatorial_radius_m, "radius"),
            "polar_radius": write_quantity(target.figure.polar_radius_m, "radius"),
            "shell_height": write_quantity(target.figure.shell_height_m, "radius"),
            "source": target.figure.source,
        },
        "emission": _emission(target.emission, target.figure),
        "continuum": _continuum(target.continuum),
        "cooling": _cooling(target.cooling),
    }


def write_estimate(found: Estimate, kind: str, spread: str = "") -> str | dict[str, str]:
    """Return a value, with uncertainty and scatter where it has any (`spread`: their kind)."""
    value = write_quantity(found.value, kind)
    if not found.uncertainty and not found.scatter:
        return value
    parts = {"uncertainty": found.uncertainty, "scatter": found.scatter}
    return {"value": value} | {
        key: write_quantity(part, spread or kind) for key, part in parts.items() if part
    }


def _rotation(rotation: Rotation) -> dict[str, Any]:
    (ra, ra_rate), (dec, dec_rate) = rotation.pole_ra_rad, rotation.pole_dec_rad
    return {
        "source": rotation.source,
        "pole": {
            "right_ascension": write_quantity(ra, "angle"),
            "right_ascension_rate": write_quantity(ra_rate, "slow angle rate"),
            "declination": write_quantity(dec, "angle"),
            "declination_rate": write_quantity(dec_rate, "slow angle rate"),
        },
        "periodic_terms": [
            {
                "angle": write_quantity(term.angle_rad, "angle"),
                "rate": write_quantity(term.rate_rad_century, "slow angle rate"),
                "right_ascension": write_quantity(term.ra_rad, "angle"),
                "declination": write_quantity(term.dec_rad, "angle"),
                "meridian": write_quantity(term.meridian_rad, "angle"),
            }
            for term in rotation.terms
        ],
        "default": rotation.systems[0].name,
        "reason": rotation.reason,
        "systems": {system.name: _system(system) for system in rotation.systems},
    }


def _system(system: LongitudeSystem) -> dict[str, str]:
    tie = datetime.datetime(2000, 1, 1, 12) + datetime.timedelta(seconds=system.tie_epoch_s)
    return {
        "prime_meridian": write_quantity(system.prime_meridian_rad, "angle"),
        "rate": write_quantity(system.rate_rad_s, "angle rate"),
        "grows": system.grows,
        "period_uncertainty": write_quantity(system.period_uncertainty_s, "hours"),
        "tie_epoch": tie.date().isoformat(),
        "source": system.source,
    }


def _emission(emission: Emission, figure: Figure) -> dict[str, Any]:
    block: dict[str, Any] = {
        "temperature": write_estimate(emission.temperature_k, "temperature", "temperature difference")
    }
    if emission.given_as == "vertical":
        block["column"] = write_estimate(emission.column_m2, "column")
    else:
        column = line_of_sight_column(emission.column_m2, figure)
        block["line_of_sight_column"] = write_estimate(column, "column")
    block["lte_fraction"] = write_estimate(emission.lte_fraction, "fraction")
    block["source"] = emission.source
    shares = math.fsum(spot.share for spot in emission.spots)
    block["pattern"] = {
        "uniform_share": write_quantity(max(0.0, 1 - shares), "fraction"),
        "spots": {
            spot.name: {
                "latitude": write_quantity(spot.latitude_rad, "angle"),
                "longitude": write_quantity(spot.longitude_rad, "angle"),
                "system": spot.system,
                "radius": write_quantity(spot.radius_rad, "angle"),
                "inner_radius": write_quantity(spot.inner_radius_rad, "angle"),
                "share": write_quantity(spot.share, "fraction"),
            }
            for spot in emission.spots
        },
    }
    return block


def _continuum(continuum: Continuum) -> dict[str, Any]:
    return {
        "source": continuum.source,
        "albedo": [
            [write_quantity(wavelength, "wavelength"), write_quantity(albedo, "fraction")]
            for wavelength, albedo in zip(continuum.albedo_wavelength_m, continuum.albedo, strict=True)
        ],
        "thermal": [
            [write_quantity(wavelength, "wavelength"), write_quantity(radiance, "spectral radiance")]
            for wavelength, radiance in zip(
                continuum.thermal_wavelength_m, continuum.thermal_radiance_w_m2_m_sr, strict=True
            )
        ],
    }


def _cooling(cooling: Cooling) -> dict[str, Any]:
    block: dict[str, Any] = {"law": cooling.law, "epoch": cooling.epoch}
    if cooling.law == "linear":
        block["rate"] = write_estimate(cooling.rate_k_s, "temperature rate")
    if cooling.floor_k is not None:
        block["floor"] = write_estimate(cooling.floor_k, "temperature", "temperature difference")
    if cooling.time_scale_s is not None:
        block["time_scale"] = write_estimate(cooling.time_scale_s, "years")
    if cooling.column_rate_s != Estimate(0.0):
        block["column_rate"] = write_estimate(cooling.column_rate_s, "fraction rate")
    if cooling.law == "table":
        block["table"] = [
            [date, write_quantity(temperature, "temperature"), write_quantity(column, "column")]
            for date, temperature, column in zip(
                cooling.table_dates, cooling.table_temperature_k, cooling.table_column_m2, strict=True
            )
        ]
    if cooling.valid_until is not None:
        block["valid_until"] = cooling.valid_until
    block["source"] = cooling.source
    return block
