"""Vectors in the sky: ndarray[time, xyz]."""

from __future__ import annotations

import numpy as np

from coldglow.sky.clock import Floats


def dot(a: Floats, b: Floats) -> Floats:
    """Return the scalar product over the last axis."""
    product: Floats = np.einsum("...i,...i->...", a, b)
    return product


def length(a: Floats) -> Floats:
    """Return the length over the last axis."""
    result: Floats = np.sqrt(dot(a, a))
    return result


def separation_rad(a: Floats, b: Floats) -> Floats:
    """Return the angle between unit vectors ndarray[time, xyz], exact for small and large ones."""
    return 2 * np.arctan2(length(a - b), length(a + b))


def longitude_latitude(a: Floats) -> tuple[Floats, Floats]:
    """Return the angles of vectors ndarray[time, xyz]: longitude 0 .. 2 pi and latitude."""
    return np.arctan2(a[:, 1], a[:, 0]) % (2 * np.pi), np.arctan2(a[:, 2], np.hypot(a[:, 0], a[:, 1]))


def to_date(frame: Floats, vector: Floats) -> Floats:
    """Turn vectors from ICRS axes to the true equator and equinox of date."""
    turned: Floats = np.einsum("tij,tj->ti", frame, vector)
    return turned


def from_date(frame: Floats, vector: Floats) -> Floats:
    """Turn vectors from the true equator and equinox of date to ICRS axes."""
    turned: Floats = np.einsum("tji,tj->ti", frame, vector)
    return turned
