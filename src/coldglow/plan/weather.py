"""Clear and cloudy nights: a stationary chain of two states, its counts exactly and its samples.

With clear share c and correlation rho from one night to the next, a gap of d days leaves a correlation
rho**d, so P(clear after clear) = c + (1-c) rho**d and P(clear after cloudy) = c (1 - rho**d). A gap of
zero days keeps the state: both halves of a night share it. Observing units stand in order of time.

Several places have chains of their own: their days stand one place after the other on the same axis, too
far apart to remember (`chain_day`), so that every function here serves them all.

Source: two-state Markov chain of daily weather, Gabriel & Neumann 1962, Q. J. R. Meteorol. Soc. 88, 90.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coldglow.errors import RangeError

Array: TypeAlias = NDArray[np.float64]
APART = 1e6  # days between the chains of two places
CELLS = 16384  # steps of information in the distribution; the bounds returned show what they cost
EXACT_NIGHTS = 12  # up to so many different nights all histories are enumerated instead


def _gaps(day: ArrayLike, clear_fraction: float, correlation: float) -> Array:
    """Check the chain and return the correlation between each unit and the one before it."""
    if not 0.0 <= clear_fraction <= 1.0:
        raise RangeError(f"clear fraction {clear_fraction:g} is not in 0 ... 1", "weather.clear_fraction")
    if not 0.0 <= correlation <= 1.0:
        raise RangeError(
            f"night-to-night correlation {correlation:g} is not in 0 ... 1", "weather.correlation"
        )
    step = np.diff(np.asarray(day, dtype=float))
    if np.any(step < 0.0):
        raise ValueError("days must stand in order of time")
    return np.where(step >= 0.5 * APART, 0.0, np.power(correlation, step))


def chain_day(day: ArrayLike, place: ArrayLike, cloudless: ArrayLike = ()) -> Array:
    """Days ndarray[unit] on the common axis of several independent chains; nan where no clouds come.

    Args:
        day: ndarray[unit], day number (below 400 000).
        place: ndarray[unit], number of the place whose weather it is.
        cloudless: numbers of the places without weather, as in space.

    """
    place = np.asarray(place)
    return np.where(np.isin(place, cloudless), np.nan, np.asarray(day, dtype=float) + APART * place)


def simulate(
    day: ArrayLike, clear_fraction: float, correlation: float, trials: int, rng: np.random.Generator
) -> NDArray[np.bool_]:
    """Draw the weather of observing units.

    Args:
        day: ndarray[unit], day number of each unit, in order of time.
        clear_fraction: share of clear nights.
        correlation: from one night to the next.
        trials: number of independent histories.
        rng: source of the random numbers.

    Returns:
        ndarray[trial, unit], True where clear.

    """
    keep = _gaps(day, clear_fraction, correlation)
    draw = rng.random((trials, len(keep) + 1))
    clear = np.empty(draw.shape, dtype=bool)
    clear[:, 0] = draw[:, 0] < clear_fraction
    for i, rho in enumerate(keep, start=1):
        chance = clear_fraction * (1.0 - rho) + rho * clear[:, i - 1]
        clear[:, i] = draw[:, i] < chance
    return clear


def history_probability(
    clear: NDArray[np.bool_], day: ArrayLike, clear_fraction: float, correlation: float
) -> Array:
    """Probability of each stated history ndarray[history, unit] of clear and cloudy units."""
    keep = _gaps(day, clear_fraction, correlation)
    chance = np.full(clear.shape, clear_fraction)
    chance[:, 1:] = clear_fraction * (1.0 - keep) + keep * clear[:, :-1]
    return np.asarray(np.where(clear, chance, 1.0 - chance).prod(axis=1))


def all_histories(
    day: ArrayLike, clear_fraction: float, correlation: float
) -> tuple[NDArray[np.bool_], Array] | None:
    """Return all histories ndarray[history, unit] and their probabilities; None beyond 12 nights."""
    different, unit = np.unique(np.asarray(day), return_inverse=True)
    if different.size > EXACT_NIGHTS:
        return None
    state = (np.arange(2**different.size)[:, None] >> np.arange(different.size)) & 1 > 0
    return state[:, unit], history_probability(state, different, clear_fraction, correlation)


def sum_distribution(
    amount: NDArray[np.int64], top: int, day: ArrayLike, clear_fraction: float, correlation: float
) -> Array:
    """Distribution of the sum of whole-number amounts over the clear units, by dynamic programming.

    The state carried along is (cloudy or clear now, sum so far); without correlation this is the
    convolution of the units' two-point distributions, with equal amounts besides it is the binomial law.

    Args:
        amount: ndarray[unit] that a unit yields when clear.
        top: sums of `top` and more are counted together.
        day: ndarray[unit], in order of time.
        clear_fraction: share of clear nights.
        correlation: from one night to the next.

    Returns:
        ndarray[top + 1], probability of each sum, the last of "at least top".

    """
    keep = _gaps(day, clear_fraction, correlation)
    cloudy, clear = np.zeros(top + 1), np.zeros(top + 1)
    cloudy[0], clear[min(int(amount[0]), top)] = 1.0 - clear_fraction, clear_fraction
    for rho, step in zip(keep, amount[1:], strict=True):
        to_clear = clear_fraction * (1.0 - rho)
        arriving = to_clear * (cloudy + clear) + rho * clear
        cloudy = (1.0 - to_clear) * cloudy + (1.0 - to_clear - rho) * clear
        move = min(int(step), top)
        clear = np.zeros(top + 1)
        clear[move:] = arriving[: top + 1 - move]
        clear[top] += arriving[top + 1 - move :].sum()
    return np.asarray(cloudy + clear)


def count_distribution(day: ArrayLike, clear_fraction: float, correlation: float = 0.0) -> Array:
    """Distribution ndarray[n + 1] of the number of clear units among n."""
    units = np.asarray(day).size
    if units == 0:
        return np.ones(1)
    return sum_distribution(np.ones(units, dtype=np.int64), units, day, clear_fraction, correlation)


def probability_of_sum(
    information: ArrayLike, demand: float, day: ArrayLike, clear_fraction: float, correlation: float = 0.0
) -> tuple[float, float]:
    """Probability that the clear units together yield the demand, as safe lower and upper bound.

    Equal amounts are counted and few nights enumerated, exactly: both bounds are the same. Otherwise the
    amounts are rounded to steps of demand/16384, down for the lower bound and up for the upper one.

    Args:
        information: ndarray[unit] that a unit yields when clear (floors applied).
        demand: sum wanted; inf can never be reached.
        day: ndarray[unit], in order of time.
        clear_fraction: share of clear nights.
        correlation: from one night to the next.

    """
    information = np.asarray(information, dtype=float)
    if demand <= 0.0:
        return 1.0, 1.0
    if information.size == 0 or not np.isfinite(demand):
        return 0.0, 0.0
    if np.all(information == information[0]):  # equal units: count them, exactly
        if information.size * information[0] < demand * (1.0 - 1e-12):
            return 0.0, 0.0
        needed = int(np.ceil(demand / information[0] * (1.0 - 1e-12)))
        exact = float(count_distribution(day, clear_fraction, correlation)[needed:].sum())
        return exact, exact
    every = all_histories(day, clear_fraction, correlation)
    if every is not None:
        clear, chance = every
        few = float(np.clip(chance @ (clear @ information >= demand * (1.0 - 1e-9)), 0.0, 1.0))
        return few, few
    steps = np.minimum(information / demand, 1.0) * CELLS
    low, high = (
        sum_distribution(whole.astype(np.int64), CELLS, day, clear_fraction, correlation)[-1]
        for whole in (np.floor(steps * (1.0 + 1e-12)), np.ceil(steps * (1.0 - 1e-12)))
    )
    return float(low), float(high)
