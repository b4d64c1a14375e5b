"""How brightly H3+ glows: level populations in equilibrium, line radiance, widths, and what limits them.

Everything takes a temperature of any shape ``[...]`` and returns ``[..., line]`` where lines come in.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import atomic_mass, c, electron_mass, h, k

from coldglow.errors import RangeError
from coldglow.light.lines import C2_M_K, LineList, load_levels

Floats = NDArray[np.float64]

MASS_KG = 3 * 1.00782503 * atomic_mass - electron_mass  # three hydrogen atoms less one electron
COLDEST_K, HOTTEST_K = 150.0, 1500.0
TOTAL_UNCERTAIN_K = 800.0
OPTICAL_DEPTH_LIMIT = 0.1


def _checked(temperature_k: ArrayLike) -> Floats:
    temperature = np.asarray(temperature_k, dtype=np.float64)
    if not np.all(np.isfinite(temperature) & (temperature > 0.0)):
        bad = temperature[~(np.isfinite(temperature) & (temperature > 0.0))].flat[0]
        raise RangeError(f"a temperature of {bad:g} K; it must be above 0 K", "emission.temperature")
    return temperature


def _sums(temperature_k: Floats) -> tuple[Floats, Floats]:
    """Return the partition sum and the mean energy of the levels (1/m), both [...]."""
    levels = load_levels()
    terms = levels.weight * np.exp(-C2_M_K * levels.energy_m1 / temperature_k[..., np.newaxis])
    partition = terms.sum(axis=-1)
    return partition, (terms @ levels.energy_m1) / partition


def partition_function(temperature_k: ArrayLike) -> Floats:
    """Return Q(T) [...] = sum over levels of g_ns(2J+1) exp(-c2 E/T), with weights 4 (ortho) and 2 (para)."""
    return _sums(_checked(temperature_k))[0]


def emission_rate_s(lines: LineList, temperature_k: ArrayLike) -> Floats:
    """Return photons per second from one molecule in each line, [..., line], into all directions."""
    temperature = _checked(temperature_k)
    population = lines.weight * np.exp(-C2_M_K * lines.upper_energy_m1 / temperature[..., np.newaxis])
    rate: Floats = lines.einstein_a_s * population / _sums(temperature)[0][..., np.newaxis]
    return rate


def photon_radiance_s_m2_sr(
    lines: LineList, temperature_k: ArrayLike, column_m2: ArrayLike, lte_fraction: ArrayLike = 1.0
) -> Floats:
    """Return the radiance of each line in photons, s-1 m-2 sr-1, [..., line].

    `column_m2` is the column along the line of sight; `lte_fraction` is the share of the upper levels'
    population in equilibrium that is really there, common to all lines (so it cannot be told from the
    column). Temperature, column and fraction broadcast against each other.
    """
    column = np.asarray(column_m2, dtype=np.float64) * np.asarray(lte_fraction, dtype=np.float64)
    radiance: Floats = column[..., np.newaxis] * emission_rate_s(lines, temperature_k) / (4.0 * np.pi)
    return radiance


def line_radiance_w_m2_sr(
    lines: LineList, temperature_k: ArrayLike, column_m2: ArrayLike, lte_fraction: ArrayLike = 1.0
) -> Floats:
    """Return the radiance of each optically thin line, W m-2 sr-1, [..., line].

    I = N A g_ns(2J'+1) exp(-c2 E'/T) / Q(T) * h c nu / (4 pi), with the arguments of
    `photon_radiance_s_m2_sr`.

    Source: Boltzmann's law and the definition of the Einstein coefficient, e.g. Drossart et al. 1989,
    Nature 340, 539 (from memory), for H3+ in Jupiter.
    """
    energy_j: Floats = h * c * lines.wavenumber_m1
    return energy_j * photon_radiance_s_m2_sr(lines, temperature_k, column_m2, lte_fraction)


def total_radiance_w_m2_sr(
    lines: LineList, temperature_k: ArrayLike, column_m2: ArrayLike, lte_fraction: ArrayLike = 1.0
) -> Floats:
    """Return the sum over the given lines (a band of the list, or all of it), [...]."""
    total: Floats = line_radiance_w_m2_sr(lines, temperature_k, column_m2, lte_fraction).sum(axis=-1)
    return total


def log_temperature_slope(lines: LineList, temperature_k: ArrayLike) -> Floats:
    """Return d(ln I)/dT of each line at constant column, 1/K, [..., line]: c2 (E' - <E>) / T^2."""
    temperature = _checked(temperature_k)
    excess_m1 = lines.upper_energy_m1 - _sums(temperature)[1][..., np.newaxis]
    slope: Floats = C2_M_K * excess_m1 / temperature[..., np.newaxis] ** 2
    return slope


def thermal_sigma_m_s(temperature_k: ArrayLike) -> Floats:
    """Return the standard deviation of the thermal velocity along one direction, sqrt(kT/m), [...]."""
    sigma: Floats = np.sqrt(k * _checked(temperature_k) / MASS_KG)
    return sigma


def optical_depth(
    lines: LineList, temperature_k: ArrayLike, column_m2: ArrayLike, spread_m_s: ArrayLike = 0.0
) -> Floats:
    """Return the optical depth at the centre of each line, [..., line].

    `column_m2` along the line of sight; `spread_m_s` adds (in quadrature) to the thermal width. Lower
    levels populated in equilibrium, induced emission included.

    Source: tau = N A lambda^3 g' / (8 pi Q sqrt(2 pi) sigma_v) exp(-c2 E''/T) (1 - exp(-c2 nu/T)); Rybicki &
    Lightman 1979, Radiative Processes in Astrophysics, eqs. 1.72-1.78 (from memory), Gaussian profile.
    """
    temperature = _checked(temperature_k)
    sigma = np.hypot(thermal_sigma_m_s(temperature), spread_m_s)[..., np.newaxis]
    t = temperature[..., np.newaxis]
    lower = np.exp(-C2_M_K * lines.lower_energy_m1 / t) / _sums(temperature)[0][..., np.newaxis]
    induced = -np.expm1(-C2_M_K * lines.wavenumber_m1 / t)
    strength = (
        lines.einstein_a_s * lines.weight * lines.wavelength_m**3 / (8.0 * np.pi * np.sqrt(2.0 * np.pi))
    )
    column = np.asarray(column_m2, dtype=np.float64)[..., np.newaxis]
    depth: Floats = column * strength * lower * induced / sigma
    return depth


def optical_depth_warnings(lines: LineList, temperature_k: float, column_m2: float) -> list[str]:
    """Return a sentence when the thickest line is no longer optically thin, else nothing."""
    depth = optical_depth(lines, temperature_k, column_m2)
    if not depth.size or depth.max() <= OPTICAL_DEPTH_LIMIT:
        return []
    thickest = int(np.argmax(depth))
    name = f"{lines.label[thickest]} at {1e6 * lines.wavelength_m[thickest]:.4f} um".strip()
    return [
        f"{int((depth > OPTICAL_DEPTH_LIMIT).sum())} of the lines are not optically thin (limit "
        f"{OPTICAL_DEPTH_LIMIT:g}): the depth at the centre of {name} is {depth[thickest]:.2g}. "
        "Such lines are fainter than stated here."
    ]


def validity_warnings(temperature_k: float) -> list[str]:
    """Return what is lost at this temperature, as sentences; empty where the list is good.

    Source: the completeness and accuracy measured for the list, ``data/h3p.md``.
    """
    at, notes = f"At {temperature_k:g} K", []
    if temperature_k < COLDEST_K:
        notes.append(
            f"{at}, below {COLDEST_K:g} K, lines may be missing, because the list was selected for warmer "
            "gas; and departures from equilibrium decide so weak a glow."
        )
    if temperature_k > TOTAL_UNCERTAIN_K:
        notes.append(
            f"{at} the total over all lines disagrees with a published fit (lower by 6 % at 800 K, 12 % at "
            "1000 K, 34 % at 1500 K, unexplained): do not use the total as a reference value above "
            f"{TOTAL_UNCERTAIN_K:g} K."
        )
    if temperature_k > HOTTEST_K:
        notes.append(
            f"{at}, above {HOTTEST_K:g} K, levels above 11 000 cm-1 matter and are missing: already at "
            "1500 K the emission is 2-3 % and the partition function 0.2 % too low, more above."
        )
    return notes


def equilibrium_warnings(lte_fraction: float) -> list[str]:
    """Return a sentence when the upper levels hold less than in equilibrium, else nothing.

    Source: Icarus 178, 97 (2005), for Jupiter (from memory): higher vibrational levels lack more.
    """
    if lte_fraction >= 1.0:
        return []
    return [
        f"The upper levels are taken to hold {100 * lte_fraction:.3g} % of what local equilibrium gives, in "
        "all lines alike. Out of equilibrium the overtone and hot bands lack more than the fundamental: "
        "treat ratios of lines from different bands, and temperatures from them, with reserve."
    ]
