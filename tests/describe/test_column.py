"""Vertical and line-of-sight column against an integral over the disk, ray by ray."""

import math

import pytest
from scipy.integrate import quad

from coldglow.describe.column import line_of_sight_column, mean_path_factor, vertical_column
from coldglow.describe.records import Estimate, Figure


def along_the_ray(impact, radius, height):
    """Length of a ray in a thin shell over its thickness: front half, and back half beyond the body."""
    slant = 1 / math.sqrt(1 - (impact / (radius + height)) ** 2)
    return slant if impact < radius else 2 * slant


@pytest.mark.parametrize("ratio", [0.007, 0.02, 0.06, 0.2])
def test_the_closed_form_is_the_integral_over_the_disk(ratio):
    # published: path factor 1/sqrt(1 - (b/(R+h))^2) for impact parameter b (common practice)
    edge = 1 + ratio
    integral = 0.0
    for start, stop in ((0, 1), (1, edge)):  # b = edge sin(a): the singularity at the limb disappears
        low, high = math.asin(start / edge), math.asin(stop / edge)
        integral += quad(
            lambda a: 2 * along_the_ray(edge * math.sin(a), 1, ratio) * edge**2 * math.sin(a) * math.cos(a),
            low,
            high if stop < edge else high - 1e-9,
        )[0]
    assert mean_path_factor(Figure(1.0, 1.0, ratio, "")) == pytest.approx(integral, rel=1e-6)


def test_a_shell_without_height_gives_two():
    assert mean_path_factor(Figure(25559e3, 24973e3, 0.0, "")) == 2


def test_there_and_back():
    figure = Figure(25559e3, 24973e3, 1500e3, "")
    column = Estimate(1e15, 2e14, 1e14)
    back = vertical_column(line_of_sight_column(column, figure), figure)
    assert back.value == pytest.approx(column.value, rel=1e-15)
    assert back.uncertainty == pytest.approx(column.uncertainty, rel=1e-15)
    assert back.scatter == pytest.approx(column.scatter, rel=1e-15)
