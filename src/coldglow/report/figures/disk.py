"""What the beam sees of the disk: north, east, rotation axis, longitude grid, opening, seeing, spots.

North is up and east to the left, as on the sky. The grid is the orthographic projection of the spheroid;
nothing here enters a number.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle, Polygon
from matplotlib.patheffects import withStroke
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look


@dataclass(frozen=True, slots=True)
class DiskView:
    """The planet as seen: angles in degrees, sizes in arcsec.

    Latitudes are planetographic; `grows_west` is True where longitude grows to the west of the body.
    """

    diameter_arcsec: float
    polar_to_equatorial: float
    sub_observer_latitude_deg: float
    sub_observer_longitude_deg: float
    pole_angle_deg: float
    grows_west: bool


@dataclass(frozen=True, slots=True)
class SpotView:
    """A round spot, or an oval with `inner_radius_deg` > 0, radii as seen from the planet's centre."""

    name: str
    latitude_deg: float
    longitude_deg: float
    radius_deg: float
    inner_radius_deg: float = 0.0


@dataclass(frozen=True, slots=True)
class OpeningView:
    """Slit, field or aperture: width and length in arcsec, position angle of the long side, offset."""

    label: str
    width_arcsec: float
    length_arcsec: float
    position_angle_deg: float
    offset_arcsec: float = 0.0


@look.styled
def beam_on_disk(
    disk: DiskView, opening: OpeningView, seeing_arcsec: float, spots: Sequence[SpotView] = ()
) -> Figure:
    """Draw the disk under the opening, at the scale of the sky."""
    figure, ((main,),) = look.panels(4.6, margins_in=(0.6, 2.1, 0.35, 0.5))
    radius = disk.diameter_arcsec / 2
    _draw_globe(main, disk)
    for spot in spots:
        _draw_spot(main, disk, spot)
    _draw_opening(main, opening)
    reach = 1.45 * radius + 0.6 * seeing_arcsec
    reach = max(reach, min(opening.width_arcsec, opening.length_arcsec) * 0.75, 1.2 * seeing_arcsec)
    corner = max(0.08 * reach, 0.62 * seeing_arcsec) - reach
    main.add_patch(
        Circle(
            (-corner, corner),
            seeing_arcsec / 2,
            facecolor=look.TEAL,
            alpha=0.4,
            label=_seeing_label(seeing_arcsec),
        )
    )
    _draw_compass(main, reach)
    main.set_xlim(reach, -reach)
    main.set_ylim(-reach, reach)
    main.set_aspect("equal")
    main.set_xlabel("east of the centre (″)")
    main.set_title("north of the centre (″)")
    main.legend(loc="upper left", bbox_to_anchor=(1.03, 1.0), labelspacing=0.7)
    facts = (
        f"disk {words.short(disk.diameter_arcsec)}″\n"
        f"central longitude {disk.sub_observer_longitude_deg:.1f}°\n"
        f"central latitude {disk.sub_observer_latitude_deg:+.1f}°\n"
        f"north pole at {disk.pole_angle_deg % 360:.1f}° (N to E)"
    ).replace("-", "−")
    main.annotate(
        facts,
        (1.05, 0.0),
        xycoords="axes fraction",
        va="bottom",
        color=look.SOFT,
        fontsize=8.5,
        linespacing=1.5,
    )
    return figure


def _seeing_label(seeing_arcsec: float) -> str:
    return f"image blur {words.number(seeing_arcsec, 2)}″"


