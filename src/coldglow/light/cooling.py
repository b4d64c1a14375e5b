"""Temperature and column at a date: how the ionosphere goes on from the epoch of its description."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coldglow.describe.records import Cooling, Emission, Estimate
from coldglow.errors import RangeError
from coldglow.light.emission import COLDEST_K, HOTTEST_K
from coldglow.sky.clock import DAY_S, utc_from_iso

Floats = NDArray[np.float64]


def seconds_since(epoch: str, dates: str | Sequence[str]) -> Floats:
    """Return the seconds from an ISO date (or time, UTC) to one or several other ones, ndarray[date].

    Days of 86 400 s: leap seconds, under a minute in a century, do not matter to a cooling law.

    Raises: RangeError if a text is no ISO date.
    """
    start = utc_from_iso(epoch)
    listed = [dates] if isinstance(dates, str) else list(dates)
    return np.array([utc_from_iso(date) for date in listed]) - start


def state_at(emission: Emission, cooling: Cooling, dates: str | Sequence[str]) -> tuple[Floats, Floats]:
    """Return the temperature in K and the vertical column in m^-2 on these dates, each ndarray[date].

    The temperature follows the law: constant; T0 + rate t; floor + (T0 - floor) exp(-t / time scale); or a
    table, straight between its dates. The column is N0 exp(column rate t), or that of the table with
    ln N straight between its dates.

    Raises: RangeError with the key path, for a date after `valid_until` or outside the table, and where
    the law leaves 150-1500 K. A straight line with a floor stops there instead.
    """
    time_s = seconds_since(cooling.epoch, dates)
    temperature_k, column_m2 = _state(emission, cooling, time_s)
    _refuse_outside(cooling, time_s, temperature_k)
    return temperature_k, column_m2


def _state(emission: Emission, cooling: Cooling, time_s: Floats) -> tuple[Floats, Floats]:
    """Return the state as the law has it, whatever the temperature; dates beyond the law are refused."""
    _refuse_late(cooling, time_s)
    temperature_k = _temperature(
        cooling,
        time_s,
        emission.temperature_k.value,
        cooling.rate_k_s.value,
        cooling.floor_k.value if cooling.floor_k else None,
        cooling.time_scale_s.value if cooling.time_scale_s else None,
    )
    column_m2 = _column(cooling, time_s, emission.column_m2.value, cooling.column_rate_s.value)
    return temperature_k, column_m2


def emission_at(emission: Emission, cooling: Cooling, date: str) -> Emission:
    """Return the emission as the law has made it by an ISO date, with its uncertainties carried along.

    Each uncertain parameter (T, rate, floor, time scale; N and its rate) is moved by 1 sigma and the changes
    of the result add in quadrature; the scatter from night to night stays as it is.

    Raises: RangeError as `state_at`; but a temperature that lies outside what the line list covers from the
    start is left to the warnings of those who use it.
    """
    time_s = seconds_since(cooling.epoch, date)
    temperature_k, (column_m2,) = _state(emission, cooling, time_s)
    if COLDEST_K <= emission.temperature_k.value <= HOTTEST_K:
        _refuse_outside(cooling, time_s, temperature_k)
    kelvin = temperature_k[0]
    parameters = (emission.temperature_k, cooling.rate_k_s, cooling.floor_k, cooling.time_scale_s)
    central = [None if each is None else each.value for each in parameters]
    changes = [0.0]
    for i, each in enumerate(parameters):
        if each is not None and each.uncertainty:
            moved = [*central[:i], each.value + each.uncertainty, *central[i + 1 :]]
            changes.append(float(_temperature(cooling, time_s, *moved)[0]) - float(kelvin))  # type: ignore[arg-type]
    if cooling.law == "table":
        changes = [emission.temperature_k.uncertainty]
    growth = cooling.column_rate_s.uncertainty * float(time_s[0])
    spread = float(np.hypot(_relative(emission.column_m2), growth))
    return replace(
        emission,
        temperature_k=replace(
            emission.temperature_k, value=float(kelvin), uncertainty=float(np.hypot.reduce(changes))
        ),
        column_m2=replace(emission.column_m2, value=float(column_m2), uncertainty=float(column_m2) * spread),
    )


def sample_states(
    emission: Emission,
    cooling: Cooling,
    dates: str | Sequence[str],
    trials: int,
    rng: np.random.Generator,
) -> tuple[Floats, Floats]:
    """Return temperature in K and column in m^-2 of possible planets, each ndarray[trial, date].

    One trial is one planet: a temperature, a column and a law drawn from their uncertainties and then
    followed through all dates. T, rate, column rate and floor are normal; the column and the time scale,
    which cannot be negative, log-normal with the stated value as median and sigma(ln) = uncertainty / value.
    What is uncertain about the LTE fraction cannot be told from the column and is drawn with it.
    The uncertainty of a table is that of the emission block, common to all its dates. A trial that leaves
    150-1500 K is held at that edge: at 150 K no light is left, so "not detectable" stays what it is.
    The night-to-night scatter is not in here: it averages over nights, the uncertainty does not.

    Raises: RangeError as `state_at`, whose answer is the one for no uncertainty at all.
    """
    central_k, _ = state_at(emission, cooling, dates)
    time_s = seconds_since(cooling.epoch, dates)
    draws = rng.standard_normal(
        (7, trials, 1)
    )  # all seven always: setting one uncertainty to 0 keeps the rest
    start_k = _normal(emission.temperature_k, draws[0])
    temperature_k = _temperature(
        cooling,
        time_s,
        start_k,
        _normal(cooling.rate_k_s, draws[1]),
        _normal(cooling.floor_k, draws[2]) if cooling.floor_k else None,
        _log_normal(cooling.time_scale_s, draws[3]) if cooling.time_scale_s else None,
    )
    if cooling.law == "table":
        temperature_k = central_k + (start_k - emission.temperature_k.value)
    column_m2 = _column(cooling, time_s, emission.column_m2.value, _normal(cooling.column_rate_s, draws[4]))
    doubt = _relative(emission.column_m2) * draws[5] + _relative(emission.lte_fraction) * draws[6]
    column_m2 = column_m2 * np.exp(doubt)
    temperature_k = np.clip(temperature_k, np.minimum(COLDEST_K, central_k), np.maximum(HOTTEST_K, central_k))
    shape = (trials, time_s.size)
    return (
        np.broadcast_to(temperature_k, shape).copy(),
        np.broadcast_to(column_m2, shape).copy(),
    )


def _temperature(
    cooling: Cooling,
    time_s: Floats,
    start_k: float | Floats,
    rate_k_s: float | Floats,
    floor_k: float | Floats | None,
    time_scale_s: float | Floats | None,
) -> Floats:
    """Return the law as it stands, before any limit; parameters broadcast against ndarray[date]."""
    if cooling.law == "table":
        table_s = seconds_since(cooling.epoch, cooling.table_dates)
        return np.interp(time_s, table_s, cooling.table_temperature_k)
    if cooling.law == "exponential":
        if floor_k is None or time_scale_s is None:
            raise RangeError("An exponential cooling needs both a floor and a time scale.", "cooling")
        return np.asarray(floor_k + (start_k - floor_k) * np.exp(-time_s / time_scale_s))
    if cooling.law == "linear":
        line = start_k + rate_k_s * time_s
        return np.asarray(line if floor_k is None else np.maximum(line, np.minimum(floor_k, start_k)))
    return np.asarray(start_k + 0.0 * time_s)


def _column(cooling: Cooling, time_s: Floats, start_m2: float, rate_s: float | Floats) -> Floats:
    if cooling.law == "table" and cooling.table_column_m2:
        table_s = seconds_since(cooling.epoch, cooling.table_dates)
        return np.exp(np.interp(time_s, table_s, np.log(cooling.table_column_m2)))
    return np.asarray(start_m2 * np.exp(rate_s * time_s))


def _refuse_late(cooling: Cooling, time_s: Floats) -> None:
    """Refuse dates after the law's validity, or outside its table."""
    if cooling.law == "table":
        table_s = seconds_since(cooling.epoch, cooling.table_dates)
        if np.any((time_s < table_s.min()) | (time_s > table_s.max())):
            wrong = time_s[(time_s < table_s.min()) | (time_s > table_s.max())][0]
            raise RangeError(
                f"The cooling table says nothing about {_date(cooling, wrong)}: it runs from "
                f"{cooling.table_dates[0]} to {cooling.table_dates[-1]}.",
                "cooling.table",
            )
    stops_at_floor = cooling.law == "linear" and cooling.floor_k is not None
    if cooling.valid_until and not stops_at_floor:
        latest_s = seconds_since(cooling.epoch, cooling.valid_until)[0]
        if np.any(time_s > latest_s):
            raise RangeError(
                f"The {cooling.law} cooling is said to hold until {cooling.valid_until}, and "
                f"{_date(cooling, time_s.max())} is later; ask for earlier dates, or write a later "
                "valid_until or a law with a floor.",
                "cooling.valid_until",
            )


