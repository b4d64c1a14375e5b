"""The Earth's atmosphere: transmission at any wavelength, over a shifted line, over a pixel.

T = exp(-X (tau_dry + w tau_water)) with airmass X and precipitable water w. Telluric lines stay at rest;
the planet's line moves over them. Transmission is averaged, never optical depth. ``data/atmosphere.md``
says how the table was derived and how good it is.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import c
from scipy.interpolate import BSpline, make_interp_spline

from coldglow.errors import NotFoundError, RangeError
from coldglow.light.average import Shifts, moving_average, nodes_and_weights, shift_nodes, window
from coldglow.light.table import OPAQUE_TAU, read_table

Floats = NDArray[np.float64]

FINEST_LOG_STEP = 2.5e-6  # 0.75 km/s
ERROR_BANDS_UM = (
    (2.05, 2.35, 0.03),
    (3.45, 4.05, 0.03),
    (2.35, 2.45, 0.05),
    (3.15, 3.45, 0.05),
    (4.6, 5.2, 0.05),
)
LOWEST_PRESSURE_PA, HIGHEST_PRESSURE_PA = 55000.0, 80000.0


@dataclass(frozen=True, slots=True)
class Atmosphere:
    """Zenith optical depth on the grid first * exp(step * i), vacuum wavelength, ndarray[sample].

    `tau_water_per_m` is None for a table of one transmission column, which holds only the water
    `fixed_water_m` and cannot be scaled to another.
    """

    first_wavelength_m: float
    log_step: float
    tau_dry: Floats
    tau_water_per_m: Floats | None
    fixed_water_m: float | None
    height_m: float
    notes: tuple[str, ...]

    @property
    def wavelength_m(self) -> Floats:
        """Return the grid."""
        grid: Floats = self.first_wavelength_m * np.exp(self.log_step * np.arange(self.tau_dry.size))
        return grid

    @property
    def span_m(self) -> tuple[float, float]:
        """Return the shortest and longest wavelength."""
        last = self.first_wavelength_m * np.exp(self.log_step * (self.tau_dry.size - 1))
        return self.first_wavelength_m, float(last)

    def tau(self, water_m: float, part: slice = slice(None)) -> Floats:
        """Return the zenith optical depth of a part of the grid.

        Raises:
            RangeError: another water than the table's own is asked of a table that cannot be scaled.

        """
        if self.tau_water_per_m is not None:
            return self.tau_dry[part] + water_m * self.tau_water_per_m[part]
        if self.fixed_water_m is None or abs(water_m - self.fixed_water_m) > 1e-3 * self.fixed_water_m:
            held = "an unstated amount" if self.fixed_water_m is None else f"{1e3 * self.fixed_water_m:g} mm"
            raise RangeError(
                f"{1e3 * water_m:g} mm of water asked, but the transmission table has one column, made for "
                f"{held}, and cannot be scaled; give a table with tau_dry and tau_h2o_per_mm, or ask for its "
                "own water",
                "sky.water",
            )
        return self.tau_dry[part]

    def position(self, wavelength_m: ArrayLike) -> Floats:
        """Return the place on the grid, in samples.

        Raises:
            RangeError: a wavelength outside the table.

        """
        wavelength = np.asarray(wavelength_m, dtype=np.float64)
        place: Floats = np.log(wavelength / self.first_wavelength_m) / self.log_step
        if place.size and (place.min() < -0.5 or place.max() > self.tau_dry.size - 0.5):
            first, last = self.span_m
            bad = wavelength.flat[int(np.argmax(np.abs(place - 0.5 * self.tau_dry.size)))]
            raise RangeError(
                f"no transmission at {1e6 * bad:.4f} um; the table covers {1e6 * first:.3f} to "
                f"{1e6 * last:.3f} um",
                "band",
            )
        return place

    def transmission(self, wavelength_m: ArrayLike, airmass: ArrayLike, water_m: float) -> Floats:
        """Return the monochromatic transmission, ndarray[..., wavelength] for airmass [...].

        Linear interpolation between the samples, 1.5 km/s apart in the packaged table.
        """
        place = self.position(wavelength_m)
        first = max(int(place.min()) - 1, 0)
        part = slice(first, int(place.max()) + 3)
        depth = np.interp(place - first, np.arange(self.tau_dry[part].size), self.tau(water_m, part))
        return np.exp(-np.asarray(airmass, dtype=np.float64)[..., np.newaxis] * depth)

    def pixel_means(self, edges_m: ArrayLike, airmass: ArrayLike, water_m: float) -> Floats:
        """Return T averaged over pixels, ndarray[..., pixel], between growing edges ndarray[pixel + 1]."""
        edges = self.position(edges_m)
        first = max(int(edges[0]) - 1, 0)
        part = slice(first, int(edges[-1]) + 3)
        depth = self.tau(water_m, part)
        edges = edges - first
        whole = np.clip(edges.astype(int), 0, depth.size - 2)
        rest = edges - whole
        wavelength = np.exp(self.log_step * np.arange(depth.size))  # the mean is one over wavelength
        width = np.diff(np.exp(self.log_step * edges)) / self.log_step
        airmasses = np.asarray(airmass, dtype=np.float64)
        means = np.empty((airmasses.size, edges.size - 1))
        for row, value in zip(means, airmasses.ravel(), strict=True):
            sample = wavelength * np.exp(-value * depth)
            below = np.concatenate([[0.0], np.cumsum(0.5 * (sample[1:] + sample[:-1]))])
            rise = sample[whole + 1] - sample[whole]
            area = below[whole] + rest * sample[whole] + 0.5 * rest**2 * rise
            row[:] = np.diff(area) / width
        return means.reshape(*airmasses.shape, -1)


def load_atmosphere(height_m: float, path: str = "") -> Atmosphere:
    """Return the atmosphere above a site, from the packaged table or from the user's own (read once).

    The packaged table holds 2.6 and 4.2 km (738 and 600 hPa); other heights are interpolated in ln(tau)
    against ln(pressure), which is linear in height here.

    Raises:
        RangeError: a height whose pressure is outside 550-800 hPa (about 2.0-4.9 km), or a wrong table.
        NotFoundError: no such table.

    """
    if not path:
        return _packaged(height_m)
    try:
        changed_ns = Path(path).stat().st_mtime_ns
    except OSError as error:
        raise NotFoundError(f"the transmission table {path!r} cannot be read: {error.strerror}") from None
    return _own(path, height_m, changed_ns)


@lru_cache(maxsize=4)
def _packaged(height_m: float) -> Atmosphere:
    with files("coldglow.data").joinpath("atmosphere.npz").open("rb") as file, np.load(file) as packed:
        table = {name: packed[name].astype(np.float64) for name in packed.files}
    (low, high), log_pressure = table["height_m"], np.log(table["pressure_pa"])
    share = (height_m - low) / (high - low)
    pressure = np.exp(log_pressure[0] + share * (log_pressure[1] - log_pressure[0]))
    if not LOWEST_PRESSURE_PA <= pressure <= HIGHEST_PRESSURE_PA:
        slope = (high - low) / (log_pressure[1] - log_pressure[0])
        span = [
            low + slope * (np.log(p) - log_pressure[0]) for p in (HIGHEST_PRESSURE_PA, LOWEST_PRESSURE_PA)
        ]
        raise RangeError(
            f"the packaged atmosphere does not reach a height of {height_m:.0f} m "
            f"(about {pressure / 100.0:.0f} hPa); it serves {span[0]:.0f} to {span[1]:.0f} m: "
            "give a transmission table of your own as `atmosphere`",
            "site.height",
        )
    notes = []
    if not low <= height_m <= high:
        notes.append(
            f"The atmosphere at {height_m:.0f} m is extrapolated from {low:.0f} and {high:.0f} m; "
            "add a few per cent to the error of the transmission."
        )
    return Atmosphere(
        first_wavelength_m=float(table["first_wavelength_m"]),
        log_step=float(table["log_step"]),
        tau_dry=_frozen(_at_height(table["tau_dry"], share)),
        tau_water_per_m=_frozen(1000.0 * _at_height(table["tau_water_per_mm"], share)),
        fixed_water_m=None,
        height_m=height_m,
        notes=tuple(notes),
    )


def _frozen(array: Floats) -> Floats:
    array.flags.writeable = False
    return array


def _at_height(depth: Floats, share: float) -> Floats:
    """Return optical depth between (or a little beyond) two heights, geometric mean weighted by `share`."""
    if share in (0.0, 1.0):
        chosen: Floats = depth[int(share)].copy()
        return chosen
    tiny = 1e-9  # where the half-precision table holds 0
    log_low, log_high = np.log(np.maximum(depth, tiny))
    between: Floats = np.minimum(np.exp(log_low + share * (log_high - log_low)), OPAQUE_TAU)
    return between


@lru_cache(maxsize=4)
def _own(path: str, height_m: float, changed_ns: int) -> Atmosphere:
    """Return the user's table; `changed_ns` makes an edited file a new one."""
    table = read_table(path)
    log_wavelength = np.log(table.wavelength_m)
    step = max(float(np.diff(log_wavelength).min()), FINEST_LOG_STEP)
    grid = np.arange(log_wavelength[0], log_wavelength[-1] + 0.5 * step, step)
    water = table.tau_water_per_m
    notes = [
        f"The Earth's transmission is the user's own table, {path}; its errors are its maker's to state."
    ]
    coarsest_km_s = 1e-3 * c * float(np.diff(log_wavelength).max())
    if coarsest_km_s > 5.0:
        notes.append(
            f"Its samples lie up to {coarsest_km_s:.0f} km/s apart: "
            "a band average that cannot place telluric lines."
        )
    if table.height_m is not None and abs(table.height_m - height_m) > 300.0:
        notes.append(f"It was made for {table.height_m:.0f} m, the site lies at {height_m:.0f} m.")
    return Atmosphere(
        first_wavelength_m=float(table.wavelength_m[0]),
        log_step=step,
        tau_dry=_frozen(np.interp(grid, log_wavelength, table.tau_dry)),
        tau_water_per_m=None if water is None else _frozen(np.interp(grid, log_wavelength, water)),
        fixed_water_m=table.water_m,
        height_m=height_m,
        notes=tuple(notes),
    )


