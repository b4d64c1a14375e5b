"""`cover`: which hours together cover a full rotation?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.common.offers import PARTS, Offers
from coldglow.answers.common.scenes import Also, scenes, unseen_words
from coldglow.answers.covering.choice import Choice, choose
from coldglow.answers.covering.coverage import longitudes_seen
from coldglow.answers.covering.lightcurve import light_curve_table
from coldglow.answers.covering.words import header_of, sentences_of, within_budget
from coldglow.describe.records import Request
from coldglow.plan.demand import TemperatureError
from coldglow.plan.goal import temperature_error, with_floor
from coldglow.plan.reach import total_of
from coldglow.report.results import Entry, Result, Table, column, table
from coldglow.scenario import Scenario
from coldglow.sky.clock import iso_from_tt

Array = NDArray[np.float64]
NIGHTS_PRINTED = 24
SEEN_POINTS = 30  # longitudes looked at in each bin


def cover(request: NamePath | Request, also: Also = None) -> Result:
    """Return the smallest choice of nights, halves or stretches that covers a rotation.

    Args:
        request: path or record.
        also: a further constraint, as in `hours`.

    Returns:
        A result with tables ``bins`` (``longitude``, ``snr``, ``visits``, ``reachable``, share of the goal),
        ``nights`` (what was chosen) and, for a target with spots, ``light_curve``; header ``cost``,
        ``proven``, ``gap``, ``solver_time``, the longitude system and its phase uncertainty.

    >>> result = cover("examples/uranus-season.yaml")
    >>> bool(result.header["proven"].value), len(result["longitude"])
    (True, 12)

    """
    record = as_request(request)
    with place_errors(*described(record)):
        found = scenes(record, also=also)
        choice = choose(record, found)
        result = cover_of(record, found, choice)
    if choice is None or choice.stare:
        return result
    spent = {"solver_time": Entry(choice.cover.seconds, "s", digits=2)}
    return replace(result, header={**result.header, **spent})


def cover_of(request: Request, found: tuple[Scenario, ...], choice: Choice | None) -> Result:
    """Return `cover` for a choice that is at hand; the same choice gives the same result to the byte."""
    warnings = sorted({warning for scene in found for warning in scene.warnings})
    if choice is None:
        empty = table(
            column("longitude", [], "deg"), column("snr", []), column("visits", []), column("reachable", [])
        )
        return Result(
            "cover",
            {"bins": empty, "nights": table(column("night", []))},
            {"request": Entry(request.name)},
            [unseen_words(scene) for scene in found],
            warnings,
            feasible=False,
        )
    tables = {"bins": bins_table(choice), "nights": nights_table(choice)}
    if request.target.emission.spots:
        shining = next(scene for scene in found if scene.usable.any())
        tables["light_curve"] = light_curve_table(request, shining)
    for text in request.dates.fixed:
        if not (choice.question.offers.date == text[:10]).any():
            warnings.append(
                f"the fixed night {text} has no time in which {request.target.name} can be observed"
            )
    return Result(
        "cover",
        tables,
        header_of(choice),
        sentences_of(choice),
        warnings,
        feasible=bool(choice.cover.covered.all()) and within_budget(choice),
    )


def bins_table(choice: Choice) -> Table:
    """Return what each bin gathers, how often it is visited, and whether it can be reached at all."""
    question, answer = choice.question, choice.cover
    request, chosen = question.request, choice.cover.chosen
    coverage = request.coverage
    step_s = request.dates.step_s
    common = max(scene.use.instrument.operation.common_floor for scene in question.offers.scenes)
    information = with_floor(question.information[chosen].sum(axis=0), common)
    seen = longitudes_seen(question.offers, chosen, SEEN_POINTS * question.bins)
    seen = seen.reshape(question.bins, SEEN_POINTS).mean(axis=1)
    edges = np.arange(question.bins + 1) * 360.0 / question.bins
    if coverage.spot:
        place = {spot.name: spot.longitude_rad for spot in request.target.emission.spots}[coverage.spot]
        edges = np.degrees([place, place])
    columns = [
        column("longitude", edges[:-1], "deg", decimals=1, description="where the bin begins"),
        column("longitude_end", edges[1:], "deg", decimals=1),
        column("snr", np.sqrt(information), digits=3),
    ]
    if isinstance(question.demand, TemperatureError):
        error = temperature_error(total_of(question.gain[chosen], np.ones(chosen.size)))
        columns.append(column("temperature_error", error, "K", digits=3, infinite="none"))
    columns += [
        column("clock_time", question.clock_s[chosen].sum(axis=0) / 3600.0, "h", decimals=2),
        column("seen", seen, decimals=2, description="share of its longitudes that were central"),
        column("visits", (question.clock_s[chosen] >= step_s).sum(axis=0)),
        column("share_of_goal", answer.share, decimals=2, description="of information or time; 1 = reached"),
        column("reachable", answer.reachable),
        column("largest_share", answer.most, digits=3, description="with all that is offered"),
    ]
    if coverage.spot or coverage.latitude_rad is not None:
        columns = [each for each in columns if each.name != "seen"]
    caption = f"Goal: {question.goal}" if coverage.spot else f"Goal in each bin: {question.goal}"
    return table(*columns, caption=caption, rows=range(question.bins))


def nights_table(choice: Choice) -> Table:
    """Return what was chosen, one row each, in order of time."""
    question, chosen = choice.question, choice.cover.chosen
    spot = question.request.coverage.spot
    if spot:
        return chosen_table(question.offers, chosen, question.information[:, 0], f"the spot “{spot}”")
    return chosen_table(question.offers, chosen, question.offers.information)


def chosen_table(
    given: Offers, chosen: NDArray[np.int64], information: Array, of_what: str = "the whole disk"
) -> Table:
    """Return offers as rows: date, part, times, longitudes passed while exposing, instrument, SNR, cost.

    `information` ndarray[offer] is on ln N of what `of_what` names.
    """
    several = len(given.scenes) > 1
    scenes = [given.scenes[k] for k in given.scene[chosen]]
    period_s = np.array([scene.track.system.period_s for scene in scenes])
    lost_s = np.array([scene.overhead_s for scene in scenes])
    start_s, end_s = given.start_tt_s[chosen], given.end_tt_s[chosen]
    turn = 360.0 * np.maximum(end_s - start_s - lost_s, 0.0) / period_s if chosen.size else np.zeros(0)
    end = np.array([_longitude_deg(given, int(i)) for i in chosen])
    unit = given.cost_unit
    columns = [
        column("night", given.date[chosen], description="evening date"),
        column("part", [PARTS[part] for part in given.part[chosen]]),
        column("start", iso_from_tt(start_s, "m"), description="UTC"),
        column("end", iso_from_tt(end_s, "m"), description="UTC"),
        column(
            "longitude_start",
            np.mod(end - turn, 360.0),
            "deg",
            decimals=1,
            description="at the first integration, after acquisition",
        ),
        column("longitude_end", end, "deg", decimals=1),
        column("turn", turn, "deg", decimals=0, description="longitude passed while exposing"),
        column("snr", np.sqrt(information[chosen]), digits=3, description=f"of {of_what}"),
        column("instrument", [scene.use.instrument.name for scene in scenes], shown=several),
        column("setting", [scene.use.setting.name for scene in scenes], shown=several),
        column("cost", given.cost[chosen], "h" if unit == "h" else "", digits=3),
    ]
    return table(
        *columns, caption="What was chosen, in order of time", rows=range(min(chosen.size, NIGHTS_PRINTED))
    )


def _longitude_deg(given: Offers, i: int) -> float:
    """Return the sub-observer longitude at the end of an offer."""
    visits = given.visits[given.scene[i]]
    own = np.flatnonzero(given.owner[given.scene[i]] == i)
    return float(np.degrees(visits.longitude_end_rad[own[np.argmax(visits.end_s[own])]]))
