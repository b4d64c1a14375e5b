"""The picture of the disk holds the same light as the points, and the graticule lies on the body."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coldglow.describe.records import Figure, LongitudeSystem, Spot
from coldglow.light.disk import disk_image, graticule
from coldglow.light.shell import visible_points

FIGURE = Figure(60_268e3, 54_364e3, 1_500e3, "")
SYSTEM = LongitudeSystem("west", 0.0, 1.6e-4, "west", 39_270.0, 1.0, 0.0, "")
SPOTS = (
    Spot("spot", math.radians(30.0), math.radians(40.0), "", math.radians(12.0), 0.0, 0.3),
    Spot("oval", math.radians(65.0), math.radians(190.0), "", math.radians(18.0), math.radians(12.0), 0.4),
)


@pytest.mark.parametrize("spots", [(), SPOTS])
@pytest.mark.parametrize("latitude_deg", [0.0, 25.0, -70.0])
def test_picture_and_points_hold_the_same_light_in_the_same_place(spots, latitude_deg):
    # two ways over the same shell: along lines of sight, and over its surface
    view = (math.radians(latitude_deg), math.radians(20.0), SYSTEM)
    image = disk_image(FIGURE, spots, *view, oversample=8)  # the sharp edge of an oval at the limb needs it
    points = visible_points(FIGURE, spots, *view)
    side = image.edges[1] - image.edges[0]
    middle = 0.5 * (image.edges[1:] + image.edges[:-1])
    light = image.column.sum() * side**2
    assert light == pytest.approx(points.total, rel=3e-3)
    assert (image.column.sum(axis=0) @ middle) * side**2 / light == pytest.approx(
        points.x @ points.weight / points.total, abs=3e-3
    )
    assert (image.column.sum(axis=1) @ middle) * side**2 / light == pytest.approx(
        points.y @ points.weight / points.total, abs=3e-3
    )


def test_blur_conserves_light_and_lowers_the_limb():
    sharp = disk_image(FIGURE, (), 0.3, 0.0, SYSTEM, half_width=2.0)
    soft = disk_image(FIGURE, (), 0.3, 0.0, SYSTEM, half_width=2.0, blur_fwhm=0.3)
    assert soft.column.sum() == pytest.approx(sharp.column.sum(), rel=1e-4)
    assert soft.column.max() < sharp.column.max()


def test_middle_of_an_even_disk_shows_one_vertical_column_and_the_annulus_more():
    sphere = Figure(25_000e3, 25_000e3, 1_000e3, "")
    image = disk_image(sphere, (), 0.0, 0.0, SYSTEM, pixels=201)
    assert image.column[100, 100] == pytest.approx(1.0, rel=1e-3)
    # just outside the opaque limb front and back add: 2/sqrt(1 - (b/(R+h))^2)
    middle = 0.5 * (image.edges[1:] + image.edges[:-1])
    index = int(np.searchsorted(middle, 1.012))
    closed = 2.0 / math.sqrt(1.0 - (middle[index] / 1.04) ** 2)
    assert image.column[100, index] == pytest.approx(closed, rel=0.02)
    assert image.column[100, int(np.searchsorted(middle, 1.06))] == 0.0


def test_graticule_lies_on_the_visible_body():
    lines = graticule(FIGURE, math.radians(20.0), math.radians(40.0), SYSTEM)
    assert [value for value, _, _ in lines.parallels] == [-60.0, -30.0, 0.0, 30.0, 60.0]
    assert [value for value, _, _ in lines.meridians] == list(np.arange(0.0, 360.0, 30.0))
    outline_x, outline_y = lines.outline
    half = outline_y.max()
    for _, x, y in (*lines.parallels, *lines.meridians):
        seen = np.isfinite(x)
        assert np.all(x[seen] ** 2 + (y[seen] / half) ** 2 <= 1.0 + 1e-12)
    assert outline_x.max() == pytest.approx(1.0)


def test_the_sub_observer_point_is_the_middle_of_the_disk():
    # planetographic latitude 30 deg and longitude 60 deg W face the observer: there those two lines cross.
    # The point whose *planetocentric* direction is the observer's lies at x = y = 0.
    a, c = FIGURE.equatorial_radius_m, FIGURE.polar_radius_m
    sub = math.radians(30.0)
    lines = graticule(FIGURE, sub, math.radians(60.0), SYSTEM)
    meridian = next((x, y) for value, x, y in lines.meridians if value == 60.0)
    seen = np.isfinite(meridian[0])
    assert np.abs(meridian[0][seen]).max() < 1e-12
    latitude = np.linspace(-90.0, 90.0, 181)
    assert meridian[1][latitude == 30.0] == pytest.approx([0.0], abs=1e-12)
    assert c < a
