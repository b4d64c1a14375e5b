"""A record written out again: each quantity with its unit, every default in its place.

The result is a description of the same format, so that it can be loaded again and gives an equal record;
a request holds its target and instruments in full, so that one file says all. Numbers are written such
that reading them gives back the very same float.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import yaml

from coldglow.describe.records import Coverage, Instrument, Request, Target
from coldglow.describe.resolved_instrument import resolved_instrument
from coldglow.describe.resolved_target import resolved_target
from coldglow.units import write_quantity


def resolved(record: Target | Instrument | Request) -> dict[str, Any]:
    """Return the record as nested texts, in the order of its format."""
    if isinstance(record, Target):
        return resolved_target(record)
    if isinstance(record, Instrument):
        return resolved_instrument(record)
    return _request(record)


def resolved_text(record: Target | Instrument | Request) -> str:
    """Return the record as the text of a file that can be loaded again."""
    dumper: Any = getattr(yaml, "CSafeDumper", yaml.SafeDumper)
    return str(
        yaml.dump(
            resolved(record),
            Dumper=dumper,
            sort_keys=False,
            allow_unicode=True,
            width=100,
            default_flow_style=None,
        )
    )


def assumed(record: Target | Instrument | Request) -> list[tuple[str, str]]:
    """Return key path and value of every default that was used: what no file of the description wrote.

    The rotation, the pattern of spots, and (in a request) target and instruments are left out; the last two
    answer for themselves.
    """
    derived = ("format", "rotation.", "emission.pattern.", "target.", "instruments.", "atmosphere")
    return [
        (key, value)
        for key, value in _leaves(resolved(record), "")
        if key not in record.origin.lines and not key.startswith(derived)
    ]


def _leaves(node: Any, path: str) -> Iterator[tuple[str, str]]:
    for key, value in node.items():
        child = f"{path}.{key}" if path else key
        if isinstance(value, dict):
            yield from _leaves(value, child)
        elif value:
            yield child, value if isinstance(value, str) else ", ".join(map(str, value))


def _request(request: Request) -> dict[str, Any]:
    dates, goal, weather, fade = request.dates, request.goal, request.weather, request.fade
    conditions = {
        "name": request.conditions.name,
        "seeing": _optional(request.conditions.seeing_rad, "small angle"),
        "water": _optional(request.conditions.water_m, "water"),
    }
    budget = {
        "nights": _optional(request.budget.nights, "number"),
        "hours": _optional(request.budget.hours, "budget hours"),
    }
    block: dict[str, Any] = {
        "format": "coldglow-request/1",
        "name": request.name,
        "target": resolved_target(request.target),
        "instruments": [
            {
                "instrument": resolved_instrument(use.instrument),
                "setting": use.setting.name,
                "cost": write_quantity(use.cost_per_night, "number"),
            }
            for use in request.uses
        ],
        "longitudes": request.longitudes,
        "dates": {
            "first": dates.first,
            "last": dates.last,
            "offered": list(dates.offered),
            "forbidden": list(dates.forbidden),
            "fixed": list(dates.fixed),
            "unit": dates.unit,
            "step": write_quantity(dates.step_s, "time"),
        },
        "goal": {
            "snr": _optional(goal.snr, "number"),
            "lines": list(goal.lines),
            "temperature_error": _optional(goal.temperature_error_k, "temperature difference"),
            "column_error": _optional(goal.column_error, "fraction"),
            "probability": write_quantity(goal.probability, "fraction"),
        },
        "coverage": _coverage(request.coverage),
        "conditions": conditions,
        "weather": {
            "clear_fraction": write_quantity(weather.clear_fraction, "fraction"),
            "correlation": write_quantity(weather.correlation, "number"),
            "probability": write_quantity(weather.probability, "fraction"),
            "scatter": _flag(weather.scatter),
            "trials": str(weather.trials),
            "seed": str(weather.seed),
        },
        "budget": budget,
        "fade": {
            "first_year": str(fade.first_year),
            "last_year": str(fade.last_year),
            "trials": str(fade.trials),
            "significance": write_quantity(fade.significance, "number"),
        },
    }
    if not request.coverage.asked:
        del block["coverage"]
    if request.ephemeris:
        block["ephemeris"] = request.ephemeris
    return {key: _without_unasked(part) if key in _OPTIONAL else part for key, part in block.items()}


_OPTIONAL = ("goal", "coverage", "conditions", "budget")


def _without_unasked(block: dict[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in block.items() if value is not None}


def _optional(value: float | None, kind: str) -> str | None:
    return None if value is None else write_quantity(value, kind)


def _flag(value: bool) -> str:
    return "yes" if value else "no"


def _coverage(coverage: Coverage) -> dict[str, Any]:
    has_latitude = coverage.latitude_rad is not None
    return {
        "bins": str(coverage.bins),
        "snr": _optional(coverage.snr, "number"),
        "temperature_error": _optional(coverage.temperature_error_k, "temperature difference"),
        "time": _optional(coverage.minutes, "minutes"),
        "latitude": _optional(coverage.latitude_rad, "angle"),
        "angle_max": write_quantity(coverage.angle_max_rad, "angle") if has_latitude else None,
        "lit": coverage.lit,
        "spot": coverage.spot or None,
        "candidates": coverage.candidates,
        "stretch": write_quantity(coverage.stretch_s, "hours"),
        "consecutive": _flag(coverage.consecutive),
        "block_nights": str(coverage.block_nights),
        "nights_max": _optional(coverage.nights_max, "number"),
        "half_night_cost": write_quantity(coverage.half_night_cost, "number"),
        "time_limit": write_quantity(coverage.time_limit_s, "time"),
    }
