"""Information gathered per longitude bin: which bins a moment serves, and what a candidate brings.

Angles are planetographic, so the angle between a place's direction and the sub-observer point is the
emission angle there, and that to the sub-solar point the incidence angle. Bin b of n covers the
longitudes from b to b+1 times 360/n degrees. In one visit each bin has its own nuisances.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from dataclasses import replace as with_changes
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtr

from coldglow.plan.goal import marginalise, with_floor
from coldglow.plan.stretches import RunningSums, Steps, longitude_rate

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]

TURN = 2.0 * np.pi
SUB_POINTS = 9  # places looked at in a bin for a latitude of interest: its edge is met to 1/18 of the bin
SHARP_RAD = 1e-5  # widths below are drawn as this: sharp, without a division by zero
NOTHING = 1e-9  # a share below is rounding
FWHM_PER_SIGMA = 2.0 * np.sqrt(2.0 * np.log(2.0))


@dataclass(frozen=True, slots=True)
class Interest:
    """A latitude of interest: its places count within an angle of the sub-observer point, lit or not."""

    latitude_rad: float
    angle_max_rad: float
    lit: Literal["any", "day", "night"]
    sub_observer_latitude_rad: Array  # ndarray[time]
    sub_solar_latitude_rad: Array
    sub_solar_longitude_rad: Array


@dataclass(frozen=True, slots=True)
class BinGains:
    """What each candidate (one visit) brings to each bin; every array is ndarray[candidate, bin]."""

    matrix: Array  # ndarray[candidate, bin, 4, 4], open shutter, nuisances still in it
    clock_s: Array  # clock time on the bin
    visits: Index  # 1 where the candidate serves the bin at all


def resolution_rad(
    seeing_fwhm_rad: ArrayLike,
    diameter_rad: ArrayLike,
    blur_rad: ArrayLike = 0.0,
    latitude_rad: ArrayLike = 0.0,
) -> Array:
    """Effective longitude resolution (FWHM) at the disk centre: seeing on the disk, and drift.

    A distance d along the equator's direction from the centre of a disk of diameter D, which shows the
    latitude B, is the longitude l with tan l = r / (cos B sqrt(1 - r²)), r = 2 d/D; half the seeing on
    either side gives twice that for r = seeing/D, at most half a turn. Seen from above the pole the
    meridians run together, and nothing is resolved.

    Args:
        seeing_fwhm_rad: width of the image's blur.
        diameter_rad: equatorial diameter of the disk.
        blur_rad: drift of the longitude during one integration, added in quadrature.
        latitude_rad: sub-observer latitude.

    """
    ratio = np.minimum(np.asarray(seeing_fwhm_rad, dtype=float) / diameter_rad, 1.0)
    half = np.arctan2(ratio, np.abs(np.cos(latitude_rad)) * np.sqrt(1.0 - np.square(ratio)))
    return np.asarray(np.minimum(np.hypot(2.0 * half, blur_rad), np.pi))


def _smeared_step(distance: Array, half: Array, sigma: Array) -> Array:
    """Share of a Gaussian-blurred box (half-width `half`) that lies below `distance` from its centre."""
    total = np.zeros_like(distance)
    for sign in (1.0, -1.0):
        u = (distance + sign * half) / sigma
        total += sign * (u * ndtr(u) + np.exp(-0.5 * u * u) / np.sqrt(TURN))
    return np.asarray(total * sigma / (2.0 * half))


def central_weights(
    longitude_rad: Array, bins: int, drift_rad: ArrayLike = 0.0, resolution: ArrayLike = 0.0
) -> Array:
    """Share ndarray[time, bin] in which a step serves each bin by its sub-observer longitude; rows sum to 1.

    The longitude is spread evenly over what it drifts during the step, and by a Gaussian of the effective
    resolution (FWHM), around the whole turn.

    Args:
        longitude_rad: ndarray[time], sub-observer longitude at the middle of the step.
        bins: number of bins.
        drift_rad: ndarray[time] or number, longitude gone by during a step.
        resolution: FWHM in radians, ndarray[time] or number.

    """
    edge = np.arange(bins + 1) * TURN / bins
    half = np.maximum(0.5 * np.abs(np.asarray(drift_rad, dtype=float)), SHARP_RAD)[..., None]
    sigma = np.maximum(np.asarray(resolution, dtype=float) / FWHM_PER_SIGMA, SHARP_RAD)[..., None]
    centre = np.mod(longitude_rad, TURN)[:, None]
    weight = np.zeros((longitude_rad.size, bins))
    for turn in (-2, -1, 0, 1, 2):
        weight += np.diff(_smeared_step(edge + turn * TURN - centre, half, sigma), axis=1)
    return np.where(weight > NOTHING, weight, 0.0)


def interest_weights(longitude_rad: Array, bins: int, interest: Interest) -> Array:
    """Share ndarray[time, bin] of each bin's places on the latitude of interest that count at a moment.

    Several bins count at once: all whose places are within the angle, and lit as asked.
    """
    weight = np.zeros((longitude_rad.size, bins))
    latitude = interest.latitude_rad
    for k in range(SUB_POINTS):
        place = (np.arange(bins) + (k + 0.5) / SUB_POINTS) * TURN / bins
        seen = _cosine(latitude, place, interest.sub_observer_latitude_rad, longitude_rad)
        counts = seen >= np.cos(interest.angle_max_rad)
        if interest.lit != "any":
            sun = _cosine(latitude, place, interest.sub_solar_latitude_rad, interest.sub_solar_longitude_rad)
            counts &= (sun > 0.0) if interest.lit == "day" else (sun <= 0.0)
        weight += counts
    return weight / SUB_POINTS


def _cosine(latitude: float, longitude: Array, from_latitude: Array, from_longitude: Array) -> Array:
    """Cosine ndarray[time, place] of the angle between places and a direction."""
    turn = longitude[None, :] - from_longitude[:, None]
    rise = np.sin(latitude) * np.sin(from_latitude)[:, None]
    return np.asarray(rise + np.cos(latitude) * np.cos(from_latitude)[:, None] * np.cos(turn))


def step_drift(steps: Steps) -> Array:
    """Longitude ndarray[time] that goes by during a step."""
    return np.asarray(longitude_rate(steps) * steps.step_s)


class BinSums:
    """Running sums of information and clock time on each bin, to read off any visit at once.

    Visits must lie within runs of observable steps, as those of `stretches.runs` do.
    """

    def __init__(self, steps: Steps, weight: Array, clock_weight: Array | None = None) -> None:
        """Sum up over the observable steps.

        Args:
            steps: information over time.
            weight: ndarray[time, bin] from `central_weights` or `interest_weights`.
            clock_weight: ndarray[time, bin] that counts clock time; default: the same.

        """
        good = steps.observable & (steps.night >= 0)
        self.place = np.append(0, np.cumsum(good))
        self.step_s = steps.step_s
        seen = with_changes(
            steps, **{f.name: getattr(steps, f.name)[good] for f in fields(steps) if f.name != "step_s"}
        )
        clock = with_changes(seen, shutter_share=np.ones_like(seen.shutter_share))
        self.seconds = RunningSums(clock, (weight if clock_weight is None else clock_weight)[good])
        self.matrix = RunningSums(seen, seen.matrix[:, None] * weight[good][:, :, None, None])

    def visits(self, first: Index, end: Index, overhead_s: float = 0.0) -> BinGains:
        """Sum what visits of steps `first` ... `end`-1 bring; `overhead_s` is lost at the start of each."""
        lost = overhead_s / self.step_s
        first, end = self.place[first], self.place[end]
        seconds = self.seconds.window(first, end, lost)
        seconds = np.where(seconds > 1e-6, seconds, 0.0)  # of a running sum, rounding is what is left
        served = seconds > 0.0
        matrix = np.where(served[..., None, None], self.matrix.window(first, end, lost), 0.0)
        return BinGains(matrix, seconds, served.astype(np.int64))


def spot_gain(
    steps: Steps, ratio: Array, first: Index, end: Index, overhead_s: float = 0.0, visit_floor: float = 0.0
) -> tuple[Array, Array]:
    """Information on a spot's brightness from each pass, against the rest of the disk.

    With signal S (1 + A m(t)), m the light of the spot over that of the rest (`ratio`) and A = 1, a visit
    knows A from how the signal changes: the information on A after the visit's own S is marginalised is
    sum(I m²) - (sum I m)²/sum I. When the rest is known from other turns it is sum(I m²).

    Args:
        steps: information over time, I = 1/sigma² of ln S, nuisances of each step marginalised (safe).
        ratio: ndarray[time], light of the spot over that of the rest in the opening.
        first: ndarray[candidate], first step.
        end: ndarray[candidate], step after the last.
        overhead_s: acquisition and standards.
        visit_floor: relative error of a visit.

    Returns:
        ndarray[candidate, 1] with S of the visit free, and with the rest known; 1/sigma² of A.

    """
    information = marginalise(steps.matrix)[:, 0, 0]
    moments = np.stack([information * ratio**power for power in range(3)], axis=1)
    zeroth, once, twice = RunningSums(steps, moments).window(first, end, overhead_s / steps.step_s).T
    mean_square = np.square(once) / np.where(zeroth > 0.0, zeroth, 1.0)
    contrast = np.where(twice - mean_square > 1e-9 * twice, twice - mean_square, 0.0)
    return with_floor(contrast, visit_floor)[:, None], with_floor(twice, visit_floor)[:, None]
