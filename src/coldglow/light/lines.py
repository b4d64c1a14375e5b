"""The line list of H3+ and the levels behind it, as packaged (``data/h3p.md`` says how they were made)."""

from __future__ import annotations

import re
from dataclasses import dataclass
from difflib import get_close_matches
from functools import lru_cache
from importlib.resources import files

import numpy as np
from numpy.typing import NDArray
from scipy.constants import c, h, k

from coldglow.errors import NotFoundError, RangeError
from coldglow.units import parse_quantity

Floats = NDArray[np.float64]
Index = NDArray[np.intp]

C2_M_K = h * c / k  # second radiation constant
WELL_PLACED = "AB"  # position classes good enough to place a line on or beside a telluric one
POSITION_ERROR_M1 = {"A": 0.5, "B": 5.0, "C": 30.0, "D": 100.0}  # 0.005, 0.05, 0.3, 1 cm-1
EINSTEIN_A_ERROR = 0.03  # relative, strong fundamental lines with J <= 8; 0.05-0.2 for others


@dataclass(frozen=True, slots=True)
class LineList:
    """Lines in order of growing wavelength. Every array is ndarray[line]; `band` and `label` may be empty.

    `weight` is the degeneracy of the upper level, g_ns(2J'+1). `quality` is the class of the position:
    A +-0.005, B +-0.05, C +-0.3, D +-1 cm-1. Energies are above the (spin-forbidden) J = 0 ground level.
    """

    wavelength_m: Floats  # vacuum, rest
    wavenumber_m1: Floats
    upper_energy_m1: Floats
    lower_energy_m1: Floats
    upper_j: NDArray[np.int_]
    lower_j: NDArray[np.int_]
    weight: Floats
    einstein_a_s: Floats
    band: tuple[str, ...]
    label: tuple[str, ...]
    quality: tuple[str, ...]

    def __len__(self) -> int:
        return len(self.wavelength_m)

    def take(self, chosen: Index | NDArray[np.bool_]) -> LineList:
        """Return the lines of an index array or mask, in its order."""
        index = np.flatnonzero(chosen) if chosen.dtype == bool else chosen
        names = ([field[i] for i in index.tolist()] for field in (self.band, self.label, self.quality))
        return LineList(
            self.wavelength_m[index],
            self.wavenumber_m1[index],
            self.upper_energy_m1[index],
            self.lower_energy_m1[index],
            self.upper_j[index],
            self.lower_j[index],
            self.weight[index],
            self.einstein_a_s[index],
            *map(tuple, names),
        )

    def within(self, shortest_m: float, longest_m: float) -> LineList:
        """Return the lines with rest wavelength from `shortest_m` to `longest_m`, both included."""
        return self.take((self.wavelength_m >= shortest_m) & (self.wavelength_m <= longest_m))

    def find(self, wanted: str | float) -> int:
        """Return the index of the line that a label or a vacuum wavelength means.

        A label is ``Q(1,0)`` or ``Q(1;0)``, with the band before it where several bands have such a line
        (``2v2(l2)-ground tR(4,4)``); without a band the line that glows most per molecule at 600 K of
        all in the packaged list is meant. A wavelength is a number in metres or a text with unit
        (``3.953 um``) and means the line that glows most within half a nanometre of it.

        Raises:
            NotFoundError: there is no such line among these; the sentence names the nearest ones.

        """
        if not isinstance(wanted, str):
            return self._nearest(float(wanted))
        text = re.sub(r"\s+", " ", wanted.replace(";", ",")).strip()
        if re.match(r"[\d.]+ ?[a-zµμ]", text) and "(" not in text:
            return self._nearest(parse_quantity(text, "wavelength"))
        band, _, label = text.rpartition(" ")
        matches = [
            i for i, name in enumerate(self.label) if name == label and (not band or self.band[i] == band)
        ]
        if matches:
            best = max(matches, key=self._glow)
            return best if band else self._meant(label, best)
        quote = " (a label with a comma needs quotes in a list)" if text.count("(") != text.count(")") else ""
        near = get_close_matches(label, sorted({name for name in self.label if name}), 3, 0.4)
        hint = f"the nearest labels are {', '.join(near)}" if near else "no label is near it"
        raise NotFoundError(f"no line {wanted!r} among these {len(self)} lines{quote}; {hint}")

    def _meant(self, label: str, best: int) -> int:
        """Return the line among these, unless a label without band means one that is not among them."""
        every = load_lines()
        same = [i for i, name in enumerate(every.label) if name == label]
        meant = max(same, key=every._glow, default=-1)
        if meant < 0 or every._glow(meant) <= 1.01 * self._glow(best):
            return best
        raise NotFoundError(
            f"{label} is the line of {every.band[meant]} at {1e6 * every.wavelength_m[meant]:.5f} um, which "
            f"is not among these {len(self)}; write '{self.band[best]} {label}' for the one at "
            f"{1e6 * self.wavelength_m[best]:.5f} um"
        )

    def _glow(self, index: int) -> float:
        """Return the photon emission of a line, up to a common factor, at 600 K."""
        boltzmann = np.exp(-C2_M_K * self.upper_energy_m1[index] / 600.0)
        return float(self.einstein_a_s[index] * self.weight[index] * boltzmann)

    def _nearest(self, wavelength_m: float) -> int:
        close = np.flatnonzero(np.abs(self.wavelength_m - wavelength_m) <= 0.5e-9)
        if close.size:
            return max(close.tolist(), key=self._glow)
        near = sorted(range(len(self)), key=lambda i: abs(self.wavelength_m[i] - wavelength_m))[:3]
        hint = ", ".join(f"{1e6 * self.wavelength_m[i]:.5f} um {self.label[i]}".strip() for i in near)
        raise NotFoundError(
            f"no line within 0.0005 um of {1e6 * wavelength_m:.5f} um (vacuum) among these {len(self)} "
            f"lines; the nearest are {hint or 'none'}"
        )

    def position_sigma_m_s(self) -> Floats:
        """Return ndarray[line]: 1-sigma error of the position as a velocity; 0 for classes A and B.

        The positions of classes C and D are too uncertain to place the line on or beside a telluric one:
        their transmission is averaged over this error instead.
        """
        error_m1 = np.array([0.0 if q in WELL_PLACED else POSITION_ERROR_M1[q] for q in self.quality])
        sigma: Floats = c * error_m1 / self.wavenumber_m1
        return sigma


