"""The choice of a cover: what was asked, what was chosen, and how it was found."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coldglow.answers.common.offers import join_offers, offers
from coldglow.answers.covering.coverage import Question, question_of
from coldglow.answers.covering.stare import stare_of
from coldglow.describe.records import Orbit, Request
from coldglow.plan.cover import REACHED, Cover, cover
from coldglow.plan.reach import total_of
from coldglow.scenario import Scenario


@dataclass(frozen=True, slots=True)
class Choice:
    """A question and its answer; `stare` where it is one stare from space."""

    question: Question
    cover: Cover
    stare: bool


def choose(request: Request, found: tuple[Scenario, ...]) -> Choice | None:
    """Return the smallest choice that covers; None where nothing can be observed.

    Nights and half-nights come as `coverage.candidates` says; of equally good choices the brightest nights
    are taken, those of the most information on the whole disk. A single use in space becomes one stare.
    """
    if is_space(request):
        return _stare(request, found[0])
    coverage = request.coverage
    given = offers(request, found, coverage.candidates, wholes=True)
    if not given.size:
        return None
    question = question_of(request, given)
    worth = np.round(given.information / max(float(given.information.max()), 1e-300), 6)
    answer = cover(
        given.candidates(), question.gain, question.demand, question.rules, coverage.time_limit_s, worth
    )
    return Choice(question, answer, False)


def is_space(request: Request) -> bool:
    """Return whether the request has a single use, in space: then one stare covers the rotation."""
    return len(request.uses) == 1 and isinstance(request.uses[0].instrument.place, Orbit)


def _stare(request: Request, scene: Scenario) -> Choice | None:
    pieces, count = stare_of(request, scene)
    if not count:
        return None
    given = join_offers(request, (scene,), [pieces])
    question = question_of(request, given)
    chosen = np.arange(count)
    everything = question.demand.share(total_of(question.gain, np.ones(given.size)))
    share = question.demand.share(total_of(question.gain[chosen], np.ones(count)))
    cost = float(given.cost[chosen].sum())
    covered = share >= REACHED
    full = bool(covered.all())
    return Choice(
        question,
        Cover(
            kind="full" if full else "most",
            chosen=chosen,
            cost=cost,
            cost_bound=cost if full else np.inf,
            gap=0.0,
            proven=True,
            share=share,
            covered=covered,
            reachable=everything >= REACHED,
            most=everything,
            seconds=0.0,
        ),
        True,
    )
