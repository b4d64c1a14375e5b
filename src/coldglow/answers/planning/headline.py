"""The first screen of the report: the answer in plain words, and its numbers with their errors."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coldglow.answers.asking.requesting import Plan
from coldglow.answers.asking.words import asked_words, climate_words
from coldglow.answers.common.scenes import conditions_words, unseen_words
from coldglow.answers.common.visit import told_after_s
from coldglow.answers.fading.words import dropout_sentence
from coldglow.answers.planning.findings import Exposed, Findings, quickest
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.plan.goal import column_error, temperature_error
from coldglow.report import words
from coldglow.report.results import Entry
from coldglow.scenario import emission_of

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
        some = found.choice.cover.covered.any()
        part = "a part of the longitudes stays" if some else "all longitudes stay"
        return f"Not feasible as it stands: {part} out of reach"
    return f"Not feasible as it stands: it takes {found.nights.header['nights']}, more than the budget"


def answer(found: Findings) -> list[str]:
    """Return what the first screen says: how long, how many nights, which, what limits, what was assumed."""
    if not found.visible:
        return [unseen_words(scene) for scene in found.scenes]
    return [
        _how_long(found),
        _how_many(found),
        _limits(found),
        _assumed(found),
        *_coverage(found),
        *_outlook(found),
    ]


def time_entry(each: Exposed, index: int) -> Entry:
    """Return the clock time to one goal with what the uncertain light makes of it."""
    need, light = each.needs[index], each.brightness
    name = words.sentence_case(need.name)
    if not np.isfinite(need.clock_s):
        return Entry(np.inf, "h", text="never", label=name)
    text = words.duration(need.clock_s)
    random, fixed = span(light.random_s[index]), span(light.systematic_s[index])
    if random:
        text += f" ({random} random, {fixed or 'no more'} systematic)"
    return Entry(need.clock_s / 3600.0, "h", text=text, label=name)


def span(pair: tuple[float, float]) -> str:
    """Return a range of times, the shorter first; empty where both read alike."""
    short, long = (words.duration(time_s) for time_s in pair)
    return f"{short} to {long}" if short != long else ""


def merit(found: Findings) -> dict[str, Entry]:
    """Return the headline numbers, with their random and systematic errors where they have any."""
    numbers: dict[str, Entry] = {}
    if not found.visible:
        return numbers
    best = quickest(found.exposed)
    for index, need in enumerate(best.needs):
        numbers[need.name] = time_entry(best, index)
    return numbers | request_entries(found) | measured(best)


def request_entries(found: Findings) -> dict[str, Entry]:
    """Return nights and probability, each with what a planet 1 sigma brighter or fainter makes of it."""
    header, plan, spread = found.nights.header, found.plan, found.range
    if "nights" not in header or plan is None:
        return {}
    nights, trailing = str(header["nights"]), ""
    chance = words.probability(float(header["probability"].value))
    if spread is not None:
        few, many = (_asked(plan, place) for place in spread.place)
        trailing = f" ({few} if the planet is 1σ brighter, {many} if fainter)" if few != many else ""
        bright, faint = (words.probability(each) for each in spread.probability)
        chance += f" ({bright} if the planet is 1σ brighter, {faint} if fainter)" if bright != faint else ""
    return {
        "nights": Entry(header["nights"].value, text=f"{nights}{trailing}", label="nights to request"),
        "probability": Entry(header["probability"].value, text=chance, label="probability of success"),
    }


def _asked(plan: Plan, place: int | None) -> str:
    """Return what ends at a place of the order, without its unit of nights; None: more than all of it."""
    last = plan.order.size - 1 if place is None else place
    text = asked_words(plan, last).removesuffix(" nights").removesuffix(" night")
    return f"more than {text}" if place is None else text


def measured(each: Exposed) -> dict[str, Entry]:
    """Return temperature and column as one visit to the goal (or of an hour's open shutter) measures them."""
    seen, state = each.seen, each.seen.state
    open_s = told_after_s(each.needs)
    matrix, systematic = seen.visit.yields(open_s), seen.systematic(open_s)
    kelvin, relative = float(temperature_error(matrix)), float(column_error(matrix))
    numbers = {}
    if np.isfinite(kelvin):
        numbers["temperature"] = Entry(
            state.temperature_k,
            "K",
            random_error=kelvin,
            systematic_error=systematic.temperature_total_k,
            label="temperature as measured",
        )
        numbers["column"] = Entry(
            state.column_m2,
            "m-2",
            random_error=relative * state.column_m2,
            systematic_error=systematic.column_total * state.column_m2,
            label="vertical column as measured",
        )
    else:
        fixed = 1.0 / float(seen.visit.snr(open_s))
        numbers["column"] = Entry(
            state.column_m2,
            "m-2",
            random_error=fixed * state.column_m2,
            systematic_error=systematic.fixed_total * state.column_m2,
            label="vertical column as measured, T given",
        )
    for name in ("coldest_temperature", "smallest_column"):
        numbers[name] = each.result.header[name]
    return numbers


def _how_long(found: Findings) -> str:
    best = quickest(found.exposed)
    goal, use, parts = found.request.goal, best.seen.use, []
    sure = f" with probability {words.probability(goal.probability)}" if goal.probability != 0.5 else ""
    names = {
        "time_to_goal": f"SNR {words.short(goal.snr or 0.0)}{sure}",
        "time_to_temperature_error": f"the temperature to ± {words.short(goal.temperature_error_k or 0.0)} K",
        "time_to_column_error": f"the column to ± {words.short(100.0 * (goal.column_error or 0.0))} %",
    }
    for index, need in enumerate(best.needs):
        if np.isfinite(need.clock_s):
            text = f"{names[need.name]} takes {words.duration(need.clock_s)} of clock time"
            text += " (the shortest visit)" if need.open_s <= best.seen.visit.shortest_s else ""
            random = span(best.brightness.random_s[index])
            parts.append(f"{text} ({random} if the planet is 1σ brighter or fainter)" if random else text)
        else:
            parts.append(f"{names[need.name]} is never reached")
    rank = "" if len(found.exposed) == 1 else ", the quickest of those asked about"
    return f"How long: {words.listing(parts)}, with {use.instrument.name}, {use.setting.name}{rank}."


def _how_many(found: Findings) -> str:
    header, plan, days = (
        found.nights.header,
        found.plan,
        list(dict.fromkeys(s.night for s in found.stretches)),
    )
    if "nights" not in header or plan is None:
        return f"How many nights: {found.nights.sentences[0]}"
    if len(days) <= DATES_NAMED:
        which = words.listing([words.day(day) for day in days])
    else:
        noun = "day" if found.request.in_space else "evening"
        which = f"{words.count(len(days), noun)} from {words.day(days[0])} to {words.day(days[-1])}"
    text = (
        f"How many nights: {header['nights']} ({which}) reach {header['goal']} with probability "
        f"{words.probability(float(header['probability'].value))}"
    )
    if plan.chosen is not None and 0 < plan.needed <= plan.chosen:
        text += f"; if all were clear, {asked_words(plan, plan.needed - 1)} would do"
    return f"{text}."


def _coverage(found: Findings) -> Iterator[str]:
    if found.cover is not None and found.choice is not None:
        yield f"Rotation: {found.cover.sentences[0]}"


def _limits(found: Findings) -> str:
    best = quickest(found.exposed)
    share, fixed = best.seen.detail.variance_share, best.seen.systematic(told_after_s(best.needs))
    order = np.argsort(-share, kind="stable")[:2]
    noise = words.listing(
        [f"{NOISE_SOURCES[i]} ({words.percent(float(share[i]))})" for i in order if share[i] > 0.05]
    )
    known = f"± {words.percent(fixed.fixed_total)} in the column"
    if np.isfinite(fixed.temperature_total_k):
        kelvin = words.quantity(fixed.temperature_total_k, "K", 2)
        known = f"± {kelvin} in temperature and ± {words.percent(fixed.column_total)} in column"
    return (
        f"What limits: noise of {noise}; systematic errors of {known}, which a longer exposure lowers little."
    )


def _outlook(found: Findings) -> Iterator[str]:
    if found.fading is not None and any(found.fading.night):
        yield f"Outlook: {dropout_sentence(found.fading)}"


def _assumed(found: Findings) -> str:
    best = quickest(found.exposed)
    state, emission = best.seen.state, emission_of(found.request)
    kelvin = words.with_error(state.temperature_k, emission.temperature_k.uncertainty, "K")
    column = words.with_error(state.column_m2, emission.column_m2.uncertainty, "m-2")
    climate = "" if found.plan is None else f"; {climate_words(found.request, found.plan.offers)}"
    return (
        f"Assumed: {kelvin} and a vertical column of {column}; "
        f"{conditions_words(best.seen.use, best.seen.air)}{climate}; all defaults stand below."
    )
