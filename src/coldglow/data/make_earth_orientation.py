"""Make ``earth_orientation.npz``: UT1-TAI every ten days, from the tables that come with astropy-iers-data.

Run ``python make_earth_orientation.py`` with that package installed; no network is used. The values are
those of IERS Bulletin A (file ``finals2000A.all``): measured ones first, then about a year of predictions.
UT1-TAI is stored and not UT1-UTC because it has no steps. Ten days leave out most of the fortnightly
zonal tides: at most 4 ms (0.06 arcsec of hour angle) since 1985, 6 ms before
(``tests/sky/test_clock.py``).
"""

from __future__ import annotations

from pathlib import Path

import astropy_iers_data
import numpy as np

from coldglow.sky.clock import tai_minus_utc_s

STEP_DAYS = 10


def main() -> None:
    """Read the fixed columns of Bulletin A (8-15 MJD, 58 flag, 59-68 UT1-UTC in seconds) and pack them."""
    rows = Path(astropy_iers_data.IERS_A_FILE).read_text(encoding="ascii").splitlines()
    days = [(float(row[7:15]), float(row[58:68]), row[57]) for row in rows if row[58:68].strip()]
    kept = sorted({*range(0, len(days), STEP_DAYS), len(days) - 1})
    mjd = np.array([days[i][0] for i in kept])
    ut1_utc = np.array([days[i][1] for i in kept])
    predicted_from = next(day for day, _, flag in days if flag == "P")
    np.savez_compressed(
        Path(__file__).with_name("earth_orientation.npz"),
        mjd_utc=mjd,
        ut1_minus_tai_s=ut1_utc - tai_minus_utc_s((mjd - 51544.5) * 86400.0),
        predicted_from_mjd=predicted_from,
        source=f"IERS Bulletin A in astropy-iers-data {astropy_iers_data.__version__}",
    )


if __name__ == "__main__":
    main()
