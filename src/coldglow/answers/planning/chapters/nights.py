"""Chapter: how many nights to request, and what weather does to them."""

from __future__ import annotations

import numpy as np

from coldglow.describe.records import Request
from coldglow.report import words
from coldglow.report.figures.chance import ChanceCurve, probability_against_nights
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result


def nights_chapter(request: Request, result: Result) -> Section:
    """Return the chapter of the request's size."""
    table = result.table()
    pictures = []
    if len(table) > 1 and float(table["nights"][-1]) > float(table["nights"][0]):
        weather = request.weather
        requested = result.header["nights"].value if "nights" in result.header else None
        curve = ChanceCurve(
            str(result.header["weather"]),
            np.asarray(table["nights"], dtype=float),
            np.asarray(table["probability"], dtype=float),
            np.asarray(table["probability_error"], dtype=float),
        )
        figure = probability_against_nights(
            [curve],
            weather.probability,
            None if requested is None else float(requested),
            "day" if request.in_space else "night",
        )
        wanted = words.probability(weather.probability)
        pictures = [
            Picture(
                "probability",
                figure,
                f"Probability of reaching the goal against the nights requested; {wanted} is wanted.",
                "The probability that the clear ones among the nights requested reach every goal, and the "
                f"smallest request that reaches the wanted {wanted}.",
            )
        ]
    names = {"nights": "nights", "requested": "requested", "account": "time-account"}
    tables = {names[name]: each for name, each in result.tables.items()}
    return Section("How many nights to request", result.sentences, pictures, tables)
