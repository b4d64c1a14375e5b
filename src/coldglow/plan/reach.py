"""What all candidates together could gather in each bin, and a quick choice without proof."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from coldglow.plan.demand import Amount, Demand
from coldglow.plan.multicover import Candidates, Model, Row, Rules, allowed, overlaps

Array: TypeAlias = NDArray[np.float64]

SETTLED = 1e-9  # relative: a further row would lower the largest share by less
ROUNDS = 50  # rows per bin for a temperature error; 3 to 6 are used


def total_of(gain: Array, chosen: Array) -> Array:
    """Sum of the gains of the chosen: ndarray[bin] or ndarray[bin, 2, 2]."""
    return np.asarray(np.tensordot(np.asarray(chosen, dtype=float), gain, axes=1))


def reachable_share(candidates: Candidates, gain: Array, demand: Demand, rules: Rules) -> Array:
    """Largest share of each bin's goal, ndarray[bin], outside forbidden nights, whatever it costs.

    Without overlapping candidates that is the share of all of them. Otherwise it is the maximum of a
    linear programme per bin; for a temperature error an upper bound of it to 1e-9.
    """
    usable = allowed(candidates, rules).astype(float)
    everything = demand.share(total_of(gain, usable))
    if not overlaps(candidates):
        return everything
    bins, size = gain.shape[1], candidates.night.size
    model = Model(candidates, Rules(forbidden_nights=rules.forbidden_nights), bins)
    most = np.zeros(bins)
    for b in range(bins):
        rows: list[Row] = []
        total, most[b] = total_of(gain, usable), everything[b]
        here = np.arange(bins) == b
        for _ in range(1 if isinstance(demand, Amount) else ROUNDS):
            if most[b] <= 0.0 or not np.isfinite(most[b]):
                break
            weight = demand.rows(gain, total)[b] / most[b]  # scaled, so that the solver's tolerance fits
            columns = np.flatnonzero(weight > 0.0)
            row = np.append(weight[columns], -1.0)
            rows.append((np.append(columns, size + b), row, 0.0, np.inf))
            bounds = np.zeros(bins), here.astype(float)
            answer = model.solve(np.zeros(size), rows, bounds, -1.0 * here, 60.0, integral=False)
            if answer.chosen is None:
                break
            total = total_of(gain, answer.chosen)
            ceiling, got = -answer.bound * most[b], demand.share(total)[b]
            rows = [(row[0], np.append(row[1][:-1] * most[b] / ceiling, -1.0), 0.0, np.inf) for row in rows]
            most[b] = ceiling
            if ceiling - got <= SETTLED * ceiling:
                break
    return most


def greedy(
    candidates: Candidates, gain: Array, demand: Demand, rules: Rules, wanted: NDArray[np.bool_]
) -> Array | None:
    """Take the candidate of the largest rise in covered share per cost until all wanted bins are full.

    Then drop what turned out not to be needed, dearest first. Knows no runs and numbers of nights and
    proves nothing: None where it ends without a full cover that the rules allow.

    Source: greedy multi-cover, Dobson 1982, Math. Oper. Res. 7, 515.
    """
    if rules.consecutive or rules.block_nights > 1 or np.isfinite(rules.nights_max):
        return None
    free = allowed(candidates, rules)
    conflicts = overlaps(candidates)
    chosen = np.zeros(free.size)
    total = np.zeros_like(gain[0])
    price = np.maximum(candidates.cost, 1e-9)
    must = [np.flatnonzero(candidates.night == night) for night in rules.fixed_nights]
    must += [np.array(some) for some in rules.fixed_sets]
    while True:
        open_nights = [here for here in must if not chosen[here].any()]
        covered = np.minimum(demand.share(total), 1.0)[wanted]
        if np.all(covered >= 1.0 - 1e-9) and not open_nights:
            break
        after = np.minimum(demand.share(total + gain), 1.0)[:, wanted].sum(axis=1) - covered.sum()
        pool = free & np.isin(np.arange(free.size), open_nights[0]) if open_nights else free & (after > 0.0)
        if not pool.any():
            return None
        best = int(np.argmax(np.where(pool, after / price, -1.0)))
        chosen[best], free[best] = 1.0, False
        total = total + gain[best]
        for together in conflicts:
            if best in together:
                free[together] = False
    for each in np.argsort(-candidates.cost, kind="stable"):
        others = total - chosen[each] * gain[each]
        kept_night = all(chosen[here].sum() > chosen[each] * np.isin(each, here) for here in must)
        if chosen[each] and kept_night and np.all(demand.share(others)[wanted] >= 1.0 - 1e-9):
            chosen[each], total = 0.0, others
    return chosen if candidates.cost @ chosen <= rules.cost_max + 1e-9 else None
