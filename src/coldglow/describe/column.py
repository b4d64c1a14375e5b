"""Vertical column and line-of-sight column of a uniform shell, one into the other.

Mean over the visible disk (area pi R^2) of the column along the line of sight through a thin uniform shell
of vertical column N at height h above an opaque sphere of radius R, limb annulus included:

    mean N_los = 2 N (1 + h/R)^2 (1 + sqrt(1 - (R/(R + h))^2))

Own derivation: the sphere of radius R + h holds 4 pi (R+h)^2 N ions; the observer sees the front half and
of the back half what is not hidden by the body, a share sqrt(1 - (R/(R+h))^2). The oblateness is left out
here (the equatorial radius stands for R): `light.shell.path_factor` has it, and differs by up to 1.6 % for
Uranus and Neptune, 4.5 % for Jupiter and 7 % for Saturn.
"""

from __future__ import annotations

import math

from coldglow.describe.records import Estimate, Figure


def mean_path_factor(figure: Figure) -> float:
    """Return mean line-of-sight column over vertical column (2 for a shell without height)."""
    ratio = figure.equatorial_radius_m / (figure.equatorial_radius_m + figure.shell_height_m)
    return 2 / ratio**2 * (1 + math.sqrt(1 - ratio**2))


def vertical_column(line_of_sight: Estimate, figure: Figure) -> Estimate:
    """Return the vertical column of a line-of-sight column (mean over the visible disk)."""
    return _times(line_of_sight, 1.0 / mean_path_factor(figure))


def line_of_sight_column(vertical: Estimate, figure: Figure) -> Estimate:
    """Return the line-of-sight column (mean over the visible disk) of a vertical column."""
    return _times(vertical, mean_path_factor(figure))


def _times(estimate: Estimate, factor: float) -> Estimate:
    return Estimate(estimate.value * factor, estimate.uncertainty * factor, estimate.scatter * factor)
