"""`compare`: which instrument does it best?"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, replace

import numpy as np

from coldglow.answers.common.inputs import NamePath, as_request
from coldglow.answers.common.jobs import progress
from coldglow.answers.common.moment import Look, look
from coldglow.answers.common.offers import offers
from coldglow.answers.common.scenes import conditions_words, dates_words, median_moment, unseen_words
from coldglow.answers.common.visit import Need, needs
from coldglow.answers.nights import nights_of
from coldglow.describe.load import load_instrument_for, names
from coldglow.describe.records import Instrument, Request, Use
from coldglow.detect.exposure import NOISE_SOURCES
from coldglow.errors import DateError, DescriptionError, NotFoundError, RangeError, SaturationError
from coldglow.plan.compare import ranking
from coldglow.plan.goal import snr, temperature_error
from coldglow.report import words
from coldglow.report.results import Entry, Result, column, table
from coldglow.scenario import scenario, watch
from coldglow.sky.track import Track

SPOKEN = 3  # rows whose answer is also said in words


@dataclass(frozen=True, slots=True)
class Verdict:
    """What one setting of one instrument makes of the request; inf where a goal is never reached.

    `time_to_goal_s` on the clock at the median observable step, all goals; the SNR and the random error of
    the temperature are those of its best night.
    """

    instrument: str
    setting: str
    time_to_goal_s: float
    nights_needed: float
    asked: str  # what is to be requested, in words
    snr_one_night: float
    temperature_error_k: float
    systematic_temperature_k: float
    limited_by: str
    feasible: bool
    reason: str  # why not
    conditions: str


def compare(
    request: NamePath | Request,
    instruments: Sequence[NamePath | Instrument] | None = None,
    executor: Executor | None = None,
) -> Result:
    """Return the request's answer for a list of instruments in all their settings, best first.

    Args:
        request: path or record; its own limits are laid over those of every instrument on the ground. Its
            coverage is left out: the goals on the whole disk are compared.
        instruments: names, paths or records; default: all that ship, and those of the request.
        executor: any executor of `concurrent.futures` (a dask client's too), to which the instruments are
            handed; the answer is the same as without.

    Returns:
        A result with table ``compare``, one row a setting. An instrument that cannot do it is a row with
        its reason.

    Raises:
        NotFoundError: an instrument of no such name.
        DateError: the dates lie outside the ephemeris.

    >>> result = compare("examples/uranus-season.yaml", ["echelle-8m"])
    >>> result["setting"].tolist()
    ['q-branch', 'r-branch', 'overtone']

    """
    record = as_request(request)
    chosen = rivals(record, instruments)
    whole = on_the_disk(record)
    if executor is None:
        answers: Iterator[tuple[Verdict, ...]] = (judge(whole, uses) for uses in chosen)
    else:
        futures = [executor.submit(judge, whole, uses) for uses in chosen]
        answers = (future.result() for future in futures)
    told = progress(answers, len(chosen), "instruments")
    return compare_of(record, [verdict for verdicts in told for verdict in verdicts])


def on_the_disk(request: Request) -> Request:
    """Return the request without its coverage: instruments are compared for the goals on the whole disk."""
    return replace(request, coverage=replace(request.coverage, asked=False))


def rivals(
    request: Request, instruments: Sequence[NamePath | Instrument] | None = None
) -> list[tuple[Use, ...]]:
    """Return every setting of every instrument, grouped by instrument.

    An instrument that the request names keeps the request's description and cost. Of the files that lie
    about, unasked for, those with mistakes are left out.
    """
    own = {use.instrument.name: use for use in reversed(request.uses)}
    asked_for = instruments is not None
    if instruments is None:
        shipped = names("instrument")
        instruments = [*shipped, *(name for name in own if name not in shipped)]
    found: dict[str, tuple[Use, ...]] = {}
    for each in instruments:
        if isinstance(each, Instrument):
            instrument = each
        elif str(each) in own:
            instrument = own[str(each)].instrument
        else:
            try:
                instrument = load_instrument_for(request, each)
            except DescriptionError:
                if asked_for:
                    raise
                continue
        cost = own[instrument.name].cost_per_night if instrument.name in own else 1.0
        found[instrument.name] = tuple(Use(instrument, setting, cost) for setting in instrument.settings)
    return list(found.values())


def judge(request: Request, uses: Sequence[Use]) -> tuple[Verdict, ...]:
    """Return the verdict on every use; all of the same instrument, so that one track serves them."""
    try:
        track = watch(request, uses[0])
    except DateError:
        raise
    except (RangeError, NotFoundError) as error:
        return tuple(_refusal(use, error) for use in uses)
    found = []
    for use in uses:
        alone = replace(request, uses=(use,))
        try:
            found.append(_judge_one(alone, use, track))
        except (RangeError, NotFoundError) as error:
            found.append(_refusal(use, error))
    return tuple(found)


def _judge_one(request: Request, use: Use, track: Track) -> Verdict:
    scene = scenario(request, use, track)
    if not scene.usable.any():
        return _no(use, "visibility", unseen_words(scene))
    seen = look(request, use, scene.track.take([median_moment(scene)]))
    wanted = needs(request.goal, seen.visit, seen.systematic)
    planned = nights_of(request, (scene,))
    given = offers(request, (scene,), "night")
    best = int(np.argmax(given.information))
    common = use.instrument.operation.common_floor
    open_s = max(need.open_s for need in wanted)
    reached = bool(np.isfinite(open_s))
    fixed_k = seen.systematic(float(given.shutter_s[best])).temperature_total_k
    nights = float(planned.header["nights"].value) if reached and "nights" in planned.header else np.inf
    feasible = reached and planned.feasible
    return Verdict(
        use.instrument.name,
        use.setting.name,
        max(need.clock_s for need in wanted),
        nights,
        str(planned.header.get("nights", "")),
        float(snr(given.information[best], common_floor=common)),
        float(temperature_error(given.matrix[best])) if np.isfinite(fixed_k) else np.inf,
        fixed_k,
        _noisiest(seen) if reached else "floors",
        feasible,
        "" if feasible else _why_not(wanted, planned),
        conditions_words(use, scene.air),
    )


def _noisiest(seen: Look) -> str:
    """Return the strongest source of noise, in one word."""
    return NOISE_SOURCES[int(np.argmax(seen.detail.variance_share))].removeprefix("planet ")


def _why_not(wanted: tuple[Need, ...], planned: Result) -> str:
    never = [need.text for need in wanted if not np.isfinite(need.open_s)]
    if never:
        return f"{never[0]}."
    if "nights" in planned.header:
        return f"{planned.header['nights']} to request, more than the budget allows."
    return planned.sentences[0]


def _refusal(use: Use, error: Exception) -> Verdict:
    if isinstance(error, SaturationError):
        limit = "saturation"
    elif isinstance(error, NotFoundError):
        limit = "no such line"
    else:
        key = getattr(error, "key", "")
        limit = {"operation": "nod", "site": "height", "settings": "setting"}.get(
            key.split(".")[0], "refused"
        )
    return _no(use, limit, str(error))


def _no(use: Use, limit: str, reason: str) -> Verdict:
    never = np.inf
    return Verdict(
        use.instrument.name,
        use.setting.name,
        never,
        never,
        "",
        0.0,
        never,
        never,
        limit,
        False,
        reason,
        "",
    )


def compare_of(request: Request, verdicts: Sequence[Verdict]) -> Result:
    """Return `compare` for verdicts that are at hand."""

    def all_of(name: str) -> np.ndarray:
        return np.array([getattr(verdict, name) for verdict in verdicts])

    feasible = all_of("feasible")
    order = ranking(~feasible, all_of("nights_needed"), all_of("time_to_goal_s"), -all_of("snr_one_night"))
    best = [verdicts[i] for i in order]
    rows = {name: all_of(name)[order] for name in Verdict.__slots__}
    return Result(
        "compare",
        {
            "compare": table(
                column("instrument", rows["instrument"]),
                column("setting", rows["setting"]),
                column("time_to_goal", rows["time_to_goal_s"] / 3600.0, "h", digits=3, infinite="never"),
                column("nights_needed", rows["nights_needed"], digits=3, infinite="none"),
                column("snr_one_night", rows["snr_one_night"], digits=3),
                column("temperature_error", rows["temperature_error_k"], "K", digits=2, infinite="none"),
                column("systematic_error", rows["systematic_temperature_k"], "K", digits=2, infinite="none"),
                column("limited_by", rows["limited_by"]),
                column("feasible", rows["feasible"]),
                column("reason", rows["reason"], shown=False),
                column("conditions", rows["conditions"], shown=False),
                caption=(
                    "Best first. Clock time of one visit at the median observable step; nights to request "
                    "with their weather; SNR and errors of T (random, systematic) of the best night"
                ),
            )
        },
        {
            "request": Entry(request.name),
            "target": Entry(request.target.name),
            "nights": Entry(
                f"{request.dates.first} to {request.dates.last}",
                text=dates_words(request),
            ),
            "feasible": Entry(int(feasible.sum()), text=f"{int(feasible.sum())} of {len(verdicts)} settings"),
        },
        list(_sentences(request, best)),
        feasible=bool(feasible.any()),
    )


def _sentences(request: Request, best: list[Verdict]) -> Iterator[str]:
    good = [verdict for verdict in best if verdict.feasible]
    if not good:
        yield "None of these settings does it." if len(best) > 1 else f"{_name(best[0])} does not do it."
    for place, verdict in enumerate(good[:SPOKEN]):
        first = "Next is" if place else "Best is"
        needed = f"{words.duration(verdict.time_to_goal_s)} on the clock, {verdict.asked} to request"
        wanted_k = request.goal.temperature_error_k or np.inf
        beyond = (
            f", and its systematic error of ± {words.number(verdict.systematic_temperature_k, 2)} K is "
            "larger than what is wanted"
            if verdict.systematic_temperature_k > wanted_k
            else ""
        )
        yield f"{first} {_name(verdict)}: {needed}; limited by {verdict.limited_by}{beyond}."
    if request.coverage.asked:
        yield "These are the goals on the whole disk; `cover` answers how to cover the rotation."
    bad = [verdict for verdict in best if not verdict.feasible]
    bounded = [verdict for verdict in bad if np.isfinite(verdict.time_to_goal_s)]
    costly = [f"{_name(verdict)} with {verdict.asked}" for verdict in bounded if verdict.asked]
    if costly:
        yield f"More than the budget allows: {words.listing(costly)}."
    deep = [_name(verdict) for verdict in bounded if not verdict.asked]
    if deep:
        yield (
            f"Not with all the nights on offer, or not with the wanted probability: {words.listing(deep)}."
        )
    yield from _refusals([verdict for verdict in bad if not np.isfinite(verdict.time_to_goal_s)])


def _name(verdict: Verdict) -> str:
    return f"{verdict.instrument} ({verdict.setting})"


def _refusals(verdicts: list[Verdict]) -> Iterator[str]:
    """Yield one sentence for each instrument and kind of refusal, with the words for the first setting."""
    kinds = dict.fromkeys((verdict.instrument, verdict.limited_by) for verdict in verdicts)
    for kind in kinds:
        same = [each for each in verdicts if (each.instrument, each.limited_by) == kind]
        settings = ", ".join(each.setting for each in same)
        yield f"Not {kind[0]} ({settings}): {same[0].reason}"
