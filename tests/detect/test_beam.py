"""The beam against geometry: a wide slit sees the whole, seeing conserves light, the slit cuts the source."""

import dataclasses
import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.ndimage import gaussian_filter

from coldglow.describe.records import Figure, ImageQuality
from coldglow.detect.beam import (
    Disk,
    ExtractionAperture,
    PointSpread,
    aperture_share,
    disk_in_aperture,
    extraction_aperture,
    point_spacing,
    point_spread,
    see_disk,
    slit_angle,
)
from coldglow.errors import RangeError
from coldglow.light.shell import path_factor, view_of, visible_points

ARCSEC = math.pi / 648000.0
WIDE = {"width_rad": 60 * ARCSEC, "length_rad": 200 * ARCSEC}
# Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, table 4
JUPITER = Figure(71492e3, 66854e3, 800e3, "Archinal et al. 2018")


def test_seeing_scales_with_wavelength_and_airmass(make):
    # fwhm0 (lambda/0.5 um)^-0.2 X^0.6: 0.7 arcsec at 4 um and airmass 1.5 by hand is 0.7 * 8^-0.2 * 1.5^0.6
    made = make.instrument(telescope={"aperture_m": 1e4})
    spread = point_spread(made.image, made.telescope, 4e-6, 0.7 * ARCSEC, 1.5)
    assert spread.fwhm_rad / ARCSEC == pytest.approx(0.7 * 8**-0.2 * 1.5**0.6, rel=1e-6)


def test_diffraction_is_the_width_of_an_airy_core(make):
    # FWHM of the Airy pattern 1.029 lambda/D: Born & Wolf 1999, Principles of Optics, 8.5.2 (from memory)
    image = ImageQuality("diffraction", 1.0, 0.0, 0.0)
    spread = point_spread(image, make.instrument().telescope, 4e-6, math.nan, math.nan)
    assert spread.fwhm_rad == pytest.approx(1.029 * 4e-6 / 4.0, rel=2e-3)


def test_a_core_and_a_halo_share_the_light(make):
    image = ImageQuality("adaptive", 0.4, 0.1 * ARCSEC, 0.02 * ARCSEC)
    spread = point_spread(image, make.instrument().telescope, 4e-6, 0.7 * ARCSEC, 1.0)
    assert sum(spread.share) == pytest.approx(1.0)
    assert spread.sigma_rad[0] == pytest.approx(math.hypot(0.1 / math.sqrt(8 * math.log(2)), 0.02) * ARCSEC)
    assert spread.sigma_rad[1] > 2 * spread.sigma_rad[0]


@given(
    width=st.floats(0.2, 3.0),
    length=st.floats(0.5, 8.0),
    angle=st.floats(-3.0, 3.0),
    offset=st.floats(-1.5, 1.5),
    sigma=st.floats(0.1, 0.8),
)
@settings(deadline=None, max_examples=8)
def test_blurring_the_aperture_is_blurring_the_image(width, length, angle, offset, sigma):
    """An image of a disk, blurred by a library's filter and summed in the rectangle."""
    step = 0.04
    axis = np.arange(-6, 6 + step / 2, step)
    x, y = np.meshgrid(axis, axis)
    image = ((x / 1.8) ** 2 + (y / 1.7) ** 2 <= 1.0) * step**2
    blurred = gaussian_filter(image, sigma / step, mode="constant", truncate=6)
    across = x * math.cos(angle) - y * math.sin(angle) - offset
    along = x * math.sin(angle) + y * math.cos(angle)
    # a pixel at the rectangle's edge counts with the part that is inside
    inside = np.clip((width / 2 - np.abs(across)) / step + 0.5, 0, 1)
    inside *= np.clip((length / 2 - np.abs(along)) / step + 0.5, 0, 1)
    aperture = ExtractionAperture(width, length, angle, offset)
    spread = PointSpread((1.0,), (sigma,))
    expected = (blurred * inside).sum()
    shares = aperture_share(x, y, aperture, spread)
    assert (image * shares).sum() == pytest.approx(expected, rel=0.01, abs=1e-3)


