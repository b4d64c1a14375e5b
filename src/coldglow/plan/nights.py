"""How many nights to ask for, and which ones: success under weather for every kind of goal.

A request is a set of observing units (nights or halves) with what each yields when clear. It succeeds
when the clear ones together reach every goal. One bin with an amount is a goal in SNR, one bin with a
temperature error is that goal, many bins are coverage: the same functions answer all of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtri

from coldglow.plan.demand import Amount, Demand
from coldglow.plan.weather import all_histories, probability_of_sum, simulate

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]

REACHED = 1.0 - 1e-9


@dataclass(frozen=True, slots=True)
class Weather:
    """Two-state weather and the random numbers that stand for it where no exact answer exists."""

    clear_fraction: float
    correlation: float
    trials: int
    seed: int

    def generator(self, stream: int) -> np.random.Generator:
        """Return an independent generator for each purpose, so that choosing and judging never share one."""
        return np.random.default_rng([self.seed, stream])


@dataclass(frozen=True, slots=True)
class Curve:
    """Probability against units requested; every array is ndarray[request]."""

    units: Index
    cost: Array
    probability: Array  # safe lower bound where exact
    probability_error: Array  # standard error of the Monte Carlo, or the width of the exact bounds

    def smallest(self, wanted: float) -> int | None:
        """Index of the smallest request that reaches the wanted probability; None if there is none."""
        good = np.flatnonzero(self.probability >= wanted)
        return int(good[0]) if good.size else None


def scatter_factors(
    shape: tuple[int, int],
    rng: np.random.Generator,
    column_scatter: float = 0.0,
    temperature_scatter_k: float = 0.0,
    signal_slope_k: float = 0.0,
    signal_power: float = 2.0,
    quartile_information: tuple[tuple[float, float, float], ...] = (),
) -> Array:
    """Draw how much more or less information a clear night yields than the one that was planned.

    Args:
        shape: (trials, nights); nights are independent.
        rng: source of the random numbers.
        column_scatter: natural 1-sigma scatter of ln N from night to night.
        temperature_scatter_k: natural 1-sigma scatter of T.
        signal_slope_k: d ln S / dT of the line signal, 1/K.
        signal_power: d ln I / d ln S: 2 where the background is the noise, 1 where the signal is.
        quartile_information: for each condition (seeing, water) the information at its good, median and
            poor quartile, divided by that of the plan; ln of it runs straight in the normal score, to
            2.5 sigma.

    Returns:
        ndarray[trial, night].

    """
    signal = column_scatter * rng.standard_normal(shape)
    signal += signal_slope_k * temperature_scatter_k * rng.standard_normal(shape)
    power = signal_power * signal
    quarter = float(ndtri(0.75))
    for good, median, poor in quartile_information:
        score = np.clip(rng.standard_normal(shape), -2.5, 2.5) / quarter  # positive is poor
        better, worse = np.log(good / median), np.log(median / poor)
        power += np.log(median) - score * np.where(score < 0.0, better, worse)
    return np.asarray(np.exp(power))


def drawn(
    day: ArrayLike, weather: Weather, stream: int = 0, factors: Array | None = None
) -> tuple[Array, Array, bool]:
    """Yield of each unit in each history ndarray[history, unit] (0 = cloudy), chances, and whether exact.

    Args:
        day: ndarray[unit], any order; several places by `chain_day`, nan where it is always clear.
        weather: chain, trials and seed.
        stream: which of the seed's generators to use.
        factors: ndarray[trial, unit] from `scatter_factors`; None = a clear unit yields what was planned.

    """
    day = np.asarray(day, dtype=float)
    order = np.argsort(day, kind="stable")[: np.isfinite(day).sum()]  # nan stands last
    chain = weather.clear_fraction, weather.correlation
    every = all_histories(day[order], *chain) if factors is None else None
    if every is None:
        trials = weather.trials if factors is None else factors.shape[0]
        clear = simulate(day[order], *chain, trials, weather.generator(stream))[:, : order.size]
        chance = np.full(trials, 1.0 / trials)
    else:
        clear, chance = every
    weight = np.ones((chance.size, day.size))
    weight[:, order] = clear
    return weight if factors is None else weight * factors, chance, every is not None


def success(
    gain: Array,
    demand: Demand,
    day: ArrayLike,
    weather: Weather,
    stream: int = 0,
    factors: Array | None = None,
) -> tuple[float, float]:
    """Probability that a request reaches all its goals, and its error.

    Args:
        gain: ndarray[unit, bin] or ndarray[unit, bin, 2, 2] when clear.
        demand: goal per bin.
        day: ndarray[unit], any order; several places by `chain_day`, nan where it is always clear.
        weather: chain, trials and seed.
        stream: which of the seed's generators to use.
        factors: ndarray[trial, unit] from `scatter_factors`, natural scatter; None = none.

    Returns:
        Probability and standard error (0 where exact); for one amount without scatter the lower bound of
        the exact distribution and the width of its bounds.

    """
    day = np.asarray(day, dtype=float)
    if isinstance(demand, Amount) and gain.shape[1] == 1 and factors is None:
        certain = np.isnan(day)
        order = np.argsort(day, kind="stable")[: (~certain).sum()]
        wanted = float(demand.demand[0])
        sure = float(gain[certain, 0].sum())  # of units that no cloud can take away
        low, high = probability_of_sum(
            gain[order, 0],
            0.0 if sure >= REACHED * wanted else wanted - sure,
            day[order],
            weather.clear_fraction,
            weather.correlation,
        )
        return low, high - low
    weight, chance, exact = drawn(day, weather, stream, factors)
    weight = yields_of(weight, demand)
    reached = np.all(demand.share(np.tensordot(weight, gain, axes=1)) >= REACHED, axis=1)
    return estimate(reached, chance, exact)


def yields_of(weight: Array, demand: Demand) -> Array:
    """Yield ndarray[history, unit] as a demand counts it: time knows only clear and cloudy."""
    return (weight > 0.0).astype(float) if isinstance(demand, Amount) and demand.by_clock else weight


def estimate(reached: NDArray[np.bool_], chance: Array, exact: bool) -> tuple[float, float]:
    """Probability and standard error of an event over histories; a sample of one kind has 1/n at least."""
    probability = float(np.clip(chance @ reached, 0.0, 1.0))
    if exact:
        return probability, 0.0
    error = np.sqrt(max(probability * (1.0 - probability) / reached.size, 0.0))
    return probability, max(float(error), 1.0 / reached.size)


def curve(
    gain: Array,
    demand: Demand,
    day: ArrayLike,
    cost: ArrayLike,
    order: ArrayLike,
    weather: Weather,
    factors: Array | None = None,
) -> Curve:
    """Probability for requests that take the units in a stated order of preference, one more each time.

    Args:
        gain: ndarray[unit, bin] or ndarray[unit, bin, 2, 2].
        demand: goal per bin.
        day: ndarray[unit], any order.
        cost: ndarray[unit]; a half night counts as its share.
        order: unit indices, most wanted first.
        weather: chain, trials and seed.
        factors: ndarray[trial, unit], natural scatter.

    """
    if not isinstance(demand, Amount) or gain.shape[1] > 1 or factors is not None:
        return joint_curve([(gain, demand)], day, cost, order, weather, factors)
    day, order = np.asarray(day, dtype=float), np.asarray(order, dtype=np.int64)
    found = [success(gain[order[:n]], demand, day[order[:n]], weather) for n in range(1, order.size + 1)]
    own, width = np.array(found).T
    low = np.maximum.accumulate(own)  # a bound for fewer units is one for more
    return Curve(
        units=np.arange(1, order.size + 1),
        cost=np.cumsum(np.asarray(cost, dtype=float)[order]),
        probability=low,
        probability_error=np.maximum(width - (low - own), 0.0),
    )


def joint_curve(
    goals: Sequence[tuple[Array, Demand]],
    day: ArrayLike,
    cost: ArrayLike,
    order: ArrayLike,
    weather: Weather,
    factors: Array | None = None,
) -> Curve:
    """Probability that *all* of several goals are reached, against units requested.

    All requests are judged in the same histories: one more unit never lowers the probability, and goals
    fail together as they do under one sky.

    Args:
        goals: pairs of gain (ndarray[unit, bin] or ndarray[unit, bin, 2, 2]) and demand.
        day: ndarray[unit], any order.
        cost: ndarray[unit].
        order: unit indices, most wanted first.
        weather: chain, trials and seed.
        factors: ndarray[trial, unit], natural scatter.

    """
    day, order = np.asarray(day, dtype=float), np.asarray(order, dtype=np.int64)
    weight, chance, exact = drawn(day[order], weather, 0, None if factors is None else factors[:, order])
    reached = np.ones((order.size, weight.shape[0]), dtype=bool)
    for gain, demand in goals:
        total = np.zeros((weight.shape[0], *gain.shape[1:]))
        counted = yields_of(weight, demand)
        for i, unit in enumerate(order):
            total += np.multiply.outer(counted[:, i], gain[unit])
            reached[i] &= np.all(demand.share(total) >= REACHED, axis=1)
    found = [estimate(each, chance, exact) for each in reached]
    return Curve(
        units=np.arange(1, order.size + 1),
        cost=np.cumsum(np.asarray(cost, dtype=float)[order]),
        probability=np.array([each[0] for each in found]),
        probability_error=np.array([each[1] for each in found]),
    )
