"""What the opening sees of the disk: the point spread, the extraction aperture, and the means over it.

The image is a sum of round Gaussians. Instead of blurring the disk, the *aperture* is blurred: a rectangle
convolved with a Gaussian is a product of differences of error functions, exact and cheap, and gives for
each point of the shell the share of its light that arrives inside.

Left out: the blur of a real seeing profile outside the Gaussian (some per cent of the light lies further
out), field rotation within a step, and differential refraction between guiding and science wavelength.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields
from itertools import pairwise

import numpy as np
from scipy.constants import arcsec
from scipy.special import erf

from coldglow.describe.records import ImageQuality, Opening, Operation, Telescope
from coldglow.errors import RangeError
from coldglow.light.average import FWHM_PER_SIGMA
from coldglow.light.shell import ShellPoints

SEEING_WAVELENGTH_M = 0.5e-6
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(48)


@dataclass(frozen=True, slots=True)
class PointSpread:
    """Image of a point: Gaussians of these shares (sum 1) and widths; `fwhm_rad` is their weighted mean."""

    share: tuple[float, ...]
    sigma_rad: tuple[float, ...]

    @property
    def fwhm_rad(self) -> float:
        """Mean full width at half maximum, weighted by the shares."""
        return float(FWHM_PER_SIGMA) * sum(s * w for s, w in zip(self.share, self.sigma_rad, strict=True))


@dataclass(frozen=True, slots=True)
class Disk:
    """The opaque disk on the sky: half axes, and the position angle of its north pole (E of N)."""

    equatorial_radius_rad: float
    polar_radius_rad: float  # as projected: `shell.View.outline_pole` times the other
    pole_angle_rad: float
    parallactic_angle_rad: float = 0.0


@dataclass(frozen=True, slots=True)
class ExtractionAperture:
    """The rectangle whose light is summed.

    `angle_rad` is the direction of the long side, from the disk's north pole through east;
    `offset_rad` the shift of its centre from the disk's centre, 90 deg further through east.
    """

    width_rad: float
    length_rad: float
    angle_rad: float
    offset_rad: float

    @property
    def solid_angle_sr(self) -> float:
        """Area of the rectangle."""
        return self.width_rad * self.length_rad


@dataclass(frozen=True, slots=True)
class Beam:
    """Means over the extraction aperture; every field is an ndarray[moment].

    `path_factor` is line-of-sight over mean vertical column, averaged over the aperture (empty sky in it
    counts as zero); `disk_fill` the share of the aperture that the blurred disk covers; `light_share` the
    share of all the light of the visible shell that is inside. `velocity_m_s` is the mean rotational
    velocity of that light along the line of sight (positive receding), `velocity_spread_m_s` its rms.
    """

    solid_angle_sr: np.ndarray
    path_factor: np.ndarray
    disk_fill: np.ndarray
    light_share: np.ndarray
    velocity_m_s: np.ndarray
    velocity_spread_m_s: np.ndarray
    pixels_spatial: np.ndarray

    def take(self, index: np.ndarray | slice) -> Beam:
        """Return the moments that an index or a mask selects."""
        return Beam(*(getattr(self, f.name)[index] for f in fields(self)))


def point_spread(
    image: ImageQuality, telescope: Telescope, wavelength_m: float, seeing_rad: float, airmass: float
) -> PointSpread:
    """Return the image of a point at a wavelength.

    `seeing_rad` is the FWHM at 0.5 micron at the zenith; it shrinks as wavelength^-0.2 and grows as
    airmass^0.6 (Kolmogorov turbulence: Roddier 1981, Progress in Optics 19, 281, section 4, from memory).
    Diffraction (1.03 wavelength / aperture) and guiding drift (rms on each axis) add in quadrature.
    """
    diffraction_rad = 1.03 * wavelength_m / telescope.aperture_m

    def sigma(fwhm_rad: float) -> float:
        return math.hypot(fwhm_rad / FWHM_PER_SIGMA, image.drift_rad)

    core = sigma(image.core_fwhm_rad or diffraction_rad)
    if image.kind == "diffraction":
        return PointSpread((1.0,), (core,))
    seeing_fwhm_rad = seeing_rad * (wavelength_m / SEEING_WAVELENGTH_M) ** -0.2 * airmass**0.6
    halo = sigma(math.hypot(seeing_fwhm_rad, diffraction_rad))
    if image.kind == "seeing" or image.core_share == 0.0:
        return PointSpread((1.0,), (halo,))
    return PointSpread((image.core_share, 1.0 - image.core_share), (core, halo))


def slit_angle(opening: Opening, disk: Disk) -> float:
    """Return the direction of the opening's long side, from the disk's north pole through east, in rad."""
    if opening.angle == "rotation-axis":
        return 0.0
    if opening.angle == "equator":
        return math.pi / 2.0
    on_sky = disk.parallactic_angle_rad if opening.angle == "parallactic" else opening.position_angle_rad
    return on_sky - disk.pole_angle_rad


def _half_extents(disk: Disk, angle_rad: float) -> tuple[float, float]:
    """Return the half extents of the disk's ellipse across and along a direction."""
    a, b = disk.equatorial_radius_rad, disk.polar_radius_rad
    sin, cos = math.sin(angle_rad), math.cos(angle_rad)
    return math.hypot(a * cos, b * sin), math.hypot(a * sin, b * cos)