@pytest.mark.parametrize("sigma", [0.02, 0.2, 1.0])
@pytest.mark.parametrize("offset", [0.0, 0.7, 1.1])
def test_chord_integral_against_a_fine_grid(sigma, offset):
    aperture = ExtractionAperture(0.5, 1.6, 0.6, offset)
    spread = PointSpread((0.5, 0.5), (sigma, 3 * sigma))
    node, weight = np.polynomial.legendre.leggauss(400)
    x = np.outer(node, np.ones(node.size))
    y = np.sqrt(1 - node**2)[:, None] * 0.9 * node
    area = np.outer(weight * np.sqrt(1 - node**2) * 0.9, weight)
    expected = (area * aperture_share(x, y, aperture, spread)).sum()
    found = disk_in_aperture(Disk(1.0, 0.9, 0.0), aperture, spread)
    assert found == pytest.approx(expected, rel=2e-4, abs=1e-5)


@pytest.mark.parametrize("seeing", [0.05, 0.7, 2.0])
def test_a_slit_wider_than_the_disk_sees_the_whole(make, seeing):
    made = make.instrument(opening=WIDE, telescope={"aperture_m": 1e4})
    radius = 1.85 * ARCSEC
    beam = make.beam_of(made, radius_rad=radius, seeing_rad=seeing * ARCSEC, latitude_rad=0.0)
    assert beam.light_share[0] == pytest.approx(1.0, abs=0.1 * seeing / 1.85 + 0.001)
    # as much light as the shell sends: mean column over the disk times the disk's area
    view = view_of(make.uranus, 0.0)
    whole = path_factor(make.uranus, 0.0) * math.pi * radius**2 * view.outline_pole
    light = beam.path_factor[0] * beam.solid_angle_sr[0]
    assert light / beam.light_share[0] == pytest.approx(whole, rel=1e-3)
    # and all of the disk
    area = math.pi * radius**2 * view.outline_pole
    assert beam.disk_fill[0] * beam.solid_angle_sr[0] == pytest.approx(area, rel=0.1 * seeing / 1.85 + 0.001)


@given(seeing=st.floats(0.2, 3.0), angle=st.floats(-3.2, 3.2))
@settings(deadline=None, max_examples=20)
def test_seeing_conserves_light(seeing, angle):
    """Slits side by side, each blurred, together see all of the disk, whatever the seeing."""
    spread = PointSpread((0.3, 0.7), (0.3 * seeing, seeing))
    edges = np.linspace(-14.0, 14.0, 15)
    x, y = np.random.default_rng(3).uniform(-1.5, 1.5, (2, 50))
    total = sum(
        aperture_share(x, y, ExtractionAperture(b - a, 60.0, angle, 0.5 * (a + b)), spread)
        for a, b in pairwise(edges)
    )
    assert total == pytest.approx(np.ones(50), abs=1e-4)


def test_a_narrower_slit_loses_source_and_keeps_surface_brightness(make):
    wide = make.beam_of(make.instrument(opening={"width_rad": 0.8 * ARCSEC}))
    narrow = make.beam_of(make.instrument(opening={"width_rad": 0.4 * ARCSEC}))
    assert narrow.solid_angle_sr[0] == pytest.approx(0.5 * wide.solid_angle_sr[0])
    assert 0.45 < narrow.light_share[0] / wide.light_share[0] < 0.6
    assert narrow.path_factor[0] == pytest.approx(wide.path_factor[0], rel=0.05)


def test_worse_seeing_costs_light_in_the_slit(make):
    shares = [make.beam_of(make.instrument(), seeing_rad=s * ARCSEC).path_factor[0] for s in (0.4, 0.8, 1.6)]
    assert shares[0] > shares[1] > shares[2]


def test_slit_directions(make):
    disk = Disk(1.0, 0.9, pole_angle_rad=0.3, parallactic_angle_rad=1.0)
    opening = make.instrument().opening
    found = {
        name: slit_angle(dataclasses.replace(opening, angle=name, position_angle_rad=0.7), disk)
        for name in ("rotation-axis", "equator", "position-angle", "parallactic")
    }
    assert found == pytest.approx(
        {"rotation-axis": 0.0, "equator": math.pi / 2, "position-angle": 0.4, "parallactic": 0.7}
    )


