"""Scenarios of a request, one for each use of an instrument, and what several answers ask of them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.constants import arcsec

from coldglow.answers.common.inputs import described, place_errors
from coldglow.describe.records import LongitudeSystem, Orbit, Request, Use
from coldglow.errors import NotFoundError, RangeError
from coldglow.plan.goal import marginalise, snr
from coldglow.plan.stretches import Stretches, runs, table
from coldglow.report import words
from coldglow.scenario import Air, Scenario, scenario, watch
from coldglow.sky.orientation import absolute_phase_uncertainty_rad
from coldglow.sky.track import Track

Also = NDArray[np.bool_] | Callable[[Track], NDArray[np.bool_]] | None
"""What else must hold for a step to be used: a mask ndarray[time], or what gives one for a track."""


def scenes(request: Request, also: Also = None) -> tuple[Scenario, ...]:
    """Return the scenario of every use of the request over its dates.

    Raises:
        RangeError: the mask `also` has not one value for each step.

    """
    with place_errors(*described(request)):
        tracks = [restricted(watch(request, use), also) for use in request.uses]
        uses = zip(request.uses, tracks, strict=True)
        return tuple(scenario(request, use, track) for use, track in uses)


def restricted(track: Track, also: Also) -> Track:
    """Return the track, observable only where `also` holds too."""
    if also is None:
        return track
    allowed = np.asarray(also(track) if callable(also) else also, dtype=bool)
    if allowed.shape != track.observable.shape:
        raise RangeError(
            f"the further constraint has the shape {allowed.shape}, the track {track.observable.shape}: give "
            "one value for each step of the track, or a function of the track that returns them"
        )
    return replace(
        track,
        observable=track.observable & allowed,
        limited_by={**track.limited_by, "a further constraint forbids it": ~allowed},
    )


def choose_use(request: Request, instrument: str = "") -> Use:
    """Return the use of the instrument of that name, the first use for none.

    Raises:
        NotFoundError: the request names no such instrument.

    """
    if not instrument:
        return request.uses[0]
    for use in request.uses:
        if use.instrument.name == instrument:
            return use
    listed = words.listing([use.instrument.name for use in request.uses])
    raise NotFoundError(f"the request names no instrument `{instrument}`; it names {listed}")


def visits(scene: Scenario) -> Stretches:
    """Return every stretch of the scenario as one visit, overheads charged, in order of time."""
    operation, limits = scene.use.instrument.operation, scene.use.instrument.limits
    steps = scene.steps
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night, limits.longest_visit_s)
    return table(steps, first, end, scene.overhead_s, operation.visit_floor, scene.prior)


def information_rate(scene: Scenario) -> NDArray[np.float64]:
    """Return 1/sigma² of ln N per second of open shutter, ndarray[time], each step marginalised by itself."""
    rate: NDArray[np.float64] = marginalise(scene.steps.matrix)[:, 0, 0]
    return rate


def median_moment(scene: Scenario) -> int:
    """Return the usable step whose information rate is the median of all usable ones."""
    index = np.flatnonzero(scene.usable)
    rate = information_rate(scene)[index]
    return int(index[np.argsort(rate, kind="stable")[(index.size - 1) // 2]])


def hour_snr(scene: Scenario) -> NDArray[np.float64]:
    """Return the SNR that one hour on the clock at each step would bring, floors applied, ndarray[time]."""
    operation, share = scene.use.instrument.operation, scene.steps.shutter_share
    information = 3600.0 * information_rate(scene) * share
    return snr(information, operation.visit_floor, operation.common_floor)


def conditions_words(use: Use, air: Air) -> str:
    """Return the night assumed, in words."""
    if isinstance(use.instrument.place, Orbit):
        return "in space, no air"
    seeing = words.quantity(air.seeing_rad / arcsec, "arcsec", 2)
    return f"seeing {seeing} at 0.5 µm, {words.quantity(1e3 * air.water_m, 'mm', 2)} of water"


def dates_words(request: Request) -> str:
    """Return the span of the request's nights, in space of its days."""
    kind = "days" if request.in_space else "evenings"
    return f"{kind} of {words.days(request.dates.first, request.dates.last)}"


def longitude_words(system: LongitudeSystem, tdb_s: NDArray[np.float64]) -> str:
    """Return the longitude system and how well its phase is known at instants (TDB seconds from J2000)."""
    unsure_deg = float(np.degrees(np.max(absolute_phase_uncertainty_rad(system, tdb_s))))
    known = "known to" if unsure_deg < 180.0 else "unknown: the rotation period leaves"
    return (
        f"Longitudes are in system {system.name} and grow {system.grows}ward; the absolute longitude is "
        f"{known} ± {words.number(unsure_deg, 2)}° at these dates (1 sigma of the period since its epoch)."
    )


def unseen_words(scene: Scenario) -> str:
    """Return why nothing can be observed, as a sentence."""
    if scene.track.observable.any():
        return (
            f"{scene.target.name} can be observed from {scene.use.instrument.name}, but on none of the "
            "nights that the request may use."
        )
    return (
        f"{scene.target.name} can never be observed from {scene.use.instrument.name} on these dates: "
        f"{scene.track.why_not}."
    )