def _project(
    disk: DiskView, latitude_centric_rad: NDArray[np.float64], longitude_deg: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.bool_]]:
    """Return (east, north) in arcsec of points of the spheroid, and which of them face the observer."""
    radius, squash = disk.diameter_arcsec / 2, disk.polar_to_equatorial
    tilt = np.arctan(squash**2 * np.tan(np.radians(disk.sub_observer_latitude_deg)))
    # body axes: z along the north pole, x towards the observer's meridian, y towards the body's east
    sense = -1.0 if disk.grows_west else 1.0
    angle = sense * np.radians(longitude_deg - disk.sub_observer_longitude_deg)
    distance = 1.0 / np.sqrt(np.cos(latitude_centric_rad) ** 2 + (np.sin(latitude_centric_rad) / squash) ** 2)
    x = distance * np.cos(latitude_centric_rad) * np.cos(angle)
    y = distance * np.cos(latitude_centric_rad) * np.sin(angle)
    z = distance * np.sin(latitude_centric_rad)
    up = z * np.cos(tilt) - x * np.sin(tilt)  # towards the projected north pole
    # the outward normal (x, y, z / squash^2) against the line of sight
    facing = x * np.cos(tilt) + z / squash**2 * np.sin(tilt) > 0
    # body east points to celestial west when the pole is north and faces us: the observer sees it rise
    pole = np.radians(disk.pole_angle_deg)
    east = radius * (up * np.sin(pole) - y * np.cos(pole))
    north = radius * (up * np.cos(pole) + y * np.sin(pole))
    return east, north, facing


