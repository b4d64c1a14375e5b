"""What coverage asks: which visit serves which longitude bin how well, and how much a bin needs.

A moment counts for the bin of the central meridian (of the parts of the bins that drift by within a step),
and of its information only the share of the light that the blur leaves inside the bin. With a latitude of
interest it counts for all longitudes whose place is turned towards us as asked, with a spot for the spot
alone. A goal in minutes counts the clock, without blur.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.offers import STRETCH, Offers
from coldglow.describe.records import Request, Target
from coldglow.detect.beam import point_spread
from coldglow.detect.season import beams
from coldglow.errors import RangeError
from coldglow.plan.bins import (
    BinGains,
    BinSums,
    Interest,
    central_weights,
    interest_weights,
    resolution_rad,
    spot_gain,
    step_drift,
)
from coldglow.plan.demand import Amount, Demand, TemperatureError, snr_gain
from coldglow.plan.goal import demanded_information, marginalise, required_snr
from coldglow.plan.multicover import Rules
from coldglow.report import words
from coldglow.scenario import Scenario
from coldglow.sky.track import Track

Array = NDArray[np.float64]
HALF_LIGHT = 0.5  # a spot counts as in view while it shows at least this share of its most light


@dataclass(frozen=True, slots=True)
class Question:
    """What the planner is asked; arrays over offers have the order of `offers`."""

    request: Request
    offers: Offers
    gain: Array  # ndarray[offer, bin] or ndarray[offer, bin, 2, 2]: what counts towards the goal
    demand: Demand
    information: Array  # ndarray[offer, bin], on ln N, with the floors of the visits
    clock_s: Array  # ndarray[offer, bin]
    rules: Rules
    resolution: tuple[Array, ...]  # of each scene, ndarray[time]: effective longitude resolution, rad
    goal: str  # in words

    @property
    def bins(self) -> int:
        """Number of bins; 1 for a spot."""
        return int(self.clock_s.shape[1])

    @property
    def width_rad(self) -> float:
        """Width of a bin."""
        return 2.0 * np.pi / self.bins


@dataclass(frozen=True, slots=True)
class View:
    """How the steps of one scene serve the bins."""

    sums: BinSums
    resolution: Array  # ndarray[time]
    ratio: Array | None  # ndarray[time], light of the wanted spot over that of the rest


def question_of(request: Request, given: Offers) -> Question:
    """Return the question that a request's coverage asks about its offers."""
    coverage = request.coverage
    views = [view_of_bins(request, scene) for scene in given.scenes]
    gains = [
        gathered(request, scene, view, given.visits[k].first, given.visits[k].end, given.owner[k], given.size)
        for k, (scene, view) in enumerate(zip(given.scenes, views, strict=True))
    ]
    information, matrix, clock_s = (np.sum([each[i] for each in gains], axis=0) for i in range(3))
    gain, demand, text = goal_of(request, given.scenes, information, matrix, clock_s)
    return Question(
        request,
        given,
        gain,
        demand,
        information,
        clock_s,
        rules_of(request, given),
        tuple(view.resolution for view in views),
        text if not coverage.spot else f"{text} on the spot “{coverage.spot}”",
    )


def goal_of(
    request: Request, scenes: tuple[Scenario, ...], information: Array, matrix: Array, clock_s: Array
) -> tuple[Array, Demand, str]:
    """Return gain (one of the three, ndarray[offer, bin, ...]), demand and the goal in words."""
    coverage, bins = request.coverage, clock_s.shape[1]
    if coverage.minutes is not None:
        demand = Amount(np.full(bins, 60.0 * coverage.minutes), by_clock=True)
        return clock_s, demand, words.duration(60.0 * coverage.minutes)
    if coverage.temperature_error_k is not None:
        kelvin = coverage.temperature_error_k
        return matrix, TemperatureError(np.full(bins, kelvin)), f"temperature to ± {words.short(kelvin)} K"
    goal = float(coverage.snr or 0.0)
    needed = required_snr(goal, request.goal.probability)
    common = max(scene.use.instrument.operation.common_floor for scene in scenes)
    return (
        information,
        Amount(demanded_information(np.full(bins, needed), common)),
        f"SNR {words.short(goal)}",
    )


