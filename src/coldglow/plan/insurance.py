"""Which set of nights has the best chance, and which nights to add as insurance against weather."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import combinations
from math import comb
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from coldglow.plan.demand import Demand
from coldglow.plan.multicover import Candidates, Rules, allowed, obeys
from coldglow.plan.nights import REACHED, Weather, drawn, success, yields_of

Array: TypeAlias = NDArray[np.float64]
Index: TypeAlias = NDArray[np.int64]

BRUTE_SETS = 3000  # up to so many sets all are compared, beyond that the heuristic
TRIED = 8  # candidates per bin, those of the largest gain per cost, that are tried as an addition
SCORE_TRIALS = 1000  # histories in which sets are compared; the chosen one is judged in fresh ones
CHOOSING, JUDGING = 1, 2  # streams of random numbers


@dataclass(frozen=True, slots=True)
class RobustSet:
    """A requested set; `added` are the candidates beyond the base, in the order in which they help most."""

    chosen: Index  # in order of time
    added: Index
    cost: float
    probability: float
    probability_error: float
    method: str  # "all sets compared" or "greedy with exchanges"


class _Histories:
    """Common weather for all sets that are compared, so that their difference is not noise."""

    def __init__(
        self,
        candidates: Candidates,
        gain: Array,
        demand: Demand,
        rules: Rules,
        weather: Weather,
        day: Array,
        factors: Array | None,
    ) -> None:
        few = Weather(
            weather.clear_fraction, weather.correlation, min(weather.trials, SCORE_TRIALS), weather.seed
        )
        self.candidates, self.gain, self.demand, self.rules = candidates, gain, demand, rules
        weight, self.chance, _ = drawn(day, few, CHOOSING, factors)
        self.weight = yields_of(weight, demand)
        worth = np.minimum(demand.rows(gain, gain.sum(axis=0)).T, 1.0)
        self.worth = worth / np.maximum(candidates.cost, 1e-9)[:, None]

    def total(self, chosen: Index) -> Array:
        return np.tensordot(self.weight[:, chosen], self.gain[chosen], axes=1)

    def score(self, total: Array) -> float:
        """Probability of success, plus a little for what leads there: the worst and the mean covered share.

        By probability alone a night that helps only together with another one would never be added; the
        weight of the worst bin was chosen by trial on a season (probability at equal cost).
        """
        share = np.minimum(self.demand.share(total), 1.0)
        promise = 0.3 * share.min(axis=1) + 0.01 * share.mean(axis=1)
        return float(self.chance @ (np.all(share >= REACHED, axis=1) + promise))

    def probability(self, total: Array) -> float:
        """Probability of success."""
        return float(self.chance @ np.all(self.demand.share(total) >= REACHED, axis=1))

    def fits(self, chosen: Index) -> bool:
        mask = np.zeros(self.gain.shape[0])
        mask[chosen] = 1.0
        return obeys(self.candidates, self.rules, mask)

    def best_addition(self, chosen: Index, pool: Index) -> tuple[int, float] | None:
        """Candidate of the pool that raises the score most per cost, and the score with it.

        Only those are tried that bring some bin most per cost.
        """
        total = self.total(chosen)
        before, best = self.score(total), None
        worth = self.worth[pool]
        tried = np.unique(np.argsort(-worth, axis=0, kind="stable")[:TRIED].ravel())
        for each in pool[tried[worth[tried].any(axis=1)]]:
            after = self.score(total + np.multiply.outer(self.weight[:, each], self.gain[each]))
            rise = (after - before) / max(float(self.candidates.cost[each]), 1e-9)
            better = rise > 1e-12 and (best is None or rise > best[2] * (1.0 + 1e-9))
            if better and self.fits(np.append(chosen, each)):
                best = int(each), after, rise
        return None if best is None else best[:2]


def robust_set(
    candidates: Candidates,
    gain: Array,
    demand: Demand,
    rules: Rules,
    weather: Weather,
    base: Index | None = None,
    day: Array | None = None,
    factors: Array | None = None,
    enough: float = np.inf,
) -> RobustSet:
    """Set within the rules (a limit on cost among them) with the highest probability of reaching all goals.

    Where the sets are few all are compared. Otherwise candidates are added to the base (the proven cover)
    one at a time, the largest rise per cost first, and then each one added is exchanged for any other that
    does better, until no exchange does: a heuristic that may miss the best set, and that adds nothing where
    nights come in blocks only. What the rules fix is taken first. Sets are compared in
    common histories; the probability returned comes from fresh ones, because the winner of a comparison
    looks too good in the histories that chose it.

    Args:
        candidates: what can be asked for.
        gain: ndarray[candidate, bin] or ndarray[candidate, bin, 2, 2].
        demand: goal per bin.
        rules: limits; `cost_max` must be finite.
        weather: chain, trials and seed.
        base: candidates that are in the set anyway.
        day: ndarray[candidate], of the weather, from `chain_day`; default: the candidates' nights.
        factors: ndarray[trial, candidate] from `scatter_factors`; the first half serves to choose, the
            second to judge.
        enough: probability, in the histories that choose, at which no more candidates are added (and none
            exchanged): a quick look at how much is needed.

    """
    if not np.isfinite(rules.cost_max):
        raise ValueError("a robust set needs a limit on its cost")
    kept = np.zeros(0, dtype=np.int64) if base is None else np.asarray(base, dtype=np.int64)
    day = candidates.night.astype(float) if day is None else day
    some, others = (None, None) if factors is None else np.array_split(factors, 2)
    histories = _Histories(
        candidates, gain, demand, rules, weather, day, None if some is None else some[:SCORE_TRIALS]
    )
    free = np.setdiff1d(np.flatnonzero(allowed(candidates, rules)), kept)
    order = np.argsort(candidates.start_s[free], kind="stable")
    free = free[order]
    left = rules.cost_max - candidates.cost[kept].sum()
    largest = min(
        int(np.searchsorted(np.cumsum(np.sort(candidates.cost[free])), left + 1e-9, "right")), free.size
    )
    if sum(comb(free.size, size) for size in range(largest + 1)) <= BRUTE_SETS:
        added, method = _all_sets(histories, kept, free, largest), "all sets compared"
    else:
        added, method = _grow(histories, kept, free, enough), "greedy with exchanges"
    added = _by_help(histories, kept, added)
    chosen = np.append(kept, added)
    chosen = chosen[np.lexsort((candidates.place[chosen], candidates.start_s[chosen]))]
    probability, error = 0.0, 0.0
    if chosen.size:
        scatter = None if others is None else others[:, chosen]
        probability, error = success(gain[chosen], demand, day[chosen], weather, JUDGING, scatter)
    return RobustSet(chosen, added, float(candidates.cost[chosen].sum()), probability, error, method)


def _all_sets(histories: _Histories, kept: Index, free: Index, largest: int) -> Index:
    best, best_score = np.zeros(0, dtype=np.int64), -1.0
    for size in range(largest + 1):
        for some in combinations(free.tolist(), size):
            added = np.array(some, dtype=np.int64)
            chosen = np.append(kept, added)
            if histories.fits(chosen):
                total = histories.total(chosen)
                score = histories.probability(total) + 1e-9 * histories.score(total)  # between equals
                if score > best_score + 1e-15:
                    best, best_score = added, score
    return best


def _by_help(histories: _Histories, kept: Index, added: Index) -> Index:
    """Put what was added in the order in which it helps most."""
    ordered = kept[:0]
    while (rest := np.setdiff1d(added, ordered)).size:
        found = histories.best_addition(np.append(kept, ordered), rest)
        ordered = np.append(ordered, rest if found is None else found[0])
    return ordered


def _grow(histories: _Histories, kept: Index, free: Index, enough: float) -> Index:
    """Add the fixed, then what helps most; then exchange what was added freely while that helps."""
    rules, night = histories.rules, histories.candidates.night
    must = [np.flatnonzero(night == each) for each in rules.fixed_nights]
    must += [np.array(some) for some in rules.fixed_sets]
    histories.rules = replace(rules, fixed_nights=(), fixed_sets=())  # hold from the first step on
    added = np.zeros(0, dtype=np.int64)
    for here in must:
        if not np.isin(here, np.append(kept, added)).any():
            found = histories.best_addition(np.append(kept, added), np.intersect1d(here, free))
            added = added if found is None else np.append(added, found[0])
    fixed = added.size
    while histories.probability(histories.total(np.append(kept, added))) < enough:
        found = histories.best_addition(np.append(kept, added), np.setdiff1d(free, added))
        if found is None:
            break
        added = np.append(added, found[0])
    improved = not np.isfinite(enough)
    while improved:
        improved = False
        for i in range(fixed, added.size):
            rest = np.delete(added, i)
            now = histories.score(histories.total(np.append(kept, added)))
            found = histories.best_addition(np.append(kept, rest), np.setdiff1d(free, added))
            if found is not None and found[1] > now + 1e-9:
                added, improved = np.insert(rest, i, found[0]), True
    return added
