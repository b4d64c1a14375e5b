"""One stare from space over a rotation: where it begins, how long it lasts, which visits it is split into.

Without night and clouds the shortest stare that sees every longitude and reaches every goal is looked for
among all starts, a small part of a turn apart. Where the longest visit forces a split, the fewest
visits are taken that can do it, of equal length; each begins with its acquisition, whose longitudes a later
turn must fill.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.offers import STRETCH, Pieces
from coldglow.answers.covering.coverage import View, gathered, goal_of, view_of_bins
from coldglow.describe.records import Request
from coldglow.plan.cover import REACHED
from coldglow.plan.stretches import runs
from coldglow.scenario import Scenario

Index = NDArray[np.int64]
STARTS_PER_TURN = 24
POINTS = 360  # longitudes looked at in a turn
VISITS_MOST = 60  # of one stare, and of those that are offered beyond it


def stare_of(request: Request, scene: Scenario) -> tuple[Pieces, int]:
    """Return equal visits in a row and how many of them are the stare; all of them where none reaches.

    The visits beyond the stare go on until the run ends: what could be asked for besides.
    """
    steps, longest_s = scene.steps, scene.use.instrument.limits.longest_visit_s
    view = view_of_bins(request, scene)
    most = max(int(longest_s / steps.step_s + 1e-9), 1) if np.isfinite(longest_s) else steps.time_s.size
    hop = max(int(scene.track.system.period_s / STARTS_PER_TURN / steps.step_s), 1)
    begin, stop = runs(steps.time_s, steps.step_s, scene.usable, np.zeros_like(steps.night))
    if not begin.size:
        nothing = np.zeros(0, dtype=np.int64)
        return Pieces(nothing, nothing, nothing, nothing, nothing), 0
    starts = np.concatenate([np.arange(a, b, hop) for a, b in zip(begin, stop, strict=True)])
    room = np.repeat(stop, [len(range(a, b, hop)) for a, b in zip(begin, stop, strict=True)]) - starts
    for visits in range(1, VISITS_MOST + 1):
        within = room > (visits - 1) * most
        if not within.any():
            break
        found = _shortest(request, scene, view, starts[within], room[within], visits, most)
        if found is not None:
            start, length = found
            end = int(start + room[starts == start][0])
            return _visits(scene, start, end, length / visits), visits
    longest = int(np.argmax(room))
    start, end = int(starts[longest]), int(starts[longest] + room[longest])
    count = min(-(-(end - start) // most), VISITS_MOST)
    return _visits(scene, start, end, min((end - start) / count, most)), count


def _shortest(
    request: Request,
    scene: Scenario,
    view: View,
    starts: Index,
    room: Index,
    visits: int,
    most: int,
) -> tuple[int, int] | None:
    """Return start and length of the shortest stare of so many visits; None where none reaches the goals."""

    def reaches(length: int) -> NDArray[np.bool_]:
        fits = np.flatnonzero(room >= length)
        edges = np.round(starts[fits, None] + length * np.arange(visits + 1) / visits).astype(np.int64)
        first, end = edges[:, :-1].ravel(), edges[:, 1:].ravel()
        owner = np.repeat(np.arange(fits.size), visits)
        gain, demand, _ = goal_of(
            request, (scene,), *gathered(request, scene, view, first, end, owner, fits.size)
        )
        good = np.zeros(starts.size, dtype=bool)
        good[fits] = np.all(demand.share(gain) >= REACHED, axis=1) & _seen(request, scene, edges)
        return good

    low, high = visits - 1, min(visits * most, int(room.max()))
    good = reaches(high)
    if not good.any():
        return None
    start = int(starts[np.argmax(good)])
    while high - low > 1:
        middle = (low + high) // 2
        good = reaches(middle)
        if good.any():
            high, start = middle, int(starts[np.argmax(good)])
            still = good | (room < middle)  # what fails at one length fails at a shorter one
            starts, room = starts[still], room[still]
        else:
            low = middle
    return start, high


def _seen(request: Request, scene: Scenario, edges: Index) -> NDArray[np.bool_]:
    """Return ndarray[stare]: every longitude is central in some visit (steps ndarray[stare, visit + 1])."""
    coverage = request.coverage
    if coverage.spot or coverage.latitude_rad is not None:
        return np.ones(edges.shape[0], dtype=bool)
    turn = edges * scene.steps.step_s / scene.track.system.period_s
    lost = scene.overhead_s / scene.track.system.period_s
    place = (np.arange(POINTS) + 0.5) / POINTS
    seen = np.zeros((edges.shape[0], POINTS), dtype=bool)
    for begin, end in zip(turn.T[:-1] + lost, turn.T[1:], strict=True):
        seen |= np.mod(place - begin[:, None], 1.0) <= (end - begin)[:, None]
    return np.asarray(np.all(seen, axis=1), dtype=bool)


def _visits(scene: Scenario, start: int, end: int, length: float) -> Pieces:
    """Return visits of equal length one after the other from a start, as many as fit."""
    count = min(max(int((end - start) / length + 1e-9), 1), VISITS_MOST)
    edges = np.round(start + length * np.arange(count + 1)).astype(np.int64)
    night = scene.steps.night[edges[:-1]]
    return Pieces(edges[:-1], edges[1:], np.arange(count), night, np.full(count, STRETCH))
