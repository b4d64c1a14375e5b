"""Chapter: the season. Which hours are worth most, and the nights that are chosen, one by one."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.scenes import information_rate
from coldglow.plan.stretches import Steps
from coldglow.plan.stretches import season_chart as lay_out
from coldglow.report import words
from coldglow.report.figures.nights import NightCurve, chosen_nights
from coldglow.report.figures.season import season_chart
from coldglow.report.record import Picture, Section
from coldglow.report.results import Result
from coldglow.scenario import Scenario
from coldglow.sky.clock import tt_from_iso

MOST_NIGHTS = 9


def season_chapter(scenes: tuple[Scenario, ...], result: Result, best: int) -> Section:
    """Return the chapter; `best` is how many of the best stretches are framed and drawn one by one."""
    pictures = []
    for i, scene in enumerate(scenes):
        if not scene.usable.any():
            continue
        tag = f"-{i + 1}" if i else ""
        mine = np.flatnonzero(result["instrument"] == scene.use.instrument.name)[: min(best, MOST_NIGHTS)]
        pictures += [_chart(scene, result, mine, tag)]
        if mine.size and np.isfinite(scene.track.altitude_rad).any():
            pictures += [_nights(scene, result, mine, tag)]
    return Section("Which hours are best", result.sentences, pictures, {"hours": result.table()})


def _hour(scene: Scenario, iso: str, night: str) -> float:
    """Return hours from 0 UTC of an evening date."""
    return (tt_from_iso(iso) - tt_from_iso(night)) / 3600.0


def _chart(scene: Scenario, result: Result, rows: NDArray[np.int64], tag: str) -> Picture:
    steps, track = scene.steps, scene.track
    snr_hour = np.sqrt(3600.0 * information_rate(scene) * steps.shutter_share)
    hours, chart = lay_out(steps, snr_hour)
    first = track.night_dates[0]
    offset = _hour(scene, track.grid.start_utc, first) - steps.time_s[0] / 3600.0
    dates = [str(np.datetime64(first) + day) for day in range(chart.shape[0])]
    dark = np.where(track.limited_by["daylight"], np.nan, 1.0)
    _, night = lay_out(_everywhere(scene), dark)
    begin, end = _edges(hours, night)
    columns = np.flatnonzero(np.isfinite(chart).any(axis=0) | np.isfinite(night).any(axis=0))
    part = slice(max(columns[0] - 1, 0), columns[-1] + 2) if columns.size else slice(None)
    chosen = [
        (
            dates.index(str(result["night"][row])),
            _hour(scene, str(result["start"][row]), str(result["night"][row])),
            _hour(scene, str(result["end"][row]), str(result["night"][row])),
        )
        for row in rows
    ]
    in_space = not np.isfinite(track.altitude_rad).any()
    figure = season_chart(
        dates,
        hours[part] + offset,
        chart[:, part],
        None if in_space else begin + offset,
        None if in_space else end + offset,
        chosen,
    )
    name = scene.use.instrument.name
    return Picture(
        f"season{tag}",
        figure,
        f"Hours of the night against date from {dates[0]} to {dates[-1]} for {name}, coloured by the SNR of "
        "one hour.",
        f"Every observable hour of the season with {name}, coloured by the SNR that one hour of clock time "
        "would bring; the outline is the dark part of the night, the frames are the best stretches.",
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


def _nights(scene: Scenario, result: Result, rows: NDArray[np.int64], tag: str) -> Picture:
    track = scene.track
    hour = track.grid.time_s / 3600.0
    curves = []
    for row in sorted(rows, key=lambda r: str(result["night"][r])):
        night = str(result["night"][row])
        index = np.flatnonzero(
            (track.night == track.night_dates.index(night))
            & ~track.limited_by["daylight"]
            & (track.altitude_rad > 0.0)
        )
        origin = _hour(scene, track.grid.start_utc, night) - hour[0]
        at = hour[index] + origin
        start, end = (_hour(scene, str(result[name][row]), night) for name in ("start", "end"))
        curves.append(
            NightCurve(
                night,
                at,
                np.degrees(track.altitude_rad[index]),
                np.degrees(track.sub_observer_longitude_rad[index]),
                (at >= start) & (at <= end),
            )
        )
    system = track.system.name
    figure = chosen_nights(
        curves,
        float(np.degrees(scene.use.instrument.limits.altitude_min_rad)),
        f"central longitude, system {system}",
    )
    dates = words.listing([words.day(curve.night) for curve in curves])
    return Picture(
        f"nights-one-by-one{tag}",
        figure,
        f"Altitude and central longitude against the hour on {dates}.",
        "The best nights one by one: how high the planet stands (above) and which longitude faces us "
        "(below); the thick parts are the stretches that can be observed.",
    )
