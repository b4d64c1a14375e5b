"""Natural scatter from night to night: how much more or less than planned a clear night yields.

The ionosphere's column and temperature scatter as the target's description says and are the same for every
site on one night; seeing and water scatter by the quartiles of each site. What a change does to the
information is worked out at the moment of median information.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.offers import Offers
from coldglow.answers.common.scenes import median_moment
from coldglow.describe.records import Orbit, Quartiles, Request
from coldglow.plan.goal import marginalise
from coldglow.plan.nights import scatter_factors
from coldglow.scenario import Air, Scenario, State, expose_sight, sight

Array = NDArray[np.float64]
PLANET, AIR = 21, 22  # streams of random numbers
NUDGE = 0.05  # relative change of the column, and in units of 100 K of the temperature, for slopes


@dataclass(frozen=True, slots=True)
class Response:
    """How the information of one scene answers to changes."""

    power: float  # d ln I / d ln N: 2 where the background is the noise
    slope_k: float  # d ln S / dT of the signal, 1/K
    quartiles: tuple[tuple[float, float, float], ...]  # information at good, median, poor over the planned


def response_of(request: Request, scene: Scenario) -> Response:
    """Return how the information of a scene changes with the ionosphere and with the air."""
    track = scene.track.take([median_moment(scene)])

    def rate(state: State, air: Air) -> float:
        seen = expose_sight(sight(request, scene.use, track, air), state)
        assert seen is not None  # the moment is usable
        return float(marginalise(seen.matrix + seen.prior)[0, 0, 0])

    state, air = scene.state, scene.air
    planned = rate(state, air)
    more = rate(replace(state, column_m2=state.column_m2 * (1.0 + NUDGE)), air)
    power = float(np.log(more / planned) / np.log1p(NUDGE))
    kelvin = 100.0 * NUDGE
    warm, cold = (
        rate(replace(state, temperature_k=state.temperature_k + dt), air) for dt in (kelvin, -kelvin)
    )
    slope = float(np.log(warm / cold) / (2.0 * kelvin)) / power
    if isinstance(scene.use.instrument.place, Orbit):
        return Response(power, slope, ())
    sky = scene.use.instrument.sky

    def over(quartiles: Quartiles, name: str) -> tuple[float, float, float]:
        values = (quartiles.good, quartiles.median, quartiles.poor)
        good, median, poor = (rate(state, replace(air, **{name: value})) / planned for value in values)
        return good, median, poor

    return Response(power, slope, (over(sky.seeing_rad, "seeing_rad"), over(sky.water_m, "water_m")))


def factors_of(request: Request, given: Offers) -> Array:
    """Return ndarray[trial, offer]: information of each offer over the planned, if it is clear.

    Halves of one night share their night's draw.
    """
    weather, emission = request.weather, request.target.emission
    days, night = np.unique(given.day, return_inverse=True)
    shape = (weather.trials, days.size)
    found = np.ones((weather.trials, given.size))
    for k, scene in enumerate(given.scenes):
        here = np.flatnonzero(given.scene == k)
        if not here.size:
            continue
        response, site = response_of(request, scene), int(given.site[here[0]])
        planet = scatter_factors(
            shape,
            np.random.default_rng([weather.seed, PLANET]),
            emission.column_m2.scatter / emission.column_m2.value,
            emission.temperature_k.scatter,
            response.slope_k,
            response.power,
        )
        air = scatter_factors(
            shape,
            np.random.default_rng([weather.seed, AIR, site]),
            quartile_information=response.quartiles,
        )
        found[:, here] = (planet * air)[:, night[here]]
    return found