def _centric(disk: DiskView, graphic_deg: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.arctan(disk.polar_to_equatorial**2 * np.tan(np.radians(graphic_deg)))


def _draw_globe(axes: Axes, disk: DiskView) -> None:
    radius, squash = disk.diameter_arcsec / 2, disk.polar_to_equatorial
    tilt = np.arctan(squash**2 * np.tan(np.radians(disk.sub_observer_latitude_deg)))
    minor = np.sqrt(squash**2 * np.cos(tilt) ** 2 + np.sin(tilt) ** 2)
    turn, pole = np.linspace(0, 2 * np.pi, 241), np.radians(disk.pole_angle_deg)
    along, up = radius * np.cos(turn), radius * minor * np.sin(turn)
    limb = np.column_stack(
        [up * np.sin(pole) - along * np.cos(pole), up * np.cos(pole) + along * np.sin(pole)]
    )
    axes.add_patch(Polygon(limb, facecolor=look.BLUE, alpha=0.14, edgecolor="none"))
    axes.add_patch(Polygon(limb, fill=False, edgecolor=look.INK, linewidth=1.2))
    across = np.linspace(-89.9, 89.9, 121)
    for longitude in range(0, 360, 30):
        _hidden_line(axes, disk, np.radians(across), np.full(across.shape, float(longitude)), longitude == 0)
    around = np.linspace(0, 360, 241)
    for latitude in (-60, -30, 0, 30, 60):
        centric = np.full(around.shape, _centric(disk, np.array(float(latitude))))
        _hidden_line(axes, disk, centric, around, latitude == 0)
    _draw_longitudes(axes, disk)
    ends = np.array([np.pi / 2, -np.pi / 2])
    east, north, facing = _project(disk, ends, np.zeros(2))
    for sign, i in ((1, 0), (-1, 1)):
        tip = sign * 1.28 * radius * np.array([np.sin(pole), np.cos(pole)])
        axes.plot([east[i], tip[0]], [north[i], tip[1]], color=look.PLUM, linewidth=1.6,
                  linestyle="-" if facing[i] else look.DASHES[2], zorder=4)  # fmt: skip
    axes.plot([], [], color=look.PLUM, linewidth=1.6, label="rotation axis")
    out = np.array([np.sin(pole), np.cos(pole)])
    axes.annotate(
        "N pole",
        (1.3 * radius * out[0], 1.3 * radius * out[1]),
        xytext=(-9 * out[0], 9 * out[1]),
        textcoords="offset points",
        color=look.PLUM,
        ha="center",
        va="center",
        fontsize=8,
        zorder=7,
        path_effects=[withStroke(linewidth=3, foreground=look.PAPER)],
    )


def _hidden_line(
    axes: Axes, disk: DiskView, centric: NDArray[np.float64], longitude: NDArray[np.float64], bold: bool
) -> None:
    east, north, facing = _project(disk, centric, longitude)
    east, north = np.where(facing, east, np.nan), np.where(facing, north, np.nan)
    axes.plot(east, north, color=look.SOFT, alpha=0.9 if bold else 0.5, linewidth=1.1 if bold else 0.5)


def _draw_longitudes(axes: Axes, disk: DiskView) -> None:
    """Write the longitude at every 60 degrees along the parallel nearest to the centre of the disk."""
    marks = np.arange(0.0, 360.0, 60.0)
    latitude = float(np.clip(disk.sub_observer_latitude_deg, -50, 50)) + 0.0
    centric = np.full(marks.shape, _centric(disk, np.array(latitude)))
    east, north, facing = _project(disk, centric, marks)
    inner = facing & (np.hypot(east, north) < 0.42 * disk.diameter_arcsec)
    for x, y, mark in zip(east[inner], north[inner], marks[inner], strict=True):
        box = {"boxstyle": "round,pad=0.1", "facecolor": look.PAPER, "edgecolor": "none", "alpha": 0.75}
        axes.text(x, y, f"{mark:.0f}°", fontsize=7, ha="center", va="center", zorder=6, bbox=box)


def _draw_spot(axes: Axes, disk: DiskView, spot: SpotView) -> None:
    """Fill the visible part of a spot; an oval is drawn as a ring."""
    for radius_deg, fill in ((spot.radius_deg, True), (spot.inner_radius_deg, False)):
        if radius_deg <= 0:
            continue
        centre = float(_centric(disk, np.array(spot.latitude_deg)))
        reach, turn = np.radians(radius_deg), np.linspace(0, 2 * np.pi, 181)
        latitude = np.arcsin(np.sin(centre) * np.cos(reach) + np.cos(centre) * np.sin(reach) * np.cos(turn))
        step = np.degrees(
            np.arctan2(
                np.sin(turn) * np.sin(reach) * np.cos(centre),
                np.cos(reach) - np.sin(centre) * np.sin(latitude),
            )
        )
        east, north, facing = _project(disk, latitude, spot.longitude_deg + step)
        if not facing.any():
            continue
        order = (
            np.roll(np.arange(len(turn)), -int(np.argmin(facing)))
            if not facing.all()
            else np.arange(len(turn))
        )
        shape = np.column_stack([east, north])[order][facing[order]]
        if fill:
            axes.add_patch(
                Polygon(
                    shape,
                    facecolor=look.AMBER,
                    alpha=0.6,
                    edgecolor=look.INK,
                    linewidth=0.6,
                    zorder=3,
                    label=spot.name,
                )
            )
        else:
            axes.add_patch(
                Polygon(shape, facecolor=look.PAPER, alpha=0.7, edgecolor=look.INK, linewidth=0.6, zorder=3)
            )


def _draw_opening(axes: Axes, opening: OpeningView) -> None:
    angle = np.radians(opening.position_angle_deg)
    along = np.array([np.sin(angle), np.cos(angle)]) * opening.length_arcsec / 2
    across = np.array([np.cos(angle), -np.sin(angle)])
    centre, half = across * opening.offset_arcsec, across * opening.width_arcsec / 2
    corners = np.array(
        [centre - along - half, centre - along + half, centre + along + half, centre + along - half]
    )
    size = f"{words.short(opening.width_arcsec)}″ × {words.short(opening.length_arcsec)}″"
    axes.add_patch(
        Polygon(
            corners,
            fill=False,
            edgecolor=look.BRICK,
            linewidth=1.8,
            zorder=5,
            label=f"{opening.label}\n{size}",
        )
    )


def _draw_compass(axes: Axes, reach: float) -> None:
    """Draw the directions north and east in the lower right corner."""
    x, y = -0.92 * reach, -0.92 * reach
    for east, north, name in ((0.0, 1.0, "N"), (1.0, 0.0, "E")):
        tip = (x + 0.28 * reach * east, y + 0.28 * reach * north)
        axes.annotate("", tip, (x, y), arrowprops={"arrowstyle": "->", "color": look.INK, "linewidth": 1})
        place = (x + 0.34 * reach * east, y + 0.34 * reach * north)
        axes.annotate(name, place, ha="center", va="center", fontsize=8.5)