@dataclass(frozen=True, slots=True)
class Levels:
    """Levels for the partition sum: ndarray[level]. Complete below 11 000 cm-1 for J <= 18."""

    energy_m1: Floats
    weight: Floats  # g_ns(2J+1)


@lru_cache(maxsize=1)
def _packed() -> dict[str, NDArray[np.generic]]:
    with files("coldglow.data").joinpath("h3p.npz").open("rb") as file, np.load(file) as packed:
        return {name: packed[name] for name in packed.files}


def _frozen(array: NDArray[np.generic], factor: float = 1.0) -> Floats:
    values = np.asarray(array, dtype=np.float64) * factor
    values.flags.writeable = False
    return values


@lru_cache(maxsize=1)
def load_levels() -> Levels:
    """Return the packaged levels (read once)."""
    packed = _packed()
    return Levels(
        energy_m1=_frozen(packed["level_energy_mcm1"], 0.1),
        weight=_frozen(packed["level_weight"]),
    )


@lru_cache(maxsize=1)
def load_lines() -> LineList:
    """Return the packaged list of 10 143 lines, 1.9-5.5 micron (read once)."""
    packed, energy_m1, weight = _packed(), load_levels().energy_m1, load_levels().weight
    order = np.argsort(packed["line_wavenumber_mcm1"], kind="stable")[::-1]
    upper, lower = packed["line_upper"][order], packed["line_lower"][order]
    wavenumber_m1 = _frozen(packed["line_wavenumber_mcm1"][order], 0.1)
    bands = [name.decode() for name in packed["bands"].tolist()]
    labels = [name.decode() for name in packed["labels"].tolist()]
    return LineList(
        wavelength_m=_frozen(1.0 / wavenumber_m1),
        wavenumber_m1=wavenumber_m1,
        upper_energy_m1=_frozen(energy_m1[upper]),
        lower_energy_m1=_frozen(energy_m1[lower]),
        upper_j=packed["level_j"][upper].astype(int),
        lower_j=packed["level_j"][lower].astype(int),
        weight=_frozen(weight[upper]),
        einstein_a_s=_frozen(packed["line_einstein_a_s"][order]),
        band=tuple(bands[i] for i in packed["line_band"][order].tolist()),
        label=tuple(labels[i] for i in packed["line_label"][order].tolist()),
        quality=tuple(name.decode() for name in packed["line_quality"][order].tolist()),
    )


def lines_in(shortest_m: float, longest_m: float) -> LineList:
    """Return the packaged lines of a band.

    Raises:
        RangeError: the band holds no line of the list.

    """
    lines = load_lines().within(shortest_m, longest_m)
    if not len(lines):
        raise RangeError(
            f"no H3+ line between {1e6 * shortest_m:g} and {1e6 * longest_m:g} um; "
            "the list covers 1.9 to 5.5 um"
        )
    return lines