def test_rotation_shows_along_the_equator_only(make):
    axis, equator = (
        make.beam_of(make.instrument(opening={"angle": angle}), latitude_rad=0.0)
        for angle in ("rotation-axis", "equator")
    )
    # equatorial speed 2 pi R / P = 2.59 km/s; a line of even light across a disk has rms speed v/sqrt(3) or
    # more, as the shell is brighter at the limb
    speed = 2 * math.pi * 25559e3 / 62064.0
    assert speed / math.sqrt(3) * 0.9 < equator.velocity_spread_m_s[0] < speed
    assert axis.velocity_spread_m_s[0] < 0.35 * equator.velocity_spread_m_s[0]
    assert abs(equator.velocity_m_s[0]) < 1e-6 * speed


def test_an_offset_slit_sees_one_limb_move(make):
    # rotation here is retrograde (negative rate): the celestial east limb recedes
    made = make.instrument(opening={"offset_rad": 1.2 * ARCSEC})
    assert make.beam_of(made, latitude_rad=0.0).velocity_m_s[0] > 500.0


@pytest.mark.parametrize(
    ("width", "length", "offset", "seeing"), [(0.5, 10, 0, 0.5), (0.5, 30, 20, 0.5), (1.0, 20, 0, 0.8)]
)
def test_points_are_fine_enough_for_a_narrow_slit_on_jupiter(make, width, length, offset, seeing):
    made = make.instrument(
        opening={
            "width_rad": width * ARCSEC,
            "length_rad": length * ARCSEC,
            "offset_rad": offset * ARCSEC,
        },
        operation={"nod": "off-slit", "on_fraction": 0.5},
    )
    radius = 22 * ARCSEC
    disk = Disk(radius, radius * view_of(JUPITER, 0.05).outline_pole, 0.4)
    spread = point_spread(made.image, made.telescope, 4e-6, seeing * ARCSEC, 1.2)
    light = []
    for spacing in (point_spacing(disk, made.opening, spread), 0.005):
        points = visible_points(JUPITER, (), 0.05, 0.0, make.turn, spacing)
        light.append(see_disk(points, disk, made.opening, made.operation, spread).path_factor[0])
    assert light[0] == pytest.approx(light[1], rel=5e-3)


def test_nods_within_the_slit_are_refused_on_jupiter(make):
    made = make.instrument()
    disk = Disk(22 * ARCSEC, 20.6 * ARCSEC, 0.0)
    spread = PointSpread((1.0,), (0.3 * ARCSEC,))
    with pytest.raises(RangeError, match="two positions") as caught:
        extraction_aperture(made.opening, made.operation, disk, spread)
    assert caught.value.key == "operation.nod"
    off = dataclasses.replace(made.operation, nod="off-slit", on_fraction=0.5)
    assert extraction_aperture(made.opening, off, disk, spread).length_rad == made.opening.length_rad


def test_background_rows_must_exist(make):
    made = make.instrument(operation={"nod": "stare", "background_rows": 3.0})
    disk = Disk(1.85 * ARCSEC, 1.8 * ARCSEC, 0.0)
    spread = PointSpread((1.0,), (0.3 * ARCSEC,))
    with pytest.raises(RangeError, match="background per row") as caught:
        extraction_aperture(made.opening, made.operation, disk, spread)
    assert caught.value.key == "operation.background_rows"
    fewer = dataclasses.replace(made.operation, background_rows=2.0)
    assert extraction_aperture(made.opening, fewer, disk, spread).width_rad == made.opening.width_rad


def test_pixels_of_slit_and_field(make):
    slit = make.beam_of(make.instrument())
    assert slit.pixels_spatial[0] == pytest.approx(slit.solid_angle_sr[0] / (0.75 * ARCSEC) / (0.15 * ARCSEC))
    field = make.beam_of(make.instrument("ifu"))
    assert field.pixels_spatial[0] == pytest.approx(field.solid_angle_sr[0] / (0.1 * ARCSEC) ** 2)