def line_transmission(
    atmosphere: Atmosphere,
    wavelength_m: ArrayLike,
    sigma_m_s: ArrayLike,
    range_rate_m_s: ArrayLike,
    airmass: ArrayLike,
    water_m: ArrayLike,
) -> Floats:
    """Return T averaged over each line as it arrives, ndarray[time, line].

    The line is a Gaussian of standard deviation `sigma_m_s` (thermal and rotational width and, for lines of
    position class C and D, `LineList.position_sigma_m_s` in quadrature) at lambda (1 + range rate / c): a
    receding planet's lines move to the red. nan where the airmass is nan.

    For each line T is averaged on a grid in velocity for a few airmasses (and waters), then interpolated: a
    cubic spline along velocity, polynomials in airmass and water. Error of the interpolation below 1e-4,
    and 2e-3 where more than five amounts of water come (measured in tests/light/test_atmosphere.py), against
    the table's own error of 0.03 and more.

    Args:
        atmosphere: the table.
        wavelength_m: ndarray[line], vacuum, rest.
        sigma_m_s: scalar or ndarray[line].
        range_rate_m_s: scalar or ndarray[time], positive receding.
        airmass: scalar or ndarray[time].
        water_m: scalar or ndarray[time], precipitable water at the zenith.

    """
    rest = np.atleast_1d(np.asarray(wavelength_m, dtype=np.float64))
    sigma = np.broadcast_to(np.asarray(sigma_m_s, dtype=np.float64), rest.shape)
    rate, mass, water = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(value, dtype=np.float64)) for value in (range_rate_m_s, airmass, water_m))
    )
    result = np.full((rate.size, rest.size), np.nan)
    known = np.flatnonzero(np.isfinite(rate + mass + water))
    if not known.size or not rest.size:
        return result
    rate, mass, water = rate[known], mass[known], water[known]
    rate = np.log1p(rate / c) / atmosphere.log_step  # in samples from here on
    widths = np.maximum(sigma / (c * atmosphere.log_step), 1e-3)
    shifts = shift_nodes(rate, float(widths.min()))
    mass_node, mass_weight = nodes_and_weights(mass, 6)
    water_node, water_weight = nodes_and_weights(water, 5)
    table = np.stack(
        [
            _average_line(atmosphere, place + shifts.first, width, shifts, mass_node, water_node)
            for place, width in zip(atmosphere.position(rest), widths, strict=True)
        ],
        axis=-1,
    )  # [shift, airmass and water, line]
    spline = make_interp_spline(shifts.nodes, table, k=3)
    along = BSpline.design_matrix(rate, spline.t, 3)
    weight = (mass_weight[:, :, np.newaxis] * water_weight[:, np.newaxis, :]).reshape(rate.size, -1)
    summed = np.zeros((rate.size, rest.size))
    for node in range(weight.shape[1]):
        used = np.flatnonzero(weight[:, node])
        summed[used] += weight[used, node, np.newaxis] * (along[used] @ spline.c[:, node, :])
    result[known] = np.clip(summed, 0.0, 1.0)
    return result


