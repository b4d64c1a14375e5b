"""`glow`: how bright is it, line by line?"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coldglow.answers.common.inputs import NamePath, Quantity, as_target, in_si, place_errors
from coldglow.describe.column import mean_path_factor
from coldglow.describe.records import Target
from coldglow.errors import RangeError
from coldglow.light.emission import (
    equilibrium_warnings,
    line_radiance_w_m2_sr,
    optical_depth_warnings,
    partition_function,
    photon_radiance_s_m2_sr,
    total_radiance_w_m2_sr,
    validity_warnings,
)
from coldglow.light.lines import lines_in, load_lines
from coldglow.report import words
from coldglow.report.results import Entry, Result, column, table

PRINTED = 20


def glow(
    target: NamePath | Target,
    temperature: Quantity | None = None,
    column_density: Quantity | None = None,
    band: Sequence[Quantity] | None = None,
) -> Result:
    """Return the radiance of every line of a band.

    Args:
        target: name, path or record.
        temperature: of the ions; default: the target's.
        column_density: *along the line of sight*; default: the target's, mean over the visible disk.
        band: shortest and longest vacuum wavelength; default: the whole list, 1.9-5.5 micron.

    Returns:
        A result with table ``lines`` (all lines of the band, in order of wavelength) and the header
        ``temperature``, ``column``, ``partition_function``, ``total_radiance`` (all lines of the list),
        ``band_radiance``.

    Raises:
        RangeError: a band without lines, or a temperature or column that is not positive.

    >>> result = glow("uranus", temperature="500 K", column_density="2e15 m-2", band=("3.9 um", "4.0 um"))
    >>> print(result["label"][result["radiance"].argmax()])
    Q(1,0)
    >>> print(f"{result.header['partition_function'].value:.1f}")
    80.6

    """
    record = as_target(target)
    emission = record.emission
    kelvin = (
        emission.temperature_k.value
        if temperature is None
        else in_si(temperature, "temperature", "temperature")
    )
    if column_density is None:
        fraction = emission.lte_fraction.value
        shining = emission.column_m2.value * fraction
        along_m2 = shining * mean_path_factor(record.figure)
        kind = "along the line of sight, mean over the visible disk"
    else:
        fraction = 1.0
        along_m2, kind = in_si(column_density, "column", "column"), "along the line of sight, as asked"
    low_m, high_m = (in_si(edge, "wavelength", "band") for edge in band) if band else (1.9e-6, 5.5e-6)
    for name, value, unit in (("temperature", kelvin, "K"), ("column", along_m2, "m-2")):
        if not value > 0.0:
            raise RangeError(f"a {name} of {value:g} {unit} is not above 0 {unit}")
    if not low_m < high_m:
        raise RangeError(f"the band begins at {1e6 * low_m:g} um and ends at {1e6 * high_m:g} um, not later")
    with place_errors(record):
        lines = lines_in(low_m, high_m)
        radiance = line_radiance_w_m2_sr(lines, kelvin, along_m2)
        photons = photon_radiance_s_m2_sr(lines, kelvin, along_m2)
        total = float(total_radiance_w_m2_sr(load_lines(), kelvin, along_m2))
    share = radiance / total if total > 0.0 else np.zeros_like(radiance)
    bright = np.sort(np.argsort(-radiance, kind="stable")[:PRINTED])
    strongest = int(np.argmax(radiance))
    name = f"{lines.label[strongest]} at {1e6 * lines.wavelength_m[strongest]:.4f} µm".strip()
    return Result(
        "glow",
        {
            "lines": table(
                column("wavelength", 1e6 * lines.wavelength_m, "um", decimals=5, description="vacuum, rest"),
                column("wavenumber", 1e-2 * lines.wavenumber_m1, "cm-1", decimals=3),
                column("band", lines.band),
                column("label", lines.label),
                column("upper_energy", 1e-2 * lines.upper_energy_m1, "cm-1", decimals=1),
                column("einstein_a", lines.einstein_a_s, "s-1"),
                column(
                    "weight",
                    lines.weight.astype(int),
                    description="g_ns (2J'+1) of the upper level",
                    shown=False,
                ),
                column("radiance", radiance, "W m-2 sr-1"),
                column("photon_radiance", photons, "s-1 m-2 sr-1", shown=False),
                column("share", share, description="of the radiance of all lines of the list", digits=3),
                caption=f"The {min(PRINTED, len(lines))} brightest of {len(lines)} lines",
                rows=bright.tolist(),
            )
        },
        {
            "target": Entry(record.name),
            "temperature": Entry(kelvin, "K"),
            "column": Entry(along_m2, "m-2", text=f"{words.quantity(along_m2, 'm-2', 4)} ({kind})"),
            "partition_function": Entry(float(partition_function(kelvin)), digits=6),
            "total_radiance": Entry(total, "W m-2 sr-1", label="total radiance, all lines of 1.9-5.5 µm"),
            "band_radiance": Entry(float(radiance.sum()), "W m-2 sr-1", label="radiance of this band"),
        },
        [
            f"The brightest of {len(lines)} lines is {name}; this band holds "
            f"{words.percent(float(share.sum()))} of the light of all lines."
        ],
        [
            *validity_warnings(kelvin),
            *equilibrium_warnings(fraction),
            *optical_depth_warnings(lines, kelvin, along_m2),
        ],
    )
