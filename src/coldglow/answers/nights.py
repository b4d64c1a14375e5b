"""`nights`: how many nights must I request?"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.asking.requesting import Plan, planned
from coldglow.answers.asking.words import header_of, sentences_of, within_budget
from coldglow.answers.common.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.common.scenes import Also, scenes, unseen_words
from coldglow.answers.cover import chosen_table
from coldglow.answers.covering.choice import Choice, choose
from coldglow.describe.records import Request
from coldglow.plan.account import time_account
from coldglow.plan.nights import Curve
from coldglow.report.results import Entry, Result, Table, column, table
from coldglow.scenario import Scenario

Array = NDArray[np.float64]
Index = NDArray[np.int64]
BEYOND = 5  # printed rows beyond the answer
CERTAIN = 0.999


def nights(request: NamePath | Request, also: Also = None) -> Result:
    """Return the probability of success against the number of nights requested.

    Nights are requested best first; all goals of the request must be reached by the clear ones together.
    Where the request asks for coverage, they begin with the smallest cover, and go on with the nights that
    help most against the weather.

    Args:
        request: path or record.
        also: a further constraint, as in `hours`.

    Returns:
        A result with tables ``nights`` (``nights``, ``probability``, ``probability_error``),
        ``requested`` (which nights) and ``account`` (where the time goes).

    >>> result = nights("examples/jupiter-ovals.yaml")
    >>> str(result.header["nights"])
    '2 h in 2 nights'
    >>> result.table("account").columns[0].values.tolist()[-1]
    'in all'

    """
    record = as_request(request)
    with place_errors(*described(record)):
        return nights_of(record, scenes(record, also=also))


def nights_of(request: Request, found: tuple[Scenario, ...], choice: Choice | None = None) -> Result:
    """Return `nights` for scenarios, and a cover, that are at hand."""
    if request.coverage.asked and choice is None:
        choice = choose(request, found)
    return told(request, found, planned(request, found, choice), choice)


def told(request: Request, found: tuple[Scenario, ...], plan: Plan | None, choice: Choice | None) -> Result:
    """Return `nights` for a plan that is at hand."""
    if plan is None:
        empty = table(column("nights", []), column("probability", []), column("probability_error", []))
        sentences = [unseen_words(scene) for scene in found]
        return Result(
            "nights", {"nights": empty}, {"request": Entry(request.name)}, sentences, feasible=False
        )
    tables = {"nights": _chances_table(plan)}
    if plan.chosen is not None:
        tables |= {"requested": _requested_table(plan), "account": _account_table(plan)}
    complete = not request.coverage.asked or (choice is not None and bool(choice.cover.covered.all()))
    return Result(
        "nights",
        tables,
        header_of(plan),
        sentences_of(plan, choice),
        sorted({warning for scene in found for warning in scene.warnings}),
        feasible=complete and plan.chosen is not None and within_budget(plan),
    )


def _chances_table(plan: Plan) -> Table:
    given, order, chances = plan.offers, plan.order, plan.chances
    size = _rows(chances, plan.chosen)
    kept = order[:size]
    base = 0 if plan.choice is None else int(plan.choice.cover.chosen.size)
    first = max(base - 1, 0)
    return table(
        column(
            "nights",
            plan.nights[:size],
            digits=3,
            description="in space days of time" if given.in_space else "requested, in the order of asking",
        ),
        column("probability", chances.probability[:size], decimals=3),
        column("probability_error", chances.probability_error[:size], digits=2),
        column("observable_time", np.cumsum(given.observable_s[kept]) / 3600.0, "h", decimals=1),
        column("cost", chances.cost[:size], "h" if given.cost_unit == "h" else "", digits=4, shown=False),
        column("added", [given.name(int(i)) for i in kept]),
        caption="Probability that the clear ones among the nights requested reach every goal",
        rows=range(first, min(size, max((plan.chosen or 0) + BEYOND, first + 8))),
    )


def _rows(chances: Curve, chosen: int | None) -> int:
    """Return how many rows are worth showing: to near certainty, or some beyond the answer."""
    sure = chances.probability >= CERTAIN
    certain = int(np.argmax(sure)) if sure.any() else chances.units.size
    return min(max(certain + 1, (chosen or 0) + 3, 5), chances.units.size)


def _requested_table(plan: Plan) -> Table:
    """Return the nights requested in order of time, each with its purpose."""
    given, chosen = plan.offers, plan.order[: (plan.chosen or 0) + 1]
    science = set(plan.order[: plan.needed].tolist())
    chosen = chosen[np.argsort(given.start_tt_s[chosen], kind="stable")]
    rows = chosen_table(given, chosen, given.information)
    purpose = ["goal" if int(i) in science else "insurance" for i in chosen]
    columns = (*rows.columns, column("purpose", purpose, description="if every night were clear"))
    return replace(rows, columns=columns, caption="What to request, in order of time")


def _account_table(plan: Plan) -> Table:
    """Return where the hours of the request go."""
    given, chosen = plan.offers, plan.order[: (plan.chosen or 0) + 1]
    account = time_account(
        given.observable_s[chosen],
        given.shutter_s[chosen],
        given.calibration_s[chosen],
        given.cost[chosen],
        np.arange(chosen.size) < plan.needed,
    )
    seconds = np.array([account.science_s, account.overhead_s, account.calibration_s, account.weather_s])
    needed_s = max(float(seconds[:3].sum()), 1e-9)
    spent = np.append(account.nights_needed * seconds[:3] / needed_s, account.nights_weather)
    purpose = ["open shutter", "overheads (acquisition, nods, readout, standards)", "calibration"]
    purpose += ["allowance for the weather", "in all"]
    unit = "h" if given.cost_unit == "h" else "nights"
    return table(
        column("purpose", purpose),
        column("time", np.append(seconds, account.total_s) / 3600.0, "h", decimals=1),
        column("share", np.append(seconds, account.total_s) / account.total_s, decimals=2),
        column("cost", np.append(spent, account.nights_total), digits=3, description=f"in {unit}"),
        caption="Time account of the request (time in which the target can be observed)",
        rows=range(5),
    )