def _refuse_outside(cooling: Cooling, time_s: Floats, temperature_k: Floats) -> None:
    """Refuse a law that has left the temperatures that the line list covers."""
    wrong = (temperature_k < COLDEST_K) | (temperature_k > HOTTEST_K)
    if not wrong.any() or cooling.law == "constant":
        return  # a constant temperature is a matter of the emission block, which says so itself
    first = int(np.argmax(wrong))
    advice = (
        "; give a floor where the cooling stops, or ask for earlier dates"
        if cooling.law == "linear" and temperature_k[first] < COLDEST_K
        else ""
    )
    key = {"linear": "rate", "exponential": "time_scale", "table": "table"}[cooling.law]
    raise RangeError(
        f"The {cooling.law} cooling gives {temperature_k[first]:.0f} K on {_date(cooling, time_s[first])}; "
        f"the line list holds from {COLDEST_K:.0f} K to {HOTTEST_K:.0f} K{advice}.",
        f"cooling.{key}",
    )


def _normal(estimate: Estimate, draws: Floats) -> Floats:
    return estimate.value + estimate.uncertainty * draws


def _log_normal(estimate: Estimate, draws: Floats) -> Floats:
    return np.asarray(estimate.value * np.exp(_relative(estimate) * draws))


def _relative(estimate: Estimate) -> float:
    return estimate.uncertainty / estimate.value if estimate.value else 0.0


def _date(cooling: Cooling, time_s: float) -> str:
    return str(np.datetime64(cooling.epoch[:10]) + np.timedelta64(int(time_s // DAY_S), "D"))
