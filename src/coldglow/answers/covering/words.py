"""What a cover says in words: the choice and its proof, its longitudes, what it cannot reach and why."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coldglow.answers.common.offers import STRETCH
from coldglow.answers.covering.choice import Choice
from coldglow.answers.covering.outofreach import degrees, missing_words
from coldglow.describe.records import LongitudeSystem
from coldglow.plan.goal import required_snr
from coldglow.report import words
from coldglow.report.results import Entry
from coldglow.sky.clock import tdb_from_tt
from coldglow.sky.orientation import absolute_phase_uncertainty_rad, phase_uncertainty_rad

PARTS_LISTED = 8


def system_of(choice: Choice) -> LongitudeSystem:
    """Return the longitude system of the answer."""
    return choice.question.offers.scenes[0].track.system


def phase_errors_rad(choice: Choice) -> tuple[float, float]:
    """Return the 1-sigma uncertainty of the longitudes at the last visit, and between first and last."""
    given, chosen, system = choice.question.offers, choice.cover.chosen, system_of(choice)
    first, last = float(given.start_tt_s[chosen].min()), float(given.end_tt_s[chosen].max())
    absolute = float(absolute_phase_uncertainty_rad(system, tdb_from_tt(np.array([last])))[0])
    return absolute, float(phase_uncertainty_rad(system, last - first))


def resolution_deg(choice: Choice) -> float:
    """Return the coarsest effective longitude resolution among the chosen instruments (median over time)."""
    question = choice.question
    used = sorted({int(k) for k in question.offers.scene[choice.cover.chosen]})
    scenes = question.offers.scenes
    coarsest = max(float(np.median(question.resolution[k][scenes[k].usable])) for k in used)
    return float(np.degrees(coarsest))


def header_of(choice: Choice) -> dict[str, Entry]:
    """Return the header values of the answer."""
    question, cover = choice.question, choice.cover
    request, given, system = question.request, question.offers, system_of(choice)
    header = {
        "request": Entry(request.name),
        "goal": Entry(_goal_words(choice)),
        "longitudes": Entry(system.name),
        "period": Entry(system.period_s / 3600.0, "h", digits=8),
    }
    if not cover.chosen.size:
        return header
    absolute, relative = phase_errors_rad(choice)
    unit = given.cost_unit
    header |= {
        "cost": Entry(cover.cost, "h" if unit == "h" else "", text=given.price(cover.cost)),
        "visits": Entry(int(cover.chosen.size)),
        "proven": Entry(cover.proven, text=_proof_words(choice)),
        "gap": Entry(cover.gap, text=words.percent(cover.gap)),
        "phase_uncertainty": Entry(
            np.degrees(absolute), "deg", text=_phase_words(system, absolute), digits=2
        ),
        "relative_phase_uncertainty": Entry(
            np.degrees(relative), "deg", text=_phase_words(system, relative), digits=2
        ),
        "resolution": Entry(resolution_deg(choice), "deg", digits=2),
        "bin_width": Entry(np.degrees(question.width_rad), "deg", digits=3),
    }
    if request.coverage.spot:
        header["spot"] = Entry(request.coverage.spot)
        del header["resolution"], header["bin_width"]
    return header


def _phase_words(system: LongitudeSystem, error_rad: float) -> str:
    if system.period_uncertainty_s == 0.0:
        return "unknown, the period has no stated uncertainty"
    if error_rad >= np.pi:
        return f"± {words.number(error_rad / (2.0 * np.pi), 2)} turns"
    return f"± {words.quantity(np.degrees(error_rad), 'deg', 2)}"


def _proof_words(choice: Choice) -> str:
    if choice.stare:
        return "yes, the shortest of all starts tried"
    return "yes" if choice.cover.proven else "no, stopped by the time limit"


def _goal_words(choice: Choice) -> str:
    request, question = choice.question.request, choice.question
    where = "" if request.coverage.spot else f" in each of {question.bins} bins of longitude"
    return question.goal + where + expected_words(choice)


def expected_words(choice: Choice) -> str:
    """Return what the measured-SNR probability makes of the goal, or nothing."""
    request = choice.question.request
    goal, chance = request.coverage.snr, request.goal.probability
    if goal is None or chance == 0.5:
        return ""
    needed = words.number(required_snr(goal, chance), 3)
    return f" (expected {needed}, so that the measured one reaches it with {words.probability(chance)})"


def sentences_of(choice: Choice) -> list[str]:
    """Return the answer in sentences."""
    return [*_answer(choice), *missing_words(choice), *_budget(choice), *_longitudes(choice)]


def _answer(choice: Choice) -> Iterator[str]:
    question, cover = choice.question, choice.cover
    given, what = question.offers, covered_words(choice)
    if not cover.chosen.size:
        yield _nothing(choice)
        return
    price = given.price(cover.cost)
    if choice.stare:
        yield from _stare_words(choice)
    elif cover.kind == "most":
        yield (
            f"No choice within the limits covers everything. The one that covers most ({price}) gives {what}."
        )
    else:
        verb = "gives" if cover.chosen.size == 1 else "give"
        parts = _parts_words(choice)
        asked = parts if parts == price else f"{parts} ({price})"
        yield f"{asked} {verb} {what}" + (
            ", and no choice of lower cost does: proven."
            if cover.proven
            else f". The proof was stopped at the time limit of "
            f"{words.duration(question.request.coverage.time_limit_s)}: no choice costs less than "
            f"{given.price(cover.cost_bound)}, so that this one may be {words.percent(cover.gap)} too dear."
        )
    if cover.kind == "most" and not cover.proven:
        most = words.percent(cover.gap)
        yield f"The search was stopped by the time limit; a better choice may cover {most} more."
    names = [given.name(int(i)) for i in cover.chosen]
    rest = len(names) - PARTS_LISTED
    tail = "" if rest <= 0 else f" and {rest} more (table below)"
    if not choice.stare:
        yield f"{'It is' if len(names) == 1 else 'They are'} {'; '.join(names[:PARTS_LISTED]) + tail}."
    if question.request.coverage.spot:
        yield _pass_words(choice)
    if not any(k in given.cloudless for k in given.site[cover.chosen]):
        yield "This takes every night as clear; `coldglow nights` says which ones to add against the weather."


def _pass_words(choice: Choice) -> str:
    """Return how often a spot passes on the nights in question, and what a pass is worth."""
    question = choice.question
    given, spot = question.offers, question.request.coverage.spot
    night = 1000 * given.day + given.scene
    best = np.array([question.information[night == each, 0].max() for each in np.unique(night)])
    snr = np.sqrt(best[best > 0.0])
    low, middle, high = np.quantile(snr, [0.0, 0.5, 1.0]) if snr.size else (0.0, 0.0, 0.0)
    passes = int((question.clock_s[choice.cover.chosen, 0] > 0.0).sum())
    noun = {0: "whole night", STRETCH: "stretch"}.get(int(given.part[0]), "visit")
    return (
        f"The spot “{spot}” shows on {words.count(snr.size, 'night')} of those in question; the best {noun} "
        f"of a night knows its brightness against the rest of the disk to SNR {words.number(float(low), 2)} "
        f"to {words.number(float(high), 2)} (median {words.number(float(middle), 2)}). Here "
        f"{words.count(passes, 'pass', 'passes')} {'is' if passes == 1 else 'are'} used."
    )


def _parts_words(choice: Choice) -> str:
    given, chosen = choice.question.offers, choice.cover.chosen
    found = []
    for part, noun in ((0, "night"), (1, "first half"), (2, "second half"), (3, "stretch")):
        count = int((given.part[chosen] == part).sum())
        plural = {"first half": "first halves", "second half": "second halves", "stretch": "stretches"}
        if count:
            found.append(words.count(count, noun, plural.get(noun, "")))
    return words.listing(found)


def covered_words(choice: Choice) -> str:
    """Return what the choice reaches: ``SNR 10 in all 12 bins``."""
    question, cover = choice.question, choice.cover
    count, bins = int(cover.covered.sum()), question.bins
    if question.request.coverage.spot:
        share = "" if count else f" only to {words.percent(float(cover.share[0]))}"
        return f"{question.goal}{share}"
    if count == bins:
        return f"{question.goal} in {f'all {bins} bins' if bins > 1 else 'the one bin'}"
    return f"{question.goal} in {count} of {bins} bins"


def _stare_words(choice: Choice) -> Iterator[str]:
    question, cover = choice.question, choice.cover
    given, chosen = question.offers, choice.cover.chosen
    scene = given.scenes[0]
    length_s = float(given.end_tt_s[chosen].max() - given.start_tt_s[chosen].min())
    turns = length_s / scene.track.system.period_s
    visits = (
        "in one visit"
        if chosen.size == 1
        else f"in {chosen.size} visits of {words.duration(float(given.observable_s[chosen[0]]))}"
    )
    begin = given.name(int(chosen[0])).partition(" for ")[0]
    yield (
        f"A stare of {words.duration(length_s)} ({words.number(turns, 3)} turns) from {begin}, {visits}, "
        f"gives {covered_words(choice)}"
        + (
            "; no shorter one that sees a full turn does, of all starts tried."
            if cover.kind == "full"
            else ": the longest there is."
        )
    )
    lost = np.degrees(2.0 * np.pi * scene.overhead_s / scene.track.system.period_s)
    limit_s = scene.use.instrument.limits.longest_visit_s
    if chosen.size > 1:
        yield (
            f"The longest visit ({words.duration(limit_s)}) forces the split. Each visit begins with "
            f"{words.duration(scene.overhead_s)} of acquisition, in which {words.quantity(lost, 'deg', 2)} "
            "of longitude go by unseen; the visits are laid so that these gaps are filled in another turn."
        )
    elif lost:
        yield (
            f"Its first {words.duration(scene.overhead_s)} are acquisition, in which "
            f"{words.quantity(lost, 'deg', 2)} of longitude go by unseen."
        )


def _nothing(choice: Choice) -> str:
    question, cover = choice.question, choice.cover
    if not cover.reachable.any():
        return "No bin can be reached, whatever is asked for."
    if cover.proven:
        return "No choice obeys the limits of the request (fixed nights, blocks, the most nights)."
    return (
        "No choice was found within the time limit of "
        f"{words.duration(question.request.coverage.time_limit_s)}; give `coverage.time_limit` more."
    )


def _budget(choice: Choice) -> Iterator[str]:
    given, cover, budget = choice.question.offers, choice.cover, choice.question.request.budget
    if cover.chosen.size and not within_budget(choice):
        most = [] if budget.nights is None else [words.count(budget.nights, "night")]
        most += [] if budget.hours is None else [words.duration(3600.0 * budget.hours)]
        asked, limit = given.price(cover.cost), words.listing(most)
        yield f"{asked} are more than the budget of {limit}: not feasible as it stands."


def within_budget(choice: Choice) -> bool:
    """Return whether the choice stays within the request's budget of nights and of hours."""
    given, chosen, budget = choice.question.offers, choice.cover.chosen, choice.question.request.budget
    hours = float(given.observable_s[chosen].sum()) / 3600.0
    nights = float(given.nights_along(chosen)[-1]) if chosen.size else 0.0
    return budget.allows(nights, hours)


