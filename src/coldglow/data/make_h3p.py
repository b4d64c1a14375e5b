"""Pack the H3+ line list and level list into ``h3p.npz``.

Usage: ``python make_h3p.py LINES.csv LEVELS.csv [h3p.npz]``. Both files are comma-separated with ``#``
comments and a header row; the columns are named below, and ``h3p.md`` says how their figures were
obtained. What is stored: term values in units of 0.001 cm-1 (their printed precision), the two levels of
every line by row, Einstein coefficients as printed, names as one table of distinct words and an index.
Branch labels are written in the usual way, ``Q(1,0)`` for the list's ``Q(1;0)``. Energies of a line and its
degeneracy are those of its levels and are not stored twice; the script checks that they agree.
"""

from __future__ import annotations

import csv
import sys
from pathlib import Path

import numpy as np


def rows(path: str) -> list[dict[str, str]]:
    """Return the rows of a commented CSV file."""
    with Path(path).open(encoding="utf-8") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def main(lines_path: str, levels_path: str, out_path: str) -> None:
    """Read both lists, check one against the other, write the packed file."""
    lines, levels = rows(lines_path), rows(levels_path)
    place = {level["id"]: index for index, level in enumerate(levels)}
    upper = np.array([place[line["id_upper"]] for line in lines], dtype=np.int16)
    lower = np.array([place[line["id_lower"]] for line in lines], dtype=np.int16)
    energy = np.array([round(float(level["energy_cm1"]) * 1000) for level in levels], dtype=np.int32)
    wavenumber = np.array([round(float(line["wavenumber_cm1"]) * 1000) for line in lines], dtype=np.int32)
    if np.abs(energy[upper] - energy[lower] - wavenumber).max() > 1:
        raise SystemExit("a line's wavenumber is not the difference of its levels")
    weight = np.array([int(level["g_total"]) for level in levels], dtype=np.int16)
    if any(
        int(line["g_ns"]) * (2 * int(line["J_upper"]) + 1) != weight[i]
        for line, i in zip(lines, upper, strict=True)
    ):
        raise SystemExit("a line's degeneracy is not that of its upper level")
    bands, band = np.unique([line["band"] for line in lines], return_inverse=True)
    labels, label = np.unique([line["line"].replace(";", ",") for line in lines], return_inverse=True)
    np.savez_compressed(
        out_path,
        level_energy_mcm1=energy,
        level_weight=weight,
        level_j=np.array([int(level["J"]) for level in levels], dtype=np.int8),
        level_decay_s=np.array([float(level["A_total_s1"]) for level in levels]),
        line_wavenumber_mcm1=wavenumber,
        line_upper=upper,
        line_lower=lower,
        line_einstein_a_s=np.array([float(line["A_s1"]) for line in lines]),
        line_band=band.astype(np.int16),
        line_label=label.astype(np.int16),
        line_quality=np.array([line["class"] for line in lines], dtype="S1"),
        bands=bands.astype("S"),
        labels=labels.astype("S"),
    )


if __name__ == "__main__":
    main(
        sys.argv[1],
        sys.argv[2],
        sys.argv[3] if len(sys.argv) > 3 else str(Path(__file__).with_name("h3p.npz")),
    )
