"""The justification of a proposal: paragraphs as a careful proposer writes them, from what was found."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coldglow.answers.asking.chosen import stretches_table
from coldglow.answers.asking.words import climate_words
from coldglow.answers.common.scenes import conditions_words, dates_words, unseen_words
from coldglow.answers.common.visit import told_after_s
from coldglow.answers.planning.findings import Exposed, Findings, quickest
from coldglow.answers.planning.headline import measured, request_entries, span, time_entry
from coldglow.describe.column import mean_path_factor
from coldglow.describe.records import Orbit
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.plan.goal import column_error, temperature_error
from coldglow.report import words
from coldglow.report.proposal import Justification
from coldglow.report.results import Entry
from coldglow.scenario import emission_of


def justification_of(found: Findings) -> Justification:
    """Return the justification; where nothing can be observed it says that."""
    title = f"Technical justification: {found.request.name}"
    if not found.visible:
        return Justification(title, [unseen_words(scene) for scene in found.scenes])
    paragraphs = [
        _request(found),
        _state(found),
        *(_sensitivity(each) for each in found.exposed),
        *_rotation(found),
        _nights(found),
        *_outlook(found),
    ]
    nights = stretches_table(found.stretches) if found.stretches else None
    return Justification(title, paragraphs, list(_numbers(found)), nights)


def _request(found: Findings) -> str:
    request, header = found.request, found.nights.header
    uses = [
        f"{each.seen.use.instrument.name} (setting {each.seen.use.setting.name})" for each in found.exposed
    ]
    asked = f"We ask for {header['nights']}" if "nights" in header else "We looked for nights"
    verdict = (
        "" if found.feasible else " The goal is not reached with what is offered; the numbers below say why."
    )
    return (
        f"{asked} with {words.listing(uses, 'or')} on {dates_words(request)} to measure the H₃⁺ lines "
        f"[@drossart1989] of {request.target.name}. The goal is {header['goal']}.{verdict}"
    )


def _state(found: Findings) -> str:
    target, best = found.request.target, quickest(found.exposed)
    emission, cooling = emission_of(found.request), target.cooling
    kelvin = words.with_error(emission.temperature_k.value, emission.temperature_k.uncertainty, "K")
    column = words.with_error(emission.column_m2.value, emission.column_m2.uncertainty, "m-2")
    along = words.quantity(emission.column_m2.value * mean_path_factor(target.figure), "m-2", 2)
    then = target.emission.temperature_k.value
    law = ""
    if abs(then - emission.temperature_k.value) >= 1.0:
        law = f" (the {words.quantity(then, 'K')} of {words.day(cooling.epoch)}, cooled to these nights)"
    factor = words.number(float(np.exp(best.brightness.random)))
    return (
        f"The ionosphere is taken at {kelvin} with a vertical column of {column}, mean over the shell{law}; "
        f"{along} along the line of sight, mean over the visible disk. The two uncertainties together "
        f"leave the light of these lines uncertain by a factor of {factor} (1σ). Poles, "
        "meridians and radii are those of the IAU working group [@archinal2018]."
    )


def _sensitivity(each: Exposed) -> str:
    seen, header = each.seen, each.result.header
    instrument, track = seen.use.instrument, seen.track
    rate = float(track.range_rate_m_s[0]) / 1e3
    motion = "receding" if rate >= 0 else "approaching"
    where = conditions_words(seen.use, seen.air)
    if not isinstance(instrument.place, Orbit):
        where = f"airmass {words.number(float(track.airmass[0]), 3)} [@young1994], {where}"
    parts = [
        f"With {instrument.name}, {seen.use.setting.name}, at the median observable moment "
        f"({words.moment(seen.when)}; {where}; the planet {motion} at {words.number(abs(rate), 3)} km/s) "
        f"integrations last {words.quantity(float(header['integration'].value), 's')} and "
        f"{words.percent(float(header['on_source_fraction'].value))} of the clock is open shutter on the "
        "target."
    ]
    for index, need in enumerate(each.needs):
        text = need.text
        if np.isfinite(need.clock_s):
            text += ", all overheads included"
            random = span(each.brightness.random_s[index])
            text += f" ({random} for a planet 1σ brighter or fainter)" if random else ""
        parts.append(f"{text}.")
    parts.append(_precision(each))
    share = seen.detail.variance_share
    strongest = int(np.argmax(share))
    parts.append(
        f"Of the noise {words.percent(float(share[strongest]))} comes from the source "
        f"“{NOISE_SOURCES[strongest]}”. Errors are those of the Fisher matrix with continuum and wavelength "
        "zero marginalised [@tegmark1997], read noise that of multiple reads [@garnett1993]."
    )
    return " ".join(parts)


def _precision(each: Exposed) -> str:
    seen = each.seen
    open_s = told_after_s(each.needs)
    matrix, fixed = seen.visit.yields(open_s), seen.systematic(open_s)
    occasion = (
        "Then" if any(np.isfinite(need.open_s) for need in each.needs) else "After one hour of open shutter"
    )
    kelvin, relative = float(temperature_error(matrix)), 100.0 * float(column_error(matrix))
    if not np.isfinite(kelvin):
        random = 100.0 / float(seen.visit.snr(open_s))
        return (
            f"{occasion} the column at a given temperature is known to ± {words.quantity(random, '%', 2)} "
            f"(random) ± {words.quantity(100.0 * fixed.fixed_total, '%', 2)} (systematic); these lines give "
            "no temperature."
        )
    return (
        f"{occasion} the temperature is known to ± {words.quantity(kelvin, 'K', 2)} (random) "
        f"± {words.quantity(fixed.temperature_total_k, 'K', 2)} (systematic) and the column to "
        f"± {words.quantity(relative, '%', 2)} (random) "
        f"± {words.quantity(100.0 * fixed.column_total, '%', 2)} (systematic); the latter come from flux "
        "calibration, Einstein coefficients, the air and the floors; a longer exposure lowers them little."
    )


def _rotation(found: Findings) -> Iterator[str]:
    if found.cover is not None:
        said = [sentence for sentence in found.cover.sentences if "`" not in sentence]  # no commands
        yield " ".join(said)


def _nights(found: Findings) -> str:
    text = " ".join(found.nights.sentences)
    if text.startswith("Request "):
        text = f"We request {text.removeprefix('Request ')}"
    if found.plan is not None and "no clouds" not in climate_words(found.request, found.plan.offers):
        text += " Weather is a two-state chain [@gabriel1962] with the share of clear nights of the site."
    return text


def _outlook(found: Findings) -> Iterator[str]:
    if found.fade is not None:
        yield " ".join(found.fade.sentences[:-1])


def _numbers(found: Findings) -> Iterator[tuple[str, Entry]]:
    several = len(found.exposed) > 1
    for each in found.exposed:
        use = each.seen.use
        tail = f" ({use.instrument.name}, {use.setting.name})" if several else ""
        for index, need in enumerate(each.needs):
            yield f"{words.sentence_case(need.name)}{tail}", time_entry(each, index)
        for name, entry in measured(each).items():
            yield f"{words.sentence_case(entry.label or name)}{tail}", entry
    for name, entry in request_entries(found).items():
        yield words.sentence_case(entry.label or name), entry
    if "weather" in found.nights.header:
        yield "Weather", found.nights.header["weather"]