def _longitudes(choice: Choice) -> Iterator[str]:
    question, system = choice.question, system_of(choice)
    if not choice.cover.chosen.size:
        return
    absolute, relative = phase_errors_rad(choice)
    width = question.width_rad
    text = (
        f"Longitudes are planetographic in system {system.name} (period "
        f"{words.number(system.period_s / 3600.0, 8)} h, growing {system.grows})"
    )
    if system.period_uncertainty_s == 0.0:
        yield f"{text}; its period has no stated uncertainty, so that none can be given for the longitudes."
    elif question.request.coverage.spot:
        yield f"{text}; their phase is uncertain by {_phase_words(system, absolute)} at the last visit."
    elif absolute > width:
        yield (
            f"{text}. They are relative longitudes: the phase is uncertain by "
            f"{_phase_words(system, absolute)} at these dates, more than a bin of {degrees(width)}. From "
            f"first to last visit it is uncertain by {_phase_words(system, relative)}"
            + (
                ", so that the visits fit together."
                if relative < 0.5 * width
                else ", too much for visits so far apart to fit together."
            )
        )
    else:
        yield (
            f"{text}, with a phase uncertain by {_phase_words(system, absolute)} at the last visit and "
            f"{_phase_words(system, relative)} from the first to the last; a bin is {degrees(width)} wide."
        )
    if question.request.coverage.spot or question.request.coverage.latitude_rad is not None:
        return
    resolution = resolution_deg(choice)
    yield (
        "A moment counts for the bin of the central meridian, less the light that the blur "
        f"({words.quantity(resolution, 'deg', 2)} of longitude at the disk's centre) carries out of it"
        + (
            "."
            if resolution <= np.degrees(width)
            else ". The blur is wider than a bin: neighbouring bins are not independent, "
            f"{max(int(360.0 / resolution), 1)} wider ones would be."
        )
    )
