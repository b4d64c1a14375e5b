"""Errors that come from elsewhere than from counting, propagated to the column and the temperature.

The estimate of (ln N, T) from line fluxes is linear in small relative errors e_l of the fluxes:
delta = V sum_l w_l (1, g_l) e_l with V = (sum_l w_l (1, g_l)(1, g_l)^T)^-1, g_l = d ln(flux)/dT. The weights
are those of a fit that knows its errors, w_l = 1/(1/I_l + e_l²), with I_l the information of the line in
the exposure and e_l what errs independently from line to line (its Einstein coefficient, the air's
transmission): a line with an SNR of 1000 is not worth more than its Einstein coefficient.

What errs independently makes V minus what counting alone leaves; what moves all lines in a pattern adds
the pattern's response. Causes add in quadrature.

Source: generalised least squares, Aitken 1935, Proc. R. Soc. Edinburgh 55, 42 (from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from coldglow.describe.records import Operation
from coldglow.light.lines import EINSTEIN_A_ERROR

CAUSES = ("flux scale", "relative calibration", "Einstein A", "telluric table", "floor")


@dataclass(frozen=True, slots=True)
class SystematicErrors:
    """1-sigma errors by cause, in the order of CAUSES: of ln N with T free, and of T in K with N free.

    `fixed` is the error of ln N at a given T. Where the lines do not give a temperature, `column` and
    `temperature_k` are infinite.
    """

    fixed: tuple[float, ...]
    column: tuple[float, ...]
    temperature_k: tuple[float, ...]

    @property
    def fixed_total(self) -> float:
        """Error of ln N at a given T from all causes."""
        return math.hypot(*self.fixed)

    @property
    def column_total(self) -> float:
        """Error of ln N with T free from all causes."""
        return math.hypot(*self.column)

    @property
    def temperature_total_k(self) -> float:
        """Error of T with N free from all causes."""
        return math.hypot(*self.temperature_k)


def systematic_errors(
    wavelength_m: np.ndarray,
    information_s: np.ndarray,
    slope: np.ndarray,
    telluric_error: np.ndarray,
    operation: Operation,
    einstein_a_error: float = EINSTEIN_A_ERROR,
    open_shutter_s: float = 3600.0,
) -> SystematicErrors:
    """Return the systematic errors of an estimate from some lines.

    Args:
        wavelength_m: ndarray[line].
        information_s: ndarray[line], 1/sigma² of ln(flux) per second; zero for lines that are not used.
        slope: ndarray[line], d ln(flux)/dT in 1/K.
        telluric_error: ndarray[line], relative error of the transmission (`transmission_error` over the
            transmission; zero in space), independent from line to line and not reduced by more visits.
        operation: `flux_error` moves all lines alike; `relative_error` is the error of the ratio of two lines
            at the two ends of the lines used, linear in wavelength between; the floors move all lines alike.
        einstein_a_error: relative error of the Einstein coefficients, independent from line to line.
        open_shutter_s: length of the exposure, which sets the weights of faint lines.

    """
    used = information_s > 0.0
    if not used.any():
        never = (math.inf,) * len(CAUSES)
        return SystematicErrors(never, never, never)
    counting, g, wavelength = open_shutter_s * information_s[used], slope[used], wavelength_m[used]
    telluric = telluric_error[used]
    scatter2 = einstein_a_error**2 + np.square(telluric)
    weight = counting / (1.0 + counting * scatter2)
    span = float(np.ptp(wavelength))
    place = (wavelength - float(np.mean(wavelength))) / span if span > 0.0 else 0.0 * wavelength
    alike = np.ones(wavelength.size)
    floor = math.hypot(operation.visit_floor, operation.common_floor)
    patterns = (operation.flux_error * alike, operation.relative_error * place, floor * alike)

    def causes(response: np.ndarray, extra: float) -> tuple[float, ...]:
        flux, tilt, low = (abs(float(response @ pattern)) for pattern in patterns)
        einstein, air = (
            float(np.sum(np.square(response) * part))
            for part in (einstein_a_error**2 * alike, np.square(telluric))
        )
        share = extra / (einstein + air) if einstein + air > 0.0 else 0.0
        return flux, tilt, math.sqrt(share * einstein), math.sqrt(share * air), low

    total, mean, spread = _moments(weight, g)
    own_total, own_mean, own_spread = _moments(counting, g)
    fixed = causes(weight / total, 1.0 / total - 1.0 / own_total)
    if spread <= 1e-12 * float(weight @ np.square(g)):
        return SystematicErrors(fixed, (math.inf,) * len(CAUSES), (math.inf,) * len(CAUSES))
    to_temperature = weight * (g - mean) / spread
    variance = 1.0 / total + mean**2 / spread
    own_variance = 1.0 / own_total + own_mean**2 / own_spread
    return SystematicErrors(
        fixed,
        causes(weight / total - mean * to_temperature, variance - own_variance),
        causes(to_temperature, 1.0 / spread - 1.0 / own_spread),
    )


def _moments(weight: np.ndarray, slope: np.ndarray) -> tuple[float, float, float]:
    """Return sum of the weights, mean slope, and weighted sum of squares about it."""
    total = float(weight.sum())
    mean = float(weight @ slope) / total
    return total, mean, float(weight @ np.square(slope - mean))