def extraction_aperture(
    opening: Opening, operation: Operation, disk: Disk, spread: PointSpread, rim: float = 1.0
) -> ExtractionAperture:
    """Choose the rectangle to sum: the shell plus one FWHM (half of it on each side), cut by the opening.

    The shell reaches to `rim` times the disk's half axes. Across a slit the width of the slit; along it,
    and both ways in an IFU or imager, the shell plus the blur (common practice for an
    extended source; the corners of the rectangle hold only sky, so the SNR of a round source is up to 12 %
    lower than with a round aperture of that diameter).

    Raises:
        RangeError: nods within the opening that cannot hold the disk at both positions, or background
            rows asked for that the opening does not have.

    """
    angle_rad = slit_angle(opening, disk)
    across, along = _half_extents(disk, angle_rad)
    wanted_length = 2.0 * rim * along + spread.fwhm_rad
    wanted_width = 2.0 * rim * across + spread.fwhm_rad
    width = opening.width_rad if opening.kind == "slit" else min(opening.width_rad, wanted_width)
    if operation.nod == "on-slit" and wanted_length > 0.5 * opening.length_rad:
        raise RangeError(
            f"Nods within the opening need room for the target at two positions: 2 x "
            f"{wanted_length / arcsec:.2f} arcsec (disk and blur), but the length is "
            f"{opening.length_rad / arcsec:.2f} arcsec. Use off-slit nods, or a longer opening.",
            "operation.nod",
        )
    length = min(opening.length_rad, wanted_length)
    if operation.nod == "stare" and math.isfinite(operation.background_rows):
        room = opening.width_rad * opening.length_rad / (width * wanted_length) - 1.0
        if room < operation.background_rows:
            raise RangeError(
                f"A stare with {operation.background_rows:g} rows of background per row on the target "
                f"needs more sky than the opening holds beside the target ({max(room, 0.0):.2g} per row). "
                "Ask for fewer rows, off-slit nods, or a modelled background (`inf`).",
                "operation.background_rows",
            )
    return ExtractionAperture(width, length, angle_rad, opening.offset_rad)


def _box(distance: np.ndarray, half: float, sigma: float) -> np.ndarray:
    """Return the share of a Gaussian centred at `distance` that falls into [-half, half]."""
    scale = 1.0 / (math.sqrt(2.0) * sigma)
    inside: np.ndarray = 0.5 * (erf((distance + half) * scale) - erf((distance - half) * scale))
    return inside


def _box_integral(distance: np.ndarray, half: float, sigma: float) -> np.ndarray:
    """Return the antiderivative of `_box` with respect to the distance."""
    root = math.sqrt(2.0) * sigma

    def primitive(t: np.ndarray) -> np.ndarray:
        value: np.ndarray = t * erf(t) + np.exp(-t * t) / math.sqrt(math.pi)
        return value

    return np.asarray(
        0.5 * root * (primitive((distance + half) / root) - primitive((distance - half) / root))
    )


def aperture_share(
    x_rad: np.ndarray, y_rad: np.ndarray, aperture: ExtractionAperture, spread: PointSpread
) -> np.ndarray:
    """Return the share of the light of points that falls into the aperture: ndarray of the points' shape.

    x toward east of the disk's north pole, y toward it, from the disk's centre.
    """
    sin, cos = math.sin(aperture.angle_rad), math.cos(aperture.angle_rad)
    across = x_rad * cos - y_rad * sin - aperture.offset_rad
    along = x_rad * sin + y_rad * cos
    share = np.zeros(np.shape(x_rad))
    for part, sigma in zip(spread.share, spread.sigma_rad, strict=True):
        share += (
            part
            * _box(across, 0.5 * aperture.width_rad, sigma)
            * _box(along, 0.5 * aperture.length_rad, sigma)
        )
    return share


