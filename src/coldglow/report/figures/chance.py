"""Probability that the request succeeds, against the nights that it asks for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from coldglow.report import words
from coldglow.report.figures import look


@dataclass(frozen=True, slots=True, eq=False)
class ChanceCurve:
    """One kind of weather: label, and ndarray[count] of nights, probability and its standard error."""

    label: str
    nights: NDArray[np.float64]
    probability: NDArray[np.float64]
    error: NDArray[np.float64] | None = None


@look.styled
def probability_against_nights(
    curves: Sequence[ChanceCurve], wanted: float, requested: float | None = None, unit: str = "night"
) -> Figure:
    """Draw one curve per kind of weather, the wanted probability, and the request that reaches it.

    `unit` names what is asked for, in the singular.
    """
    figure, ((main,),) = look.panels(3.4, margins_in=(0.6, 0.25, 0.65, 0.5))
    markers = "osD^v"
    for index, curve in enumerate(curves):
        style = {"color": look.SERIES[index], "linestyle": look.DASHES[index], "linewidth": 1.3}
        main.plot(
            curve.nights, curve.probability, label=curve.label, marker=markers[index % 5], ms=4.5, **style
        )
        if curve.error is not None:
            main.errorbar(
                curve.nights,
                curve.probability,
                curve.error,
                fmt="none",
                ecolor=look.SERIES[index],
                elinewidth=1,
            )
    most = max(float(curve.nights[-1]) for curve in curves)
    main.axhline(wanted, color=look.BRICK, linewidth=1, linestyle=look.DASHES[1])
    main.annotate(
        f"wanted {words.probability(wanted)}", (0, wanted), xycoords=("axes fraction", "data"), xytext=(4, 4),
        textcoords="offset points", color=look.BRICK,
    )  # fmt: skip
    if requested is not None:
        main.axvline(requested, color=look.SOFT, linewidth=1)
        left = requested > 0.7 * most
        main.annotate(
            f"ask for {words.count(requested, unit)}", (requested, 0.03), xytext=(-4 if left else 4, 0),
            textcoords="offset points", ha="right" if left else "left",
        )  # fmt: skip
    main.set_ylim(0, 1.06)
    main.set_yticks(np.linspace(0, 1, 6), [f"{share} %" for share in range(0, 101, 20)])
    main.set_xlim(0, most * 1.03)
    main.xaxis.get_major_locator().set_params(integer=True)
    look.name_axes(main, f"{unit}s asked for", "probability of success")
    if len(curves) > 1:
        main.legend(loc="lower right", bbox_to_anchor=(1, 1.0), ncols=len(curves), borderaxespad=0.2)
    return figure
