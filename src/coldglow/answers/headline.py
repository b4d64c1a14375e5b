"""The first screen of the report: the answer in plain words, and its numbers with their errors."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coldglow.answers.findings import Exposed, Findings
from coldglow.answers.nightswords import climate_words
from coldglow.answers.scenes import conditions_words, unseen_words
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.plan.goal import column_error, temperature_error
from coldglow.report import words
from coldglow.report.results import Entry

DATES_NAMED = 4


def verdict(found: Findings) -> str:
    """Return the answer in a few words."""
    name = found.request.target.name
    if not found.visible:
        return f"Not feasible: {name} cannot be observed on these nights"
    if found.feasible:
        return f"Feasible: ask for {found.nights.header['nights']}"
    if not any(each.result.feasible for each in found.exposed):
        return f"Not feasible: no exposure of {name} is long enough for the goal"
    if "nights" not in found.nights.header:
        return "Not feasible as it stands: the nights offered are not enough"
    if found.choice is not None and not found.choice.cover.covered.all():
        return "Not feasible as it stands: a part of the longitudes stays out of reach"
    return f"Not feasible as it stands: it takes {found.nights.header['nights']}, more than the budget"


def answer(found: Findings) -> list[str]:
    """Return what the first screen says: how long, how many nights, which, what limits, what was assumed."""
    if not found.visible:
        return [unseen_words(scene) for scene in found.scenes]
    return [
        _how_long(found),
        _how_many(found),
        *_which(found),
        *_coverage(found),
        _limits(found),
        *_outlook(found),
        _assumed(found),
    ]


def best_of(found: Findings) -> Exposed:
    """Return the use that reaches its goals soonest; the first of equal ones."""
    return min(found.exposed, key=lambda each: max(need.clock_s for need in each.needs))


def time_entry(each: Exposed, index: int, label: str = "") -> Entry:
    """Return the clock time to one goal with what the uncertain light makes of it."""
    need, light = each.needs[index], each.brightness
    name = label or need.name.replace("_", " ")
    if not np.isfinite(need.clock_s):
        return Entry(np.inf, "h", text="never", label=name)
    low, high = light.short_s[index], light.long_s[index]
    text = (
        f"{words.duration(need.clock_s)} ({words.duration(low)} to {words.duration(high)} for a planet 1σ "
        f"brighter or fainter, ± {words.percent(light.random)}; the light is measured to ± "
        f"{words.percent(light.systematic)}, systematic)"
    )
    return Entry(need.clock_s / 3600.0, "h", text=text, label=name)


def merit(found: Findings) -> dict[str, Entry]:
    """Return the headline numbers, with their random and systematic errors where they have any."""
    header = found.nights.header
    numbers: dict[str, Entry] = {}
    if found.visible:
        best = best_of(found)
        for index, need in enumerate(best.needs):
            numbers[need.name] = time_entry(best, index)
    if "nights" in header:
        numbers["nights"] = Entry(
            header["nights"].value, text=str(header["nights"]), label="nights to request"
        )
        numbers["probability"] = Entry(
            header["probability"].value, text=str(header["probability"]), label="probability of success"
        )
    if found.visible:
        numbers |= measured(best)
    return numbers


def measured(each: Exposed) -> dict[str, Entry]:
    """Return temperature and column as one visit to the goal (or of an hour's open shutter) measures them."""
    seen, state = each.seen, each.seen.state
    finite = [need.open_s for need in each.needs if np.isfinite(need.open_s)]
    matrix = seen.visit.yields(max(finite, default=3600.0))
    kelvin, relative = float(temperature_error(matrix)), float(column_error(matrix))
    numbers = {}
    if np.isfinite(kelvin):
        numbers["temperature"] = Entry(
            state.temperature_k,
            "K",
            random_error=kelvin,
            systematic_error=seen.systematic.temperature_total_k,
            label="temperature as measured",
        )
        numbers["column"] = Entry(
            state.column_m2,
            "m-2",
            random_error=relative * state.column_m2,
            systematic_error=seen.systematic.column_total * state.column_m2,
            label="vertical column as measured",
        )
    else:
        fixed = 1.0 / float(seen.visit.snr(max(finite, default=3600.0)))
        numbers["column"] = Entry(
            state.column_m2,
            "m-2",
            random_error=fixed * state.column_m2,
            systematic_error=seen.systematic.fixed_total * state.column_m2,
            label="vertical column as measured, T given",
        )
    for name in ("coldest_temperature", "smallest_column"):
        numbers[name] = each.result.header[name]
    return numbers


def _how_long(found: Findings) -> str:
    best = best_of(found)
    use, parts = best.seen.use, []
    for index, need in enumerate(best.needs):
        text = need.text
        if np.isfinite(need.clock_s):
            low, high = (
                words.duration(each[index]) for each in (best.brightness.short_s, best.brightness.long_s)
            )
            text += f" ({low} to {high} if the planet is 1σ brighter or fainter than assumed)"
        parts.append(text)
    where = f"{use.instrument.name}, {use.setting.name}"
    more = "" if len(found.exposed) == 1 else ", the quickest of those asked about"
    return f"How long ({where}{more}): {'. '.join(parts)}."


def _how_many(found: Findings) -> str:
    return f"How many nights: {found.nights.sentences[0]}"


def _which(found: Findings) -> Iterator[str]:
    if not found.stretches:
        return
    days = list(dict.fromkeys(stretch.night for stretch in found.stretches))
    if len(days) <= DATES_NAMED:
        text = words.listing([words.day(day) for day in days])
    else:
        text = f"{len(days)} evenings from {words.day(days[0])} to {words.day(days[-1])}"
    if "nights" in found.nights.header:
        yield f"Which nights: {text}; their stretches stand below, in nights.html and in observing.ics."
    else:
        yield f"The best that the budget allows: {text}; their stretches stand below."


def _coverage(found: Findings) -> Iterator[str]:
    if found.cover is not None and found.choice is not None:
        yield f"Rotation: {found.cover.sentences[0]}"


def _limits(found: Findings) -> str:
    best = best_of(found)
    share = best.seen.detail.variance_share
    order = np.argsort(-share, kind="stable")[:2]
    sources = words.listing(
        [
            f"{NOISE_SOURCES[i]} ({words.percent(float(share[i]))} of the noise)"
            for i in order
            if share[i] > 0.05
        ]
    )
    systematic = best.seen.systematic
    text = f"What limits: {sources}"
    if np.isfinite(systematic.temperature_total_k):
        text += (
            "; systematic errors that no exposure lowers leave "
            f"± {words.quantity(systematic.temperature_total_k, 'K', 2)} in the temperature and "
            f"± {words.percent(systematic.column_total)} in the column"
        )
    else:
        text += f"; systematic errors leave ± {words.percent(systematic.fixed_total)} in the column"
    return f"{text}."


def _outlook(found: Findings) -> Iterator[str]:
    if found.fade is not None:
        yield f"Outlook: {found.fade.sentences[1]}"


def _assumed(found: Findings) -> str:
    best = best_of(found)
    state, emission = best.seen.state, found.request.target.emission
    kelvin = f"{words.with_error(state.temperature_k, emission.temperature_k.uncertainty, 'K')}"
    column = f"{words.with_error(state.column_m2, emission.column_m2.uncertainty, 'm-2')}"
    climate = "" if found.plan is None else f"; {climate_words(found.request, found.plan.offers)}"
    return (
        f"Assumed: {kelvin} and a vertical column of {column} (1σ of what is known of the planet); "
        f"{conditions_words(best.seen.use, best.seen.air)}{climate}. Every default stands under Assumptions."
    )
