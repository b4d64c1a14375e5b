"""A user's own table of the Earth's transmission: ECSV or CSV text with a comment header.

Columns `wavelength_um` (vacuum) with `tau_dry` and `tau_h2o_per_mm` (zenith optical depths), or with one
`transmission` and the header keys `airmass`, `pwv_mm`, `altitude_m`, written ``# airmass: 1.2``.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from coldglow.errors import NotFoundError, RangeError

Floats = NDArray[np.float64]

KEY = "atmosphere"
OPAQUE_TAU = 60.0
_HEADER = re.compile(r"\b(airmass|pwv_mm|altitude_m)['\"]?\s*[:=]\s*['\"]?([-+.\deE]+)")


@dataclass(frozen=True, slots=True)
class Table:
    """What the file says: ndarray[sample] on its own wavelengths; None where it says nothing."""

    wavelength_m: Floats
    tau_dry: Floats  # of everything for a table of one transmission
    tau_water_per_m: Floats | None
    water_m: float | None
    height_m: float | None


def read_table(path: str) -> Table:
    """Read a table.

    Raises:
        NotFoundError: the file cannot be opened.
        RangeError: columns or header keys are missing, or numbers make no sense.

    """
    try:
        lines = Path(path).read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise NotFoundError(f"the transmission table {path!r} cannot be read: {error}") from None
    header = dict(_HEADER.findall("\n".join(line for line in lines if line.startswith("#"))))
    numbered = [(n, line) for n, line in enumerate(lines, 1) if line.strip() and not line.startswith("#")]
    if len(numbered) < 3:
        raise RangeError(
            f"{path}: a transmission table needs a row of column names and at least two rows", KEY
        )
    names = _cells(numbered[0][1])
    rows = []
    for number, line in numbered[1:]:
        try:
            cells = [float(cell) for cell in _cells(line)]
        except ValueError:
            raise RangeError(
                f"{path}:{number}: {line.strip()[:60]!r} holds something that is no number", KEY
            ) from None
        if len(cells) != len(names):
            raise RangeError(f"{path}:{number}: {len(cells)} numbers for {len(names)} columns", KEY)
        rows.append(cells)
    column = dict(zip(names, np.array(rows).T, strict=True))
    wavelength_um = column.get("wavelength_um")
    if wavelength_um is None:
        raise RangeError(f"{path}: no column wavelength_um; the columns are {', '.join(names)}", KEY)
    if not np.all(np.diff(wavelength_um) > 0.0) or not 0.3 < wavelength_um[0] < wavelength_um[-1] < 100.0:
        raise RangeError(f"{path}: wavelength_um must grow from row to row and be in micron (vacuum)", KEY)
    wavelength_m = wavelength_um * 1e-6
    height_m = _header_number(header, "altitude_m", path)
    if {"tau_dry", "tau_h2o_per_mm"} <= column.keys():
        dry, water = column["tau_dry"], column["tau_h2o_per_mm"]
        if not (np.all(dry >= 0.0) and np.all(water >= 0.0)):
            raise RangeError(f"{path}: an optical depth is negative or no number", KEY)
        return Table(wavelength_m, dry, 1000.0 * water, None, height_m)
    if "transmission" not in column:
        raise RangeError(
            f"{path}: needs the columns tau_dry and tau_h2o_per_mm, or transmission; "
            f"it has {', '.join(names)}",
            KEY,
        )
    transmission, airmass = column["transmission"], _header_number(header, "airmass", path)
    if airmass is None or not airmass > 0.0:
        raise RangeError(f"{path}: a transmission column needs the header key airmass (# airmass: 1.0)", KEY)
    if not np.all((transmission >= 0.0) & (transmission <= 1.0)):
        raise RangeError(f"{path}: a transmission lies outside 0 to 1", KEY)
    tau = np.minimum(-np.log(np.maximum(transmission, np.exp(-OPAQUE_TAU))), OPAQUE_TAU) / airmass
    water_mm = _header_number(header, "pwv_mm", path)
    return Table(wavelength_m, tau, None, None if water_mm is None else 1e-3 * water_mm, height_m)


def _cells(line: str) -> list[str]:
    return [cell.strip().strip('"') for cell in (line.split(",") if "," in line else line.split())]


def _header_number(header: dict[str, str], key: str, path: str) -> float | None:
    if key not in header:
        return None
    try:
        return float(header[key])
    except ValueError:
        raise RangeError(f"{path}: the header says {key} {header[key]!r}, which is no number", KEY) from None
