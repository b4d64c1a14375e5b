"""The path of the data as one readable function: descriptions and a state in, information over time out.

Target, instrument and dates give a track; the steps that can be observed give moments; the disk seen
through the opening at each moment gives a beam; beam, air and state give counts; counts give the Fisher
matrix per second of open shutter. Everything that decides (which hours, how many nights) starts from the
`Scenario` made here.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.describe.records import (
    Conditions,
    Emission,
    Instrument,
    Request,
    Setting,
    Site,
    Sky,
    Target,
    Use,
)
from coldglow.detect.exposure import Exposure, Glow, Moments, expose_moments
from coldglow.detect.integration import visit_overhead_s
from coldglow.detect.season import beams
from coldglow.light.atmosphere import Atmosphere, load_atmosphere
from coldglow.light.atmosphere import validity_warnings as atmosphere_warnings
from coldglow.light.cooling import emission_at
from coldglow.light.emission import equilibrium_warnings, optical_depth_warnings, validity_warnings
from coldglow.light.lines import load_lines
from coldglow.light.shell import path_factor
from coldglow.plan.stretches import Steps, runs
from coldglow.sky.clock import DAY_S, TimeGrid, night_numbers, season_grid
from coldglow.sky.track import Track, make_track

Array = NDArray[np.float64]

MOMENT_SPACING_S = 1800.0  # information is interpolated between moments; tests measure what that costs
MOMENTS_PER_TURN = 36  # with spots


@dataclass(frozen=True, slots=True)
class State:
    """The ionosphere: temperature, vertical column (mean over the shell), share of it in equilibrium."""

    temperature_k: float
    column_m2: float
    lte_fraction: float = 1.0

    @property
    def shining_m2(self) -> float:
        """Column that glows as if in equilibrium."""
        return self.column_m2 * self.lte_fraction


@dataclass(frozen=True, slots=True)
class Air:
    """The night assumed: seeing (FWHM at 0.5 micron, zenith) and precipitable water."""

    seeing_rad: float
    water_m: float


@dataclass(frozen=True, slots=True)
class Scenario:
    """Information over time for one target, instrument, setting, state and air; arrays are ndarray[time]."""

    target: Target
    use: Use
    state: State
    air: Air
    track: Track
    usable: NDArray[np.bool_]  # observable, on a night that the request may use
    steps: Steps
    moments: NDArray[np.int64]  # ndarray[moment], steps that were worked out; the rest is interpolated
    exposure: Exposure | None  # at the moments; None where nothing can be observed
    prior: Array  # ndarray[4, 4], added once to the sum of each visit
    warnings: tuple[str, ...]

    @property
    def overhead_s(self) -> float:
        """Clock time that each visit costs before its first exposure."""
        return visit_overhead_s(self.use.instrument.operation)


def emission_of(request: Request) -> Emission:
    """Return the target's emission in the middle of the request's dates, as its cooling law has made it.

    A temperature measured years before the run is not that of the run; outlook and plan must agree.
    """
    first, last = np.datetime64(request.dates.first), np.datetime64(request.dates.last)
    return emission_at(request.target.emission, request.target.cooling, str(first + (last - first) // 2))


def state_of(request: Request) -> State:
    """Return the state of the target in the middle of the request's dates."""
    emission = emission_of(request)
    return State(emission.temperature_k.value, emission.column_m2.value, emission.lte_fraction.value)


def air_of(sky: Sky, conditions: Conditions) -> Air:
    """Return the night assumed at a site: a quartile of it, or what the request states instead."""
    seeing, water = conditions.seeing_rad, conditions.water_m
    return Air(
        getattr(sky.seeing_rad, conditions.name) if seeing is None else seeing,
        getattr(sky.water_m, conditions.name) if water is None else water,
    )


def air_over(instrument: Instrument) -> Atmosphere | None:
    """Return the atmosphere above an instrument, None in space."""
    place = instrument.place
    return load_atmosphere(place.height_m, instrument.atmosphere) if isinstance(place, Site) else None


def watch(request: Request, use: Use) -> Track:
    """Return the track of the request's target over its nights at one site."""
    dates = request.dates
    grid = season_grid(dates.first, dates.last, dates.step_s, use.instrument.place)
    return follow(request, use, grid)


def follow(request: Request, use: Use, grid: TimeGrid) -> Track:
    """Return the track of the request's target over any grid of instants at one site."""
    target, instrument = request.target, use.instrument
    systems = {system.name: system for system in target.rotation.systems}
    system = systems[request.longitudes]
    return make_track(target, instrument.place, instrument.limits, grid, system, request.ephemeris)


def usable_steps(request: Request, track: Track) -> NDArray[np.bool_]:
    """Return ndarray[time]: observable, on an offered night (or half of one), not on a forbidden one."""
    dates = request.dates

    def allows(day: str, half: str) -> bool:
        named = {day, f"{day} {half}"}
        return (not dates.offered or bool(named & {*dates.offered})) and not named & {*dates.forbidden}

    allowed = np.array([[allows(day, half) for half in ("first", "second")] for day in track.night_dates])
    on_a_night = track.night >= 0
    half = second_half(track).astype(np.int64)
    return np.asarray(track.observable & on_a_night & allowed[np.where(on_a_night, track.night, 0), half])


def second_half(track: Track) -> NDArray[np.bool_]:
    """Return ndarray[time]: after local mean midnight, so that twelve hours before it was the same night."""
    tt_s = track.grid.tt_s
    return np.asarray(night_numbers(track.place, tt_s - 0.5 * DAY_S) == night_numbers(track.place, tt_s))


