"""Chapter: the rotation. Which longitudes the chosen visits cover, and how the light varies over a turn."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.chosen import Stretch, stretches_of
from coldglow.answers.common.scenes import hour_snr
from coldglow.answers.covering.choice import Choice
from coldglow.plan.goal import required_snr
from coldglow.report import words
from coldglow.report.figures.coverage import VisitTrack, coverage
from coldglow.report.figures.lightcurve import light_curve
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result


def turn_chapter(choice: Choice | None, result: Result) -> Section:
    """Return the chapter of a cover and its result."""
    pictures = []
    if choice is not None and choice.cover.chosen.size and not choice.question.request.coverage.spot:
        pictures.append(_bins(choice, result))
    pictures += list(_light(result))
    names = {"bins": "longitude-bins", "nights": "cover-nights", "light_curve": "light-curve"}
    tables = {names[name]: table for name, table in result.tables.items() if len(table)}
    return Section("Which hours cover the rotation", result.sentences, pictures, tables)


def _bins(choice: Choice, result: Result) -> Picture:
    request, bins = choice.question.request, result.table("bins")
    reached, goal, name = _measure(choice, result)
    stretches = stretches_of(choice.question.offers, choice.cover.chosen)
    several = len(request.uses) > 1
    system = stretches[0].scene.track.system.name
    figure = coverage(
        [_track(stretch, several) for stretch in stretches],
        np.append(bins["longitude"], bins["longitude_end"][-1]),
        reached,
        goal,
        bins["reachable"],
        name,
        "SNR of one hour",
        f"central longitude, system {system} (°)",
    )
    covered = int(choice.cover.covered.sum())
    share = f"{covered} of {choice.question.bins} bins reach their goal"
    return Picture(
        "coverage",
        figure,
        f"What the chosen visits gather in each bin of longitude: {share}. Below, the visits one by one.",
        f"What each bin of longitude gathers from the chosen visits, against its goal (line): {share}. "
        "Below, which longitudes each visit sees on the central meridian, coloured by the SNR of one hour.",
    )


def _measure(choice: Choice, result: Result) -> tuple[NDArray[np.float64], float, str]:
    """Return what each bin gathers, its goal, and the name of the quantity."""
    request, bins = choice.question.request, result.table("bins")
    if request.coverage.minutes is not None:
        return 60.0 * bins["clock_time"], request.coverage.minutes, "minutes of clock time per bin"
    if request.coverage.temperature_error_k is not None:
        goal = 1.0 / request.coverage.temperature_error_k
        return 1.0 / bins["temperature_error"], goal, "precision of the temperature per bin, 1/σ (K⁻¹)"
    needed = required_snr(float(request.coverage.snr or 0.0), request.goal.probability)
    return bins["snr"], float(needed), "expected SNR per bin"


def _track(stretch: Stretch, several: bool) -> VisitTrack:
    """Return where the central meridian goes while a stretch exposes, and the SNR of one hour there."""
    scene = stretch.scene
    lost = int((stretch.exposing_tt_s - stretch.start_tt_s) / scene.steps.step_s)
    inside = slice(min(stretch.first + lost, stretch.end - 1), stretch.end)
    label = words.day(stretch.night)
    if several:
        label += f", {scene.use.instrument.name}"
    longitude = np.degrees(scene.track.sub_observer_longitude_rad[inside])
    return VisitTrack(label, longitude, hour_snr(scene)[inside])


def _light(result: Result) -> Iterator[Picture]:
    if "light_curve" not in result.tables:
        return
    curve = result.table("light_curve")
    share, name = None, "spot"
    if "spot_share" in [column.name for column in curve.columns]:
        share, name = curve["spot_share"], curve.column("spot_share").description
    brightness = curve["relative_brightness"]
    figure = light_curve(curve["longitude"], brightness, share, name)
    swing = words.percent(float(brightness.max() - brightness.min()))
    yield Picture(
        "light-curve",
        figure,
        f"Light in the opening against central longitude; it varies by {swing} of its mean over a turn.",
        f"How the light in the opening changes over one turn, because the pattern turns with the planet: by "
        f"{swing} of its mean from least to most.",
    )