def gathered(
    request: Request,
    scene: Scenario,
    view: View,
    first: NDArray[np.int64],
    end: NDArray[np.int64],
    owner: NDArray[np.int64],
    size: int,
) -> tuple[Array, Array, Array]:
    """Return information, 2 x 2 matrices and clock time per offer and bin, from one scene's visits."""
    floor = scene.use.instrument.operation.visit_floor
    bins = 1 if view.ratio is not None else request.coverage.bins
    total = np.zeros((size, bins)), np.zeros((size, bins, 2, 2)), np.zeros((size, bins))
    if not first.size:
        return total
    visit = visit_gains(scene, view, first, end)
    if view.ratio is None:
        information = snr_gain(visit.matrix, floor)
    else:
        information, _ = spot_gain(scene.steps, view.ratio, first, end, scene.overhead_s, floor)
    for sums, each in zip(total, (information, marginalise(visit.matrix), visit.clock_s), strict=True):
        np.add.at(sums, owner, each)
    return total


def visit_gains(scene: Scenario, view: View, first: NDArray[np.int64], end: NDArray[np.int64]) -> BinGains:
    """Return what visits bring to the bins, what each knows beforehand included."""
    found = view.sums.visits(first, end, scene.overhead_s)
    return replace(found, matrix=found.matrix + scene.prior * (found.clock_s > 0.0)[..., None, None])


def view_of_bins(request: Request, scene: Scenario) -> View:
    """Return how each step of a scene serves the bins of the request.

    Raises:
        RangeError: a temperature error is asked of a spot.

    """
    coverage, steps, track = request.coverage, scene.steps, scene.track
    usable = scene.usable
    resolution = longitude_resolution_rad(scene)
    if coverage.spot:
        if coverage.temperature_error_k is not None:
            raise RangeError(
                "a temperature error cannot be the goal of a spot: the light of the rest of the disk lies "
                "over it; ask for an SNR (of its brightness against the rest) or a time",
                "coverage.spot",
            )
        ratio = spot_ratio(scene, coverage.spot)
        in_view = (ratio >= HALF_LIGHT * ratio.max(initial=0.0)) & usable & (ratio > 0.0)
        return View(BinSums(steps, in_view.astype(float)[:, None]), resolution, ratio)
    weight = np.zeros((steps.time_s.size, coverage.bins))
    longitude = steps.longitude_rad[usable]
    if coverage.latitude_rad is not None:
        interest = Interest(
            coverage.latitude_rad,
            coverage.angle_max_rad,
            coverage.lit,
            track.sub_observer_latitude_rad[usable],
            track.sub_solar_latitude_rad[usable],
            track.sub_solar_longitude_rad[usable],
        )
        weight[usable] = interest_weights(longitude, coverage.bins, interest)
        return View(BinSums(steps, weight), resolution, None)
    drift = step_drift(steps)[usable]
    weight[usable] = central_weights(longitude, coverage.bins, drift)
    inside = np.zeros_like(weight)
    inside[usable] = central_weights(longitude, coverage.bins, drift, resolution[usable])
    return View(BinSums(steps, weight * inside, weight), resolution, None)


def longitude_resolution_rad(scene: Scenario) -> Array:
    """Return the effective longitude resolution at the disk centre (FWHM), ndarray[time].

    Blur of the image, width of a slit that lies along the rotation axis, and drift of the longitude while
    one nod position is exposed; of the median airmass.
    """
    instrument, setting, track = scene.use.instrument, scene.use.setting, scene.track
    airmass = track.airmass[scene.usable]
    typical = float(np.nanmedian(airmass)) if np.isfinite(airmass).any() else 1.0
    spread = point_spread(
        instrument.image, instrument.telescope, setting.middle_m, scene.air.seeing_rad, typical
    )
    along_axis = instrument.opening.kind == "slit" and instrument.opening.angle == "rotation-axis"
    width = instrument.opening.width_rad if along_axis else 0.0
    exposed_s = 0.0
    if scene.exposure is not None:
        exposed_s = float(np.median(scene.exposure.integration_s * scene.exposure.coadds))
    blur = 2.0 * np.pi * exposed_s / track.system.period_s
    return resolution_rad(
        np.hypot(spread.fwhm_rad, width),
        track.equatorial_diameter_rad,
        blur,
        track.sub_observer_latitude_rad,
    )


