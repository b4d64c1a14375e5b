"""Coldglow: can the H3+ glow of a giant planet be detected, when, for how long, in how many nights?

``load_target``, ``load_instrument`` and ``load_request`` read descriptions; one function for each command
answers; ``read_result`` reads a stored answer back. All are imported when they are first used, so that
``import coldglow`` costs nothing. The answers `plan` and `sky` have the names of two packages inside: they
are ``coldglow.answers.plan`` and ``coldglow.answers.sky``, beside all the others.

>>> import coldglow
>>> lines = coldglow.glow("uranus", temperature="500 K", band=("3.9 um", "4.0 um"))
>>> lines.header["temperature"].value
500.0
>>> table = lines.qtable()  # of astropy, with units
>>> table["wavelength"].unit
Unit("um")
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

__all__ = [
    "check",
    "compare",
    "cover",
    "draft",
    "expose",
    "fade",
    "fetch",
    "glow",
    "hours",
    "load_instrument",
    "load_request",
    "load_target",
    "nights",
    "read_result",
    "show",
]


def __getattr__(name: str) -> Any:
    """Import what was asked for."""
    if name not in __all__:
        raise AttributeError(f"module 'coldglow' has no attribute {name!r}")
    home = "coldglow.describe.load" if name.startswith("load_") else "coldglow.answers"
    if name == "read_result":
        home = "coldglow.report.reading"
    return getattr(import_module(home), name)


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__])
