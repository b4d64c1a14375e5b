"""Information on theta = (ln N, T, continuum level, wavelength zero) per second of open shutter.

With expected signal s_k in electron/s and variance rate v_k, dF_ij/dt = sum_k (ds_k/dtheta_i)
(ds_k/dtheta_j) / v_k. Matrices of time steps of one visit add. The wavelength zero is a velocity in m/s;
the continuum level is an extra photon radiance inside the aperture, flat in wavelength above the
atmosphere, in units of CONTINUUM_UNIT.

Left out: the information in the variance itself (the derivative of v_k), less than 1 part in the number of
electrons per pixel.

Source: Tegmark, Taylor & Heavens 1997, ApJ 480, 22, equation 15, first-order term.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coldglow.describe.records import Operation

CONTINUUM_UNIT = 1.0e20  # photon s-1 m-2 sr-1 m-1; about sunlight at Uranus on an albedo of 0.001


@dataclass(frozen=True, slots=True)
class NodNoise:
    """What a nod pattern makes of signal S, source variance C and background variance B, per open second.

    Signal S * signal, variance C * source + B * background.
    """

    signal: float
    source: float
    background: float


def nod_noise(operation: Operation) -> NodNoise:
    """Return the factors of a nod pattern.

    on-slit: the target is on the opening all the time, the other position is its background: S, C + 2B.
    off-slit, share f on the target: the sky counts are scaled by f/(1-f), so S f, C f + B f/(1-f).
    stare: n_b background rows per row on the target, C + B (1 + 1/n_b); a modelled background C + B.
    """
    if operation.nod == "on-slit":
        return NodNoise(1.0, 1.0, 2.0)
    if operation.nod == "off-slit":
        f = operation.on_fraction
        return NodNoise(f, f, f / (1.0 - f))
    rows = operation.background_rows
    return NodNoise(1.0, 1.0, 1.0 if math.isinf(rows) else 1.0 + 1.0 / rows)


def fisher(derivatives: Sequence[np.ndarray], variance: np.ndarray, time_share: np.ndarray) -> np.ndarray:
    """Return ndarray[moment, parameter, parameter] per second of open shutter.

    Args:
        derivatives: one ndarray[moment, pixel] of the signal rate per parameter.
        variance: ndarray[moment, pixel], variance rate.
        time_share: ndarray[pixel], share of the open-shutter time that the pixel collects.

    """
    inverse = time_share / variance
    matrix = np.empty((len(variance), len(derivatives), len(derivatives)))
    for i, first in enumerate(derivatives):
        weighted = first * inverse
        for j in range(i, len(derivatives)):
            matrix[:, i, j] = matrix[:, j, i] = np.einsum("mk,mk->m", weighted, derivatives[j])
    return matrix