def spot_ratio(scene: Scenario, name: str) -> Array:
    """Return the light of a spot over that of the rest of the disk in the opening, ndarray[time].

    Worked out at the scenario's moments and interpolated; zero where nothing can be observed.
    """
    ratio = np.zeros(scene.track.grid.time_s.size)
    if scene.moments.size:
        track = scene.track.take(scene.moments)
        airmass = np.where(np.isfinite(track.airmass), track.airmass, 1.0)
        spot, rest = spot_and_rest(scene, track, airmass, name)
        time_s = scene.track.grid.time_s
        ratio[scene.usable] = np.interp(time_s[scene.usable], time_s[scene.moments], spot / rest)
    return ratio


def spot_and_rest(scene: Scenario, track: Track, airmass: Array, name: str) -> tuple[Array, Array]:
    """Return the light of one spot and of all else in the opening, at instants ndarray[time].

    Both in units of the mean column over the shell: the whole, the whole without the spot (its ions spread
    evenly), and an even shell are looked at; they are linear in the shares.
    """
    emission = scene.target.emission
    share = {spot.name: spot.share for spot in emission.spots}[name]
    others = tuple(spot for spot in emission.spots if spot.name != name)

    def light(target: Target) -> Array:
        use = scene.use
        return beams(target, use.instrument, use.setting, track, airmass, scene.air.seeing_rad).path_factor

    whole = light(scene.target)
    spread = light(replace(scene.target, emission=replace(emission, spots=others)))
    even = light(replace(scene.target, emission=replace(emission, spots=())))
    rest = spread - share * even
    return np.maximum(whole - rest, 0.0), rest


def longitudes_seen(given: Offers, chosen: NDArray[np.int64], points: int) -> NDArray[np.bool_]:
    """Return which of `points` longitudes, evenly around the turn, become central while exposing."""
    place = (np.arange(points) + 0.5) * 2.0 * np.pi / points
    seen = np.zeros(points, dtype=bool)
    for scene, visits, owner in zip(given.scenes, given.visits, given.owner, strict=True):
        for v in np.flatnonzero(np.isin(owner, chosen)):
            exposed_s = float(visits.end_s[v] - visits.start_s[v]) - scene.overhead_s
            turn = 2.0 * np.pi * exposed_s / scene.track.system.period_s
            seen |= np.mod(visits.longitude_end_rad[v] - place, 2.0 * np.pi) <= turn
    return seen


def rules_of(request: Request, given: Offers) -> Rules:
    """Return the limits that the request puts on the choice.

    `nights_max` counts nights by their cost; with stretches the different nights that are used.
    """
    coverage = request.coverage
    most = np.inf if coverage.nights_max is None else coverage.nights_max
    by_stretch = bool((given.part == STRETCH).any())
    return Rules(
        cost_max=np.inf if by_stretch else most,
        consecutive=coverage.consecutive,
        block_nights=coverage.block_nights,
        nights_max=most if by_stretch else np.inf,
        fixed_sets=tuple(tuple(each.tolist()) for each in fixed_offers(request, given)),
    )


def fixed_offers(request: Request, given: Offers) -> list[NDArray[np.int64]]:
    """Return for each fixed night (or half) that can be observed the offers of which one must be chosen."""
    found = []
    for text in request.dates.fixed:
        day, _, half = text.partition(" ")
        part = {"first": (0, 1, 3), "second": (0, 2, 3)}.get(half, (0, 1, 2, 3))
        here = np.flatnonzero((given.date == day) & np.isin(given.part, part))
        if here.size:
            found.append(here)
    return found
