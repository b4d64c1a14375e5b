"""The spectrum that reaches the detector, under the transmission of the air, with the lines named."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from coldglow.report.figures import look

_LABELS = 12
_FEW = 4  # pixels; an imager's are marked, not joined
_MAIN_IN, _LEADER_IN, _LETTER_IN = 1.9, 0.25, 0.067  # of the lower panel, of leaders, per letter of a name


@look.styled
def spectrum(
    wavelength_um: NDArray[np.float64],
    signal: NDArray[np.float64],
    continuum: NDArray[np.float64],
    background: NDArray[np.float64],
    transmission_um: NDArray[np.float64],
    transmission: NDArray[np.float64],
    line_um: NDArray[np.float64],
    line_labels: Sequence[str],
    line_weight: NDArray[np.float64],
    rate_name: str = "electrons per second and pixel",
    span_um: tuple[float, float] | None = None,
) -> Figure:
    """Draw the rates of lines, planet's continuum and background on the pixels, and the transmission.

    `wavelength_um`, `signal`, `continuum`, `background`: ndarray[pixel]; `transmission_um`,
    `transmission`: ndarray[wavelength] (empty in space); the others ndarray[line]. All lines are
    marked, the dozen of largest weight that have a label are named. `span_um` is what the axis shows, if
    that is more than the pixels' middles (the bands of an imager).
    """
    in_air = len(transmission_um) > 0
    names_in = _LEADER_IN + 0.1 + _LETTER_IN * max(map(len, line_labels), default=0)
    air_in = 0.7 if in_air else 0.0
    figure, axes = look.panels(
        _MAIN_IN + names_in + (air_in + 0.35 if in_air else 0.1) + 0.8,
        rows=(air_in, _MAIN_IN) if in_air else (1,),
        gap_in=(names_in, 0),
        margins_in=(0.6, 0.25, 0.35 if in_air else names_in + 0.1, 0.8),
    )
    main = axes[-1, 0]
    span = span_um or (float(wavelength_um[0]), float(wavelength_um[-1]))
    if in_air:
        air = axes[0, 0]
        x, low, high = envelope(transmission_um, transmission, span)
        air.fill_between(x, 0, low, color=look.TEAL, alpha=0.45, linewidth=0)
        air.fill_between(x, low, high, color=look.TEAL, alpha=0.2, linewidth=0)
        air.set_ylim(0, 1)
        air.set_xlim(*span)
        air.set_yticks([0, 0.5, 1], ["0", "50 %", "100 %"])
        air.tick_params(labelbottom=False)
        look.name_axes(air, "", "transmission of the air")
    largest = max(float(np.nanmax(part)) for part in (signal, continuum, background)) or 1.0
    floor = 0.03 * float(np.nanmax(signal)) or 1e-3 * largest
    if floor / 30 < (sunlight := 0.3 * float(np.nanmedian(continuum))) < floor:
        floor = sunlight
    for values, colour, name, dash in (
        (background, look.STONE, "background", look.DASHES[2]),
        (continuum, look.AMBER, "reflected sunlight", look.DASHES[1]),
        (signal, look.BLUE, "H₃⁺ lines", "-"),
    ):
        x, low, high = envelope(wavelength_um, values, span)
        hidden = "" if high.max() > floor else " (off scale)"
        low, high = np.maximum(low, floor / 10), np.maximum(high, floor / 10)  # zero has no logarithm
        if len(x) > _FEW:
            main.fill_between(x, low, high, color=colour, linewidth=0, alpha=0.6)
        shape = {"linestyle": dash} if len(x) > _FEW else {"linestyle": "none", "marker": "D"}
        main.plot(x, high, color=colour, linewidth=1, label=name + hidden, **shape)
    main.set_yscale("log")
    look.powers_of_ten(main.yaxis)
    main.set_ylim(floor, (largest / floor) ** 0.25 * largest)
    main.set_xlim(*span)
    look.name_axes(main, "wavelength in vacuum, as observed (µm)", "")
    main.text(0.01, 0.88, rate_name, transform=main.transAxes, va="center")
    main.legend(loc="upper center", bbox_to_anchor=(0.5, -0.24), ncols=3, columnspacing=1.5, borderaxespad=0)
    _name_lines(main, span, line_um, line_labels, line_weight)
    return figure


def envelope(
    x: NDArray[np.float64], y: NDArray[np.float64], span: tuple[float, float], bins: int = 900
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return the lowest and highest y in each of `bins` equal steps of x, so that narrow lines stay seen.

    Fewer points than bins are returned as they are.
    """
    inside = (x >= span[0]) & (x <= span[1])
    x, y = x[inside], y[inside]
    if len(x) <= 2 * bins:
        return x, y, y
    starts = np.unique(np.searchsorted(x, np.linspace(span[0], span[1], bins, endpoint=False)))
    starts = starts[starts < len(x)]
    return x[starts], np.minimum.reduceat(y, starts), np.maximum.reduceat(y, starts)


def spread(positions: NDArray[np.float64], gap: float, low: float, high: float) -> NDArray[np.float64]:
    """Return positions (ascending) moved apart to at least `gap` within low..high, as little as possible.

    Blocks of touching labels sit at the mean of what their members want (pool adjacent violators).
    """
    offsets = gap * np.arange(len(positions))
    blocks: list[list[float]] = []  # sum of wanted places, count
    for wanted in np.asarray(positions, float) - offsets:
        blocks.append([wanted, 1.0])
        while len(blocks) > 1 and blocks[-2][0] / blocks[-2][1] >= blocks[-1][0] / blocks[-1][1]:
            total, count = blocks.pop()
            blocks[-1] = [blocks[-1][0] + total, blocks[-1][1] + count]
    places = np.concatenate([np.full(int(count), total / count) for total, count in blocks])
    moved: NDArray[np.float64] = np.clip(places, low, max(low, high - offsets[-1])) + offsets
    return moved


def _name_lines(
    axes: Axes,
    span: tuple[float, float],
    line_um: NDArray[np.float64],
    labels: Sequence[str],
    weight: NDArray[np.float64],
) -> None:
    """Mark every line by a tick on top of the panel and name the strongest above, joined by a leader."""
    inside = np.flatnonzero((line_um >= span[0]) & (line_um <= span[1]))
    if not len(inside):
        return
    fraction = (line_um - span[0]) / (span[1] - span[0])
    strength = np.sqrt(weight / (weight[inside].max() or 1.0))
    for line in inside:
        axes.plot(
            [fraction[line]] * 2, [1, 1 - 0.05 * strength[line]], color=look.INK, linewidth=0.8,
            transform=axes.transAxes,
        )  # fmt: skip
    strongest = [line for line in inside[np.argsort(-weight[inside], kind="stable")] if labels[line]][
        :_LABELS
    ]
    named = np.array(sorted(strongest, key=lambda line: line_um[line]), int)
    if not len(named):
        return
    places = spread(fraction[named], 0.038, 0.0, 1.0)
    top = 1 + _LEADER_IN / _MAIN_IN
    across = axes.transAxes
    for line, place in zip(named, places, strict=True):
        ends = ([fraction[line], place], [1.0, top - 0.02])
        axes.plot(*ends, color=look.SOFT, linewidth=0.6, transform=across, clip_on=False)
        axes.text(
            place, top, labels[line], transform=across, rotation=90, ha="center", va="bottom", fontsize=7.5
        )
