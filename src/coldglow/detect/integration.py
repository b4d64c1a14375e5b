"""How long one integration lasts, what its reads cost, and how open-shutter time becomes clock time.

Read noise is that of a correlated pair of reads, sigma_p. With n reads it becomes (per pixel, per
integration): n/2 pairs averaged, sigma_p² / (n/2); a fit to a ramp, 6(n-1)/(n(n+1)) sigma_p², which is
sigma_p² at n = 2. The fit to a ramp also raises the photon variance by 6(n²+1)/(5n(n+1)), which tends to
1.2, because its reads share their electrons.

Source: Garnett & Forrest 1993, Proc. SPIE 1946, 395; Rauscher et al. 2007, PASP 119, 768, equation 1
(both from memory; the second with its group of one frame).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coldglow.describe.records import Detector, Operation
from coldglow.errors import SaturationError


@dataclass(frozen=True, slots=True)
class Integrations:
    """One integration per moment (ndarray[moment]); `well_fill` is a share of the *full* well."""

    integration_s: np.ndarray
    coadds: np.ndarray  # integrations at one nod position
    well_fill: np.ndarray
    shutter_share: np.ndarray  # open shutter per clock second, acquisition and standards excluded


def read_variance_e2(detector: Detector) -> float:
    """Return the read-noise variance of one pixel in one integration, in electron²."""
    n, pair = detector.reads, detector.read_noise_pair_e**2
    if detector.sampling == "pairs":
        return pair / max(n / 2.0, 1.0)
    return pair * 6.0 * (n - 1.0) / (n * (n + 1.0))


def photon_variance_factor(detector: Detector) -> float:
    """Return the variance of the counted photons (and dark electrons) over that of ideal counting."""
    if detector.sampling == "pairs":
        return 1.0
    n = detector.reads
    return 6.0 * (n**2 + 1.0) / (5.0 * n * (n + 1.0))


def choose_integration(peak_e_s: np.ndarray, detector: Detector, operation: Operation) -> Integrations:
    """Choose the longest integration that well, detector and nod allow, in equal parts of a nod position.

    Args:
        peak_e_s: ndarray[moment] of the brightest pixel's rate.
        detector: its well, range and readout.
        operation: its nods.

    Raises:
        SaturationError: where even the shortest integration fills the usable well.

    """
    peak_e_s = np.asarray(peak_e_s, dtype=float)
    usable_e = detector.full_well_e * detector.usable_fraction
    safe_s = usable_e / np.maximum(peak_e_s, np.finfo(float).tiny)
    worst_s = float(np.min(safe_s, initial=np.inf))
    if worst_s < detector.shortest_s:
        raise SaturationError(
            f"The brightest pixel collects {float(np.max(peak_e_s)):.3g} electrons per second and fills the "
            f"usable well ({usable_e:.3g} electrons) in {worst_s:.3g} s, but the shortest integration is "
            f"{detector.shortest_s:.3g} s. The longest safe integration is {worst_s:.3g} s: choose a "
            "detector mode that reads that fast, a narrower slit, a higher resolving power or a darker band.",
            worst_s,
            "detector.shortest",
        )
    longest_s = np.minimum(safe_s, detector.longest_s)
    if operation.nod == "stare":
        integration_s, coadds = longest_s, np.ones(peak_e_s.shape, dtype=int)
    else:
        longest_s = np.minimum(longest_s, max(operation.nod_time_s, detector.shortest_s))
        coadds = np.maximum(np.ceil(operation.nod_time_s / longest_s - 1e-9), 1.0).astype(int)
        integration_s = np.clip(operation.nod_time_s / coadds, detector.shortest_s, longest_s)
    open_s = integration_s * coadds
    overhead_s = coadds * detector.readout_s
    if operation.nod != "stare":
        overhead_s = overhead_s + operation.nod_overhead_s
    share = open_s / (open_s + overhead_s) * (1.0 - operation.calibration_share)
    return Integrations(integration_s, coadds, peak_e_s * integration_s / detector.full_well_e, share)


def visit_overhead_s(operation: Operation) -> float:
    """Return the clock time that every visit costs before and beside its exposures."""
    return operation.acquisition_s + operation.standards_s


def clock_time(open_shutter_s: np.ndarray, shutter_share: np.ndarray, operation: Operation) -> np.ndarray:
    """Return the clock time of one visit that collects this open-shutter time, overheads included."""
    time_s: np.ndarray = np.asarray(open_shutter_s) / shutter_share + visit_overhead_s(operation)
    return time_s


def open_shutter_time(clock_s: np.ndarray, shutter_share: np.ndarray, operation: Operation) -> np.ndarray:
    """Return the open-shutter time that one visit of this clock time leaves: the inverse, 0 if too short."""
    rest_s = np.maximum(np.asarray(clock_s) - visit_overhead_s(operation), 0.0)
    time_s: np.ndarray = rest_s * shutter_share
    return time_s
