"""What a cover cannot reach, in words with numbers: seen too seldom, turned away, or too faint."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.offers import STRETCH, WHOLE
from coldglow.answers.covering.choice import Choice
from coldglow.plan.rotation import advance_per_day_rad, closest_resonance
from coldglow.plan.stretches import runs
from coldglow.report import words
from coldglow.scenario import Scenario

SMALL_DRIFT = 0.06  # of a turn: days that miss whole turns by less bring the same faces back


def missing_words(choice: Choice) -> Iterator[str]:
    """Yield what is out of reach and why, and what is missing within the limits."""
    question, cover = choice.question, choice.cover
    spot, width = question.request.coverage.spot, float(np.degrees(question.width_rad))
    never = cover.most <= 0.0
    short = ~cover.reachable & ~never
    late = cover.reachable & ~cover.covered

    def where(chosen: NDArray[np.bool_]) -> str:
        return f"the {spot}" if spot else bin_ranges(chosen, width)

    if never.any():
        yield f"Out of reach, {where(never)}: {_why_never(choice)}."
    if short.any():
        yield f"Out of reach, {where(short)}: {_why_short(choice, short)}."
    if turned_away(choice).any():
        yield f"The reason: {_rotation_words(choice)}."
    if late.any() and cover.chosen.size:
        low, high = float(cover.share[late].min()), float(cover.share[late].max())
        got = words.percent(low) if high - low < 0.01 else f"{words.percent(low)} to {words.percent(high)}"
        yield f"Missing within the limits, {where(late)}: {got} of what the goal asks."


def offered_hours(choice: Choice) -> NDArray[np.float64]:
    """Return the hours on each bin of all that is offered, without counting any twice."""
    question = choice.question
    part, clock_s = question.offers.part, question.clock_s
    if (part == STRETCH).any():
        overlap = 1.0 if choice.stare else 0.5  # stretches begin every half of their length
        return np.asarray(overlap * clock_s.sum(axis=0) / 3600.0)
    return np.asarray(clock_s[part == WHOLE].sum(axis=0) / 3600.0)


def turned_away(choice: Choice) -> NDArray[np.bool_]:
    """Return the bins that cannot be reached because they are seen far less than others, if at all."""
    coverage, hours = choice.question.request.coverage, offered_hours(choice)
    if coverage.latitude_rad is not None:
        return np.zeros(hours.size, dtype=bool)
    seldom = np.asarray((hours < 0.5 * hours.mean()) | (hours <= 0.0), dtype=bool)
    away: NDArray[np.bool_] = ~choice.cover.reachable & seldom
    return away


def _why_short(choice: Choice, short: NDArray[np.bool_]) -> str:
    """Return why bins get something, but not enough: seen too little, or too faint."""
    most, hours = choice.cover.most, offered_hours(choice)
    best, worst = float(most[short].max()), float(most[short].min())
    share = (
        words.percent(best)
        if best - worst < 0.05 * best
        else f"{words.percent(worst)} to {words.percent(best)}"
    )
    seen = f"{words.number(float(hours[short].min()), 2)} to {words.number(float(hours[short].max()), 2)} h"
    text = f"all that is offered gathers {share} of what the goal asks there, in {seen}"
    if turned_away(choice)[short].any():
        return text
    need = float(np.median(hours[short] / most[short]))
    need_words = f"it would take some {words.number(need, 2)} h on each bin"
    return f"{text}; the goal is too deep for this target: {need_words}"


def _why_never(choice: Choice) -> str:
    request, scenes = choice.question.request, choice.question.offers.scenes
    latitude = request.coverage.latitude_rad
    if request.coverage.spot:
        return "it is never in view while the target can be observed"
    if latitude is not None:
        seen = np.concatenate([s.track.sub_observer_latitude_rad[s.usable] for s in scenes])
        nearest = float(np.abs(seen - latitude).min())
        if nearest > request.coverage.angle_max_rad:
            low, high = np.degrees([seen.min(), seen.max()])
            return (
                f"latitude {degrees(latitude)} never comes within "
                f"{degrees(request.coverage.angle_max_rad)} of the sub-observer point, whose latitude stays "
                f"between {words.quantity(low, 'deg', 3)} and {words.quantity(high, 'deg', 3)}"
            )
        if request.coverage.lit != "any":
            return f"they are never in view by {request.coverage.lit} within the angle asked"
    return "they never face us while the target can be observed"


def degrees(angle_rad: float) -> str:
    """Return an angle in words."""
    return words.quantity(float(np.degrees(angle_rad)), "deg", 3)


def _rotation_words(choice: Choice) -> str:
    """Return how the rotation meets the nights of each instrument, in words with numbers."""
    seen = [scene for scene in choice.question.offers.scenes if scene.usable.any()]
    return "; ".join(dict.fromkeys(_rotation_of(scene) for scene in seen))


def _rotation_of(scene: Scenario) -> str:
    steps, period_s = scene.steps, scene.track.system.period_s
    first, end = runs(steps.time_s, steps.step_s, scene.usable, steps.night)
    longest_s = float((end - first).max() * steps.step_s)
    nights = int(np.unique(steps.night[first]).size)
    text = (
        f"from {scene.use.instrument.name} the longest observable stretch of a night is "
        f"{words.duration(longest_s)} ({degrees(2.0 * np.pi * longest_s / period_s)} of rotation), "
        f"on {words.count(nights, 'night')}; at the same hour of the next day the central longitude has "
        f"advanced by {degrees(advance_per_day_rad(period_s))}"
    )
    again = closest_resonance(period_s, max(min(nights, 10), 1))
    if abs(again.drift_rad) < 2.0 * np.pi * SMALL_DRIFT and longest_s < period_s:
        text += (
            f", and {words.count(again.nights, 'day')} are nearly {words.count(again.turns, 'turn')} "
            f"({'+' if again.drift_rad > 0 else ''}{degrees(again.drift_rad)}), so that the same faces come "
            "back"
        )
    return text


def bin_ranges(chosen: NDArray[np.bool_], width_deg: float) -> str:
    """Return the longitudes of the chosen bins in words, neighbours joined: ``longitudes 30° to 90°``."""
    count = chosen.size
    if chosen.all():
        return "at all longitudes"
    starts = [b for b in range(count) if chosen[b] and not chosen[b - 1]]
    ranges = []
    for b in starts:
        length = next(n for n in range(1, count + 1) if not chosen[(b + n) % count])
        low, high = b * width_deg, ((b + length) % count) * width_deg or 360.0
        ranges.append(f"{words.short(low, 4)}° to {words.short(high, 4)}°")
    return f"longitudes {words.listing(ranges)}"
