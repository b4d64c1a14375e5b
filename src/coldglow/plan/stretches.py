"""Which hours are best: observable stretches, the best window of a wanted length, their ranking.

A step of the grid owns `step_s` seconds centred on its time. A stretch is a run of observable steps of
one night without a gap; it is one visit: acquisition and standards are paid at its start, its matrices
add, and its nuisances are marginalised once.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import day as DAY_S

from coldglow.plan.goal import marginalise, with_floor

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Steps:
    """The table of information over time; every array is ndarray[time] (`matrix` with two axes more)."""

    time_s: Array  # middle of the step
    step_s: float
    observable: NDArray[np.bool_]
    night: Index  # -1 = none
    matrix: Array  # ndarray[time, 4, 4] per second of open shutter
    shutter_share: Array  # open shutter per second of clock time, without acquisition and standards
    airmass: Array  # nan in space
    longitude_rad: Array  # of the sub-observer point, any turn
    range_rate_m_s: Array
    line_transmission: Array  # 1 in space


@dataclass(frozen=True, slots=True)
class Stretches:
    """Rows of `hours`; every array is ndarray[stretch]. Steps `first` ... `end`-1 belong to the row."""

    first: Index
    end: Index
    night: Index
    start_s: Array
    end_s: Array
    duration_s: Array
    airmass_min: Array
    airmass_max: Array
    longitude_start_rad: Array  # 0 ... 2 pi
    longitude_end_rad: Array
    range_rate_m_s: Array  # mean, weighted by information
    line_transmission: Array  # mean, weighted by information
    matrix: Array  # ndarray[stretch, 2, 2], marginalised
    snr: Array
    rank: Index  # 1 = best; equal SNR by date


def runs(
    time_s: Array, step_s: float, observable: NDArray[np.bool_], night: Index, longest_s: float = np.inf
) -> tuple[Index, Index]:
    """Return first and end index of every run of observable steps of one night, split at gaps.

    Args:
        time_s: ndarray[time].
        step_s: nominal step; neighbours further apart than 1.5 steps are a gap.
        observable: ndarray[time].
        night: ndarray[time], -1 where a step belongs to none.
        longest_s: longest visit; longer runs are cut into pieces of at most that length.

    """
    good = observable & (night >= 0)
    joined = good[1:] & good[:-1] & (night[1:] == night[:-1]) & (np.diff(time_s) < 1.5 * step_s)
    first = np.flatnonzero(good & ~np.concatenate(([False], joined)))
    end = np.flatnonzero(good & ~np.concatenate((joined, [False]))) + 1
    if not np.isfinite(longest_s):
        return first, end
    most = max(int(longest_s / step_s + 1e-9), 1)
    pieces = -(-(end - first) // most)
    piece = np.arange(pieces.sum()) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    starts = np.repeat(first, pieces) + piece * most
    return starts, np.minimum(starts + most, np.repeat(end, pieces))


def longitude_rate(steps: Steps) -> Array:
    """Change of the sub-observer longitude per second, ndarray[time], from the nearer neighbour."""
    if steps.time_s.size < 2:
        return np.zeros_like(steps.time_s)
    gap_s = np.diff(steps.time_s)
    turn = np.mod(np.diff(steps.longitude_rad) + np.pi, 2.0 * np.pi) - np.pi
    rate = turn / gap_s
    forward, backward = np.append(rate, rate[-1]), np.append(rate[0], rate)
    near = np.append(gap_s, gap_s[-1]) <= np.append(gap_s[0], gap_s)
    return np.where(near, forward, backward)


class RunningSums:
    """Running integrals over observable time, to read off any window at once."""

    def __init__(self, steps: Steps, value: Array) -> None:
        """Integrate `value` (ndarray[time, ...], per second of open shutter) over the open shutter."""
        good = steps.observable & (steps.night >= 0)
        seconds = np.where(good, steps.shutter_share * steps.step_s, 0.0)
        weight = seconds.reshape(seconds.shape + (1,) * (value.ndim - 1))
        self.piece = np.where(weight > 0.0, np.nan_to_num(value) * weight, 0.0)
        self.sum = np.concatenate((np.zeros_like(self.piece[:1]), np.cumsum(self.piece, axis=0)))

    def window(self, first: Index, end: Index, lost_steps: float) -> Array:
        """Integral from `lost_steps` after the start of step `first` to the end of step `end`-1."""
        begin = np.minimum(first + lost_steps, end)
        whole = np.minimum(begin.astype(np.int64), end - 1)
        share = (begin - whole).reshape(begin.shape + (1,) * (self.piece.ndim - 1))
        return np.asarray(self.sum[end] - self.sum[whole] - share * self.piece[whole])


def _comparable(value: Array) -> Array:
    """Nine digits relative to the largest value, so that rounding of the running sums breaks no tie."""
    largest = float(value.max(initial=0.0))
    return np.round(value / largest, 9) if largest > 0.0 else value


def table(
    steps: Steps,
    first: Index,
    end: Index,
    overhead_s: float = 0.0,
    visit_floor: float = 0.0,
    prior: ArrayLike = 0.0,
) -> Stretches:
    """Evaluate stretches given by their indices; `overhead_s` (acquisition, standards) is lost first.

    SNR is that of one visit, 1/sqrt(1/I + f_visit²), the nuisances marginalised; `prior` (ndarray[4, 4]) is
    what every visit knows of them beforehand.
    """
    first, end = np.asarray(first, dtype=np.int64), np.asarray(end, dtype=np.int64)
    lost = overhead_s / steps.step_s
    matrix = marginalise(RunningSums(steps, steps.matrix).window(first, end, lost) + np.asarray(prior))
    snr = np.sqrt(with_floor(matrix[:, 0, 0], visit_floor))
    weight = steps.matrix[:, 0, 0]
    columns = np.stack((weight, weight * steps.range_rate_m_s, weight * steps.line_transmission), axis=1)
    total = RunningSums(steps, columns).window(first, end, lost)
    some = total[:, 0] > 0.0
    mean = np.where(some[:, None], total / np.where(some, total[:, 0], 1.0)[:, None], np.nan)
    edge = np.ravel(np.column_stack((first, end)))
    airmass = np.append(steps.airmass, np.nan)  # so that `end` may be the length of the grid
    low = np.minimum.reduceat(airmass, edge)[::2] if first.size else np.empty(0)
    high = np.maximum.reduceat(airmass, edge)[::2] if first.size else np.empty(0)
    half = 0.5 * steps.step_s
    turn = longitude_rate(steps) * half
    rank = np.empty(first.size, dtype=np.int64)
    rank[np.lexsort((first, -_comparable(snr)))] = np.arange(1, first.size + 1)
    return Stretches(
        first=first,
        end=end,
        night=steps.night[first],
        start_s=steps.time_s[first] - half,
        end_s=steps.time_s[end - 1] + half,
        duration_s=np.asarray((end - first) * steps.step_s, dtype=float),
        airmass_min=low,
        airmass_max=high,
        longitude_start_rad=np.mod(steps.longitude_rad[first] - turn[first], 2.0 * np.pi),
        longitude_end_rad=np.mod(steps.longitude_rad[end - 1] + turn[end - 1], 2.0 * np.pi),
        range_rate_m_s=mean[:, 1],
        line_transmission=mean[:, 2],
        matrix=matrix,
        snr=snr,
        rank=rank,
    )


def best_windows(
    steps: Steps,
    length_s: float,
    overhead_s: float = 0.0,
    visit_floor: float = 0.0,
    longest_s: float = np.inf,
    prior: ArrayLike = 0.0,
) -> Stretches:
    """Best window of a wanted length in every night that has one, earliest of equal ones.

    The length is rounded up to whole steps; a night whose runs are all shorter has no row.
    """
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night, longest_s)
    size = max(int(np.ceil(length_s / steps.step_s - 1e-9)), 1)
    places = np.maximum(end - first - size + 1, 0)
    start = np.repeat(first, places) + np.arange(places.sum()) - np.repeat(np.cumsum(places) - places, places)
    lost = overhead_s / steps.step_s
    matrix = marginalise(
        RunningSums(steps, steps.matrix).window(start, start + size, lost) + np.asarray(prior)
    )
    order = np.lexsort((start, -_comparable(matrix[:, 0, 0]), steps.night[start]))
    _, best = np.unique(steps.night[start[order]], return_index=True)
    chosen = start[order[best]]
    return table(steps, chosen, chosen + size, overhead_s, visit_floor, prior)


def season_chart(steps: Steps, value: Array, columns_per_day: int = 0) -> tuple[Array, Array]:
    """Lay a value out as night against hour for the season chart.

    The grid starts at local mean noon (in space at the start of a day), so hours count from there.

    Returns:
        ndarray[column] hour at the middle of a column, ndarray[day, column] mean of the value over the
        observable steps, nan where there is none.

    """
    columns = columns_per_day or max(round(DAY_S / steps.step_s), 1)
    good = steps.observable & (steps.night >= 0) & np.isfinite(value)
    place = np.floor(steps.time_s[good] / DAY_S * columns).astype(np.int64)
    days = int(np.floor(steps.time_s[-1] / DAY_S)) + 1 if steps.time_s.size else 0
    count = np.bincount(place, minlength=days * columns)
    total = np.bincount(place, weights=value[good], minlength=days * columns)
    chart = np.where(count > 0, total / np.maximum(count, 1), np.nan)[: days * columns]
    return (np.arange(columns) + 0.5) * 24.0 / columns, chart.reshape(days, columns)
