"""What the answers accept: names, paths or records; quantities as text, numbers in SI, or astropy's.

`place_errors` is the border at which an error that knows only a key path learns its file and line.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import numpy as np

from coldglow.describe.load import load_instrument, load_request, load_target
from coldglow.describe.records import Instrument, Limits, Request, Target
from coldglow.errors import NotFoundError, Problem, RangeError, UnitError
from coldglow.units import KINDS, parse_quantity

NamePath = str | os.PathLike[str]
Quantity = str | float | Any  # text with a unit, a float in SI, or an astropy Quantity

# a bare place on the Earth: up, and the Sun below nautical twilight
BARE_LIMITS = Limits(
    airmass_max=np.inf,
    altitude_min_rad=0.0,
    altitude_max_rad=np.pi / 2,
    sun_altitude_max_rad=np.radians(-12.0),
    daytime=False,
    sun_separation_min_rad=0.0,
    moon_separation_min_rad=0.0,
    elongation_min_rad=0.0,
    elongation_max_rad=np.pi,
    longest_visit_s=np.inf,
)


def as_target(target: NamePath | Target) -> Target:
    """Return a target from its record, name or path."""
    return target if isinstance(target, Target) else load_target(target)


def as_instrument(instrument: NamePath | Instrument) -> Instrument:
    """Return an instrument from its record, name or path."""
    return instrument if isinstance(instrument, Instrument) else load_instrument(instrument)


def as_request(request: NamePath | Request) -> Request:
    """Return a request from its record or path."""
    return request if isinstance(request, Request) else load_request(request)


def in_si(value: Quantity, kind: str, name: str, bare_unit: str | None = None) -> float:
    """Return a quantity in SI. Text without a unit means `bare_unit`; a float is in SI already.

    Raises:
        UnitError: the text is not such a quantity; the sentence begins with `name`.

    """
    if isinstance(value, str):
        try:
            return parse_quantity(value, kind, bare_unit or KINDS[kind].shown)
        except UnitError as error:
            raise UnitError(f"{name}: {error}") from None
    to_value = getattr(value, "to_value", None)
    return float(value if to_value is None else to_value(KINDS[kind].si))


@contextmanager
def place_errors(*described: Target | Instrument | Request) -> Iterator[None]:
    """Put file and line in front of an error whose key path stands in one of these descriptions."""
    try:
        yield
    except (RangeError, NotFoundError) as error:
        if problem := placed(error, *described):
            error.args = (str(problem),)
            error.key = ""  # said once
        raise


def placed(error: RangeError | NotFoundError, *described: Target | Instrument | Request) -> Problem | None:
    """Return an error with the place in these descriptions to which its key path belongs, if there is one."""
    for record in described:
        where = record.origin.locate(error.key) if error.key else None
        if where:
            return Problem(*where, error.key, str(error))
    return None


def described(request: Request) -> tuple[Request | Target | Instrument, ...]:
    """Return the request and all that it names, for `place_errors`."""
    return request, request.target, *(use.instrument for use in request.uses)
