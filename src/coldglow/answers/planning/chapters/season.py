"""Chapter: the season. Which hours are worth most, and the nights that are chosen, one by one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.chosen import Stretch
from coldglow.answers.common.scenes import hour_snr
from coldglow.plan.stretches import Steps
from coldglow.plan.stretches import season_chart as lay_out
from coldglow.report import words
from coldglow.report.figures.nights import NightCurve, chosen_nights
from coldglow.report.figures.season import season_chart
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result
from coldglow.scenario import Scenario
from coldglow.sky.clock import tt_from_iso

LISTED = 9  # nights named in a caption


def season_chapter(
    scenes: tuple[Scenario, ...], hours: Result, chosen: Sequence[Stretch], why: str
) -> Section:
    """Return the chapter; `chosen` are framed and drawn one by one, `why` says in a few words why these."""
    pictures = []
    for i, scene in enumerate(scenes):
        if not scene.usable.any():
            continue
        tag = f"-{i + 1}" if i else ""
        mine = [stretch for stretch in chosen if stretch.scene is scene]
        pictures += [_chart(scene, mine, tag, why)]
        if mine and np.isfinite(scene.track.altitude_rad).any():
            pictures += [_nights(scene, mine, tag)]
    return Section("Which hours are best", hours.sentences, pictures, {"hours": hours.table()})


def _hours_from(night: str, tt_s: NDArray[np.float64] | float) -> NDArray[np.float64]:
    """Return hours from 0 UTC of an evening date."""
    return np.asarray((np.asarray(tt_s) - tt_from_iso(night)) / 3600.0)


def _chart(scene: Scenario, chosen: Sequence[Stretch], tag: str, why: str) -> Picture:
    steps, track = scene.steps, scene.track
    hours, chart = lay_out(steps, hour_snr(scene))
    first = track.night_dates[0]
    offset = float(_hours_from(first, track.grid.tt_s[0])) - steps.time_s[0] / 3600.0
    dates = [str(np.datetime64(first) + day) for day in range(chart.shape[0])]
    dark = np.where(track.limited_by["daylight"], np.nan, 1.0)
    _, night = lay_out(_everywhere(scene), dark)
    begin, end = _edges(hours, night)
    columns = np.flatnonzero(np.isfinite(chart).any(axis=0) | np.isfinite(night).any(axis=0))
    part = slice(max(columns[0] - 1, 0), columns[-1] + 2) if columns.size else slice(None)
    frames = [
        (
            dates.index(stretch.night),
            float(_hours_from(stretch.night, stretch.start_tt_s)),
            float(_hours_from(stretch.night, stretch.end_tt_s)),
        )
        for stretch in chosen
    ]
    in_space = not np.isfinite(track.altitude_rad).any()
    figure = season_chart(
        dates,
        hours[part] + offset,
        chart[:, part],
        None if in_space else begin + offset,
        None if in_space else end + offset,
        frames,
    )
    name = scene.use.instrument.name
    sun = float(np.degrees(scene.use.instrument.limits.sun_altitude_max_rad))
    outline = (
        "" if in_space else f"the outline is the time with the Sun below {words.quantity(sun, 'deg', 2)}, "
    )
    frame = f"{outline}the frames are {why}" if frames else outline.removesuffix(", ")
    return Picture(
        f"season{tag}",
        figure,
        f"Hours of the night against date from {dates[0]} to {dates[-1]} for {name}, coloured by the SNR of "
        "one hour.",
        f"Every observable hour of the season with {name}, coloured by the SNR that one hour of clock time "
        f"would bring{'; ' if frame else ''}{frame}.",
    )


def _everywhere(scene: Scenario) -> Steps:
    return replace(scene.steps, observable=np.ones_like(scene.steps.observable))


def _edges(
    hours: NDArray[np.float64], dark: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return first and last dark hour of each day, nan where there is none."""
    some = np.isfinite(dark)
    half = 0.5 * (hours[1] - hours[0])
    first = np.where(some.any(axis=1), hours[np.argmax(some, axis=1)] - half, np.nan)
    last = np.where(
        some.any(axis=1), hours[some.shape[1] - 1 - np.argmax(some[:, ::-1], axis=1)] + half, np.nan
    )
    return first, last


def _nights(scene: Scenario, chosen: Sequence[Stretch], tag: str) -> Picture:
    track = scene.track
    curves = []
    for night in list(dict.fromkeys(stretch.night for stretch in chosen)):
        index = np.flatnonzero(
            (track.night == track.night_dates.index(night))
            & ~track.limited_by["daylight"]
            & (track.altitude_rad > 0.0)
        )
        picked = np.zeros(track.grid.time_s.size, dtype=bool)
        for stretch in chosen:
            if stretch.night == night:
                picked[stretch.first : stretch.end] = True
        curves.append(
            NightCurve(
                night,
                _hours_from(night, track.grid.tt_s[index]),
                np.degrees(track.altitude_rad[index]),
                np.degrees(track.sub_observer_longitude_rad[index]),
                picked[index],
            )
        )
    figure = chosen_nights(
        curves,
        float(np.degrees(scene.use.instrument.limits.altitude_min_rad)),
        f"central longitude, system {track.system.name}",
    )
    shown = [words.day(curve.night) for curve in curves]
    dates = words.listing(shown) if len(shown) <= LISTED else f"{len(shown)} nights from {shown[0]}"
    return Picture(
        f"nights-one-by-one{tag}",
        figure,
        f"Altitude and central longitude against the hour on {dates}.",
        "The chosen nights one by one: how high the planet stands (above) and which longitude faces us "
        "(below); the thick parts are the stretches to observe.",
    )