@dataclass(frozen=True, slots=True)
class Sight:
    """What is seen from where through how much air: all that stays the same whatever the ionosphere does."""

    target: Target
    use: Use
    air: Air
    goal_lines: tuple[str, ...]
    track: Track
    usable: NDArray[np.bool_]  # ndarray[time]
    chosen: NDArray[np.int64]  # ndarray[moment]
    moments: Moments | None  # None where nothing can be observed
    atmosphere: Atmosphere | None


def sight(request: Request, use: Use, track: Track, air: Air | None = None) -> Sight:
    """Return the moments of a track that are to be worked out, with what the opening sees at each.

    `air` is the night assumed (default: the request's conditions).
    """
    target, instrument, setting = request.target, use.instrument, use.setting
    air = air or air_of(instrument.sky, request.conditions)
    usable = usable_steps(request, track)
    chosen = pick_moments(track, usable, target)
    moments = moments_of(target, instrument, setting, track.take(chosen), air) if chosen.size else None
    return Sight(target, use, air, request.goal.lines, track, usable, chosen, moments, air_over(instrument))


def glow_in(target: Target, state: State) -> Glow:
    """Return what shines when the ionosphere of a target is in some state."""
    return Glow(load_lines(), state.temperature_k, state.shining_m2, target.continuum)


def expose_sight(seen: Sight, state: State) -> Exposure | None:
    """Return the information at the moments of a sight in some state of the ionosphere."""
    if seen.moments is None:
        return None
    return expose_moments(
        seen.moments,
        glow_in(seen.target, state),
        seen.atmosphere,
        seen.use.instrument,
        seen.use.setting,
        seen.goal_lines,
    )


def scenario(
    request: Request, use: Use, track: Track, state: State | None = None, air: Air | None = None
) -> Scenario:
    """Return the information over time for one use of an instrument.

    Args:
        request: whose target, dates and goal count.
        use: instrument and setting.
        track: of the target from the instrument's place.
        state: of the ionosphere; default: that of the request's dates.
        air: seeing and water; default: the request's conditions.

    """
    seen = sight(request, use, track, air)
    state = state or state_of(request)
    exposure = expose_sight(seen, state)
    airmass = track.airmass[seen.usable]
    return Scenario(
        seen.target,
        use,
        state,
        seen.air,
        track,
        seen.usable,
        steps_of(seen, exposure),
        seen.chosen,
        exposure,
        np.zeros((4, 4)) if exposure is None else exposure.prior,
        tuple(_warnings(seen.target, use.setting, state, seen.atmosphere, airmass, seen.air)),
    )


def pick_moments(track: Track, usable: NDArray[np.bool_], target: Target) -> NDArray[np.int64]:
    """Return the steps to be worked out: both ends of every stretch and some half-hours between."""
    spacing_s = MOMENT_SPACING_S
    if target.emission.spots:
        spacing_s = min(spacing_s, track.system.period_s / MOMENTS_PER_TURN)
    stride = max(int(spacing_s / track.grid.step_s), 1) if track.grid.step_s else 1
    first, end = runs(track.grid.time_s, track.grid.step_s or np.inf, usable, track.night)
    pieces = [np.unique(np.append(np.arange(a, b, stride), b - 1)) for a, b in zip(first, end, strict=True)]
    return np.concatenate(pieces) if pieces else np.empty(0, dtype=np.int64)


def moments_of(target: Target, instrument: Instrument, setting: Setting, track: Track, air: Air) -> Moments:
    """Return the conditions at every instant of a (short) track, all of them observable."""
    size = track.grid.time_s.size
    airmass = np.where(np.isfinite(track.airmass), track.airmass, 1.0)
    return Moments(
        airmass,
        track.range_rate_m_s,
        np.full(size, air.water_m),
        track.sun_distance_m,
        beams(target, instrument, setting, track, airmass, air.seeing_rad),
    )


def steps_of(seen: Sight, exposure: Exposure | None) -> Steps:
    """Spread the moments over the steps of the grid; steps that cannot be used hold zeros."""
    track, usable, chosen = seen.track, seen.usable, seen.chosen
    time_s = track.grid.time_s
    matrix = np.zeros((time_s.size, 4, 4))
    share, clear = np.zeros(time_s.size), np.ones(time_s.size)
    if exposure is not None:
        at = time_s[usable]
        for i in range(4):
            for j in range(i + 1):
                matrix[usable, i, j] = np.interp(at, time_s[chosen], exposure.matrix[:, i, j])
                matrix[usable, j, i] = matrix[usable, i, j]
        share[usable] = np.interp(at, time_s[chosen], exposure.shutter_share)
        clear[usable] = np.interp(at, time_s[chosen], exposure.line_transmission)
    return Steps(
        time_s,
        track.grid.step_s,
        usable,
        np.asarray(track.night, dtype=np.int64),
        matrix,
        share,
        track.airmass,
        track.sub_observer_longitude_rad,
        track.range_rate_m_s,
        clear,
    )


def _warnings(
    target: Target, setting: Setting, state: State, atmosphere: Atmosphere | None, airmass: Array, air: Air
) -> Iterator[str]:
    yield from validity_warnings(state.temperature_k)
    yield from equilibrium_warnings(state.lte_fraction)
    if isinstance(atmosphere, Atmosphere) and airmass.size:
        yield from atmosphere_warnings(atmosphere, float(airmass.max()), air.water_m)
    bands = [setting.band_m, *([setting.off_band_m] if setting.off_band_m else [])]
    along = state.shining_m2 * path_factor(target.figure, 0.0)
    for low_m, high_m in bands:
        yield from optical_depth_warnings(load_lines().within(low_m, high_m), state.temperature_k, along)