def disk_in_aperture(disk: Disk, aperture: ExtractionAperture, spread: PointSpread) -> float:
    """Return the integral of the aperture's share over the uniform disk, in sr.

    Along chords parallel to the long side the integral is closed; across them Gauss-Legendre in the arc
    sine of the distance, split at the aperture's edges (48 nodes a piece: 2e-4 of the result against a
    fine grid also where the blur is a fiftieth of the radius; tests/detect/test_beam.py).
    """
    a, b = disk.equatorial_radius_rad, disk.polar_radius_rad
    sin, cos = math.sin(aperture.angle_rad), math.cos(aperture.angle_rad)
    quadratic = (sin / a) ** 2 + (cos / b) ** 2
    mixed = sin * cos * (1.0 / a**2 - 1.0 / b**2)
    reach = a * b * math.sqrt(quadratic)
    edges = [aperture.offset_rad + side * 0.5 * aperture.width_rad for side in (-1.0, 1.0)]
    cuts = [-0.5 * math.pi, *(math.asin(min(max(e / reach, -1.0), 1.0)) for e in edges), 0.5 * math.pi]
    total = 0.0
    for low, high in pairwise(cuts):
        if high <= low:
            continue
        angle = 0.5 * (low + high) + 0.5 * (high - low) * _NODES
        across = reach * np.sin(angle)
        weight = 0.5 * (high - low) * _WEIGHTS * reach * np.cos(angle)
        middle = -mixed * across / quadratic
        half_chord = np.cos(angle) / math.sqrt(quadratic)
        for part, sigma in zip(spread.share, spread.sigma_rad, strict=True):
            chord = _box_integral(middle + half_chord, 0.5 * aperture.length_rad, sigma) - _box_integral(
                middle - half_chord, 0.5 * aperture.length_rad, sigma
            )
            shares = _box(across - aperture.offset_rad, 0.5 * aperture.width_rad, sigma)
            total += part * float(np.sum(weight * shares * chord))
    return total


def point_spacing(disk: Disk, opening: Opening, spread: PointSpread) -> float:
    """Return how far apart (in equatorial radii) the points of the shell may lie for `see_disk`.

    The aperture's blurred edges must not fall between points: slit widths and blurs far below the disk's
    radius ask for fine points. Light in the aperture within 0.5 % (tests/detect/test_beam.py), also for a
    slit of half an arcsecond on Jupiter; between 0.008 and 0.08, that is 150 000 and 1 500 points.
    """
    side = min(opening.width_rad, opening.length_rad, 2.0 * disk.equatorial_radius_rad + spread.fwhm_rad)
    blurred = math.hypot(min(spread.sigma_rad), side / 12.0)
    return min(max(1.2 * blurred / disk.equatorial_radius_rad, 0.008), 0.08)


def see_disk(
    points: ShellPoints,
    disk: Disk,
    opening: Opening,
    operation: Operation,
    spread: PointSpread,
) -> Beam:
    """Return the beam of one moment (arrays of length 1).

    Raises:
        RangeError: see `extraction_aperture`.

    """
    radius_rad = disk.equatorial_radius_rad
    rim = float(np.max(np.hypot(points.x, points.y * radius_rad / disk.polar_radius_rad), initial=1.0))
    aperture = extraction_aperture(opening, operation, disk, spread, rim)
    share = aperture_share(points.x * radius_rad, points.y * radius_rad, aperture, spread)
    light = share * points.weight
    inside = float(np.sum(light))
    mean = float(np.sum(light * points.velocity_m_s)) / inside if inside > 0.0 else 0.0
    square = float(np.sum(light * (points.velocity_m_s - mean) ** 2)) / inside if inside > 0.0 else 0.0
    rows = aperture.length_rad / opening.pixel_rad
    columns = 1.0 if opening.kind == "slit" else max(aperture.width_rad / opening.pixel_rad, 1.0)
    values = (
        aperture.solid_angle_sr,
        inside * radius_rad**2 / aperture.solid_angle_sr,
        disk_in_aperture(disk, aperture, spread) / aperture.solid_angle_sr,
        inside / float(np.sum(points.weight)),
        mean,
        math.sqrt(square),
        max(rows, 1.0) * columns,
    )
    return Beam(*(np.array([value]) for value in values))


def join_beams(beams: Sequence[Beam]) -> Beam:
    """Return one beam record of all the moments, in order."""
    return Beam(*(np.concatenate([getattr(beam, f.name) for beam in beams]) for f in fields(Beam)))
