"""Pack the table of the Earth's atmosphere into ``atmosphere.npz``.

Usage: ``python make_atmosphere.py TABLE.npz [atmosphere.npz]``. The table holds the zenith optical depth
of the dry gas and of each millimetre of precipitable water above two heights, on a grid even in the
logarithm of the vacuum wavelength; ``atmosphere.md`` says how it was derived and ``NOTICE.md`` goes with it.
Its half-precision numbers are kept as they are, the two heights stacked.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np

HEIGHTS_M = (2600, 4200)


def main(table_path: str, out_path: str) -> None:
    """Stack the heights and write the packed file."""
    with np.load(table_path) as table:
        pressures_hpa = json.loads(str(table["meta"]))["site_pressure_hPa"]
        np.savez_compressed(
            out_path,
            height_m=np.array(HEIGHTS_M, dtype=float),
            pressure_pa=np.array([100.0 * pressures_hpa[f"{height}m"] for height in HEIGHTS_M]),
            first_wavelength_m=round(float(table["lam0_um"]) * 1e-6, 12),
            log_step=float(table["dln"]),
            tau_dry=np.stack([table[f"tau_dry_{height}m"] for height in HEIGHTS_M]),
            tau_water_per_mm=np.stack([table[f"tau_h2o_per_mm_{height}m"] for height in HEIGHTS_M]),
        )


if __name__ == "__main__":
    main(sys.argv[1], sys.argv[2] if len(sys.argv) > 2 else str(Path(__file__).with_name("atmosphere.npz")))
