"""Errors that no exposure time lowers, propagated to the column and the temperature.

The estimate of (ln N, T) from line fluxes is linear in small relative errors e_l of the fluxes:
delta = F^-1 sum_l I_l (1, g_l) e_l, with I_l the information of line l and g_l its d ln(flux)/dT. Each
cause has its own pattern e_l; the causes add in quadrature.
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
    information: np.ndarray,
    slope: np.ndarray,
    telluric_error: np.ndarray,
    operation: Operation,
    einstein_a_error: float = EINSTEIN_A_ERROR,
    visits: int = 1,
) -> SystematicErrors:
    """Return the systematic errors of an estimate from some lines.

    Args:
        wavelength_m: ndarray[line].
        information: ndarray[line], I_l up to a common factor; zero for lines that are not used.
        slope: ndarray[line], d ln(flux)/dT in 1/K.
        telluric_error: ndarray[line], relative error of the transmission (`transmission_error` over the
            transmission; zero in space), independent from line to line and not reduced by more visits.
        operation: `flux_error` moves all lines alike; `relative_error` is the error of the ratio of two lines
            at the two ends of the lines used, linear in wavelength between; the floors move all lines alike.
        einstein_a_error: relative error of the Einstein coefficients, independent from line to line.
        visits: independent visits, which average the floor of one visit.

    """
    used = information > 0.0
    weight, g = information[used], slope[used]
    wavelength = wavelength_m[used]
    span = float(np.ptp(wavelength)) if wavelength.size else 0.0
    place = (wavelength - float(np.mean(wavelength))) / span if span > 0.0 else np.zeros(wavelength.size)
    alike = np.ones(wavelength.size)
    floor = math.hypot(operation.visit_floor / math.sqrt(visits), operation.common_floor)
    # (pattern, independent from line to line?)
    causes = (
        (operation.flux_error * alike, False),
        (operation.relative_error * place, False),
        (einstein_a_error * alike, True),
        (telluric_error[used], True),
        (floor * alike, False),
    )
    total = float(weight.sum())
    if total <= 0.0:
        never = (math.inf,) * len(causes)
        return SystematicErrors(never, never, never)
    mean = float(weight @ g) / total
    spread = float(weight @ np.square(g - mean))
    to_fixed = weight / total
    solvable = spread > 1e-12 * float(weight @ np.square(g))
    to_temperature = weight * (g - mean) / spread if solvable else np.zeros_like(weight)
    to_column = to_fixed - mean * to_temperature

    def moved(response: np.ndarray, pattern: np.ndarray, independent: bool) -> float:
        effect = response * pattern
        return float(np.sqrt(np.sum(np.square(effect)))) if independent else abs(float(effect.sum()))

    def errors(response: np.ndarray, known: bool) -> tuple[float, ...]:
        return tuple(moved(response, p, i) if known else math.inf for p, i in causes)

    return SystematicErrors(
        errors(to_fixed, True), errors(to_column, solvable), errors(to_temperature, solvable)
    )