def _average_line(
    atmosphere: Atmosphere, start: float, width: float, shifts: Shifts, airmass: Floats, water_m: Floats
) -> Floats:
    """Return T averaged over one line at every shift from `start` on, ndarray[shift, airmass * water]."""
    index = np.clip(window(start, width, shifts), 0, atmosphere.tau_dry.size - 1)
    part = slice(index[0], index[-1] + 1)  # beyond the ends of the table its last samples go on
    depth = np.stack([atmosphere.tau(float(water), part) for water in water_m], axis=-1)[index - index[0]]
    sample = np.exp(-airmass[:, np.newaxis] * depth[:, np.newaxis, :]).reshape(index.size, -1)
    return moving_average(sample, start, width, shifts)


def transmission_error(
    atmosphere: Atmosphere,
    wavelength_m: ArrayLike,
    airmass: float,
    water_m: float,
    range_rate_m_s: float = 0.0,
) -> Floats:
    """Return the 1-sigma error of T at lines as the table's makers state it, ndarray[line].

    0.03 in 2.05-2.35 and 3.45-4.05 um, 0.05 in 2.35-2.45, 3.15-3.45 and 4.6-5.2, 0.1 elsewhere and within
    10 km/s of a deep telluric line (T < 0.5).
    """
    wavelength = np.atleast_1d(np.asarray(wavelength_m, dtype=np.float64)) * (1.0 + range_rate_m_s / c)
    error = np.full(wavelength.shape, 0.1)
    for low_um, high_um, value in ERROR_BANDS_UM:
        error[(wavelength >= low_um * 1e-6) & (wavelength <= high_um * 1e-6)] = value
    offset = np.linspace(-1e4, 1e4, 15) / c
    near = np.clip(wavelength[:, np.newaxis] * (1.0 + offset), *atmosphere.span_m)
    deep = atmosphere.transmission(near.ravel(), airmass, water_m).reshape(near.shape).min(axis=1) < 0.5
    return np.where(deep, 0.1, error)


def validity_warnings(atmosphere: Atmosphere, airmass_max: float, water_m: float) -> list[str]:
    """Return as sentences where a use goes beyond what the table was made for."""
    notes = list(atmosphere.notes)
    if atmosphere.tau_water_per_m is not None and not 0.0002 <= water_m <= 0.008:
        notes.append(
            f"The transmission table was checked for 0.2 to 8 mm of water; {1e3 * water_m:g} mm is beyond it."
        )
    if airmass_max > 3.0:
        notes.append(f"The transmission table was checked up to airmass 3; {airmass_max:.1f} is beyond it.")
    return notes
