"""Time the proven cover of a season: 184 nights in halves, rotation 17.24 h, 12 and 36 bins.

Run ``python tests/speed/cover_season.py`` (a minute: deep covers run into their limit). Wanted on two cores:
the cover by one pass and a half of every bin solved and proven below 5 s. The season is invented: nights of 7
to 10 h, best in its middle, an hour of observing worth airmass**-1.5. `passes` is the goal of a bin in units
of the most that one half night brings to one bin; time, cost, proven bound and gap are printed. Deep covers
are harder to prove, as nearly equal nights can be exchanged in very many ways: some end at their time limit
with a gap of one half night.
"""

from __future__ import annotations

import sys

import numpy as np

from coldglow.plan.cover import cover
from coldglow.plan.demand import Amount
from coldglow.plan.multicover import Candidates

WANTED_S = 5.0
LIMIT_S = 20.0
STEP_H = 1.0 / 12.0


def season(bins: int, nights: int = 184, period_h: float = 17.24) -> tuple[Candidates, np.ndarray]:
    """Return the halves of a season's nights and what each gathers per bin, in hours at the zenith."""
    night = np.repeat(np.arange(nights), 2)
    phase = (np.arange(nights) - nights / 2.0) / (nights / 2.0)
    length_h = 5.0 - 1.5 * phase**2
    gain = np.zeros((2 * nights, bins))
    start_s = np.zeros(2 * nights)
    for i, n in enumerate(night):
        hour = (i % 2 - 1) * length_h[n] + np.arange(0.0, length_h[n], STEP_H)
        airmass = 1.0 / np.maximum(np.cos(0.9 * np.radians(15.0 * (hour + 3.0 * phase[n]))), 0.3)
        worth = np.where(airmass < 2.0, airmass**-1.5, 0.0) * STEP_H
        place = np.floor(np.mod((24.0 * n + hour) / period_h, 1.0) * bins).astype(int)
        gain[i] = np.bincount(place, weights=worth, minlength=bins)
        start_s[i] = 86400.0 * n + 3600.0 * hour[0]
    end_s = start_s + 3600.0 * np.repeat(length_h, 2)
    places = np.zeros(2 * nights, dtype=np.int64)
    return Candidates(night, start_s, end_s, np.full(2 * nights, 0.5), places), gain


def main() -> int:
    """Print time, cost and gap of each instance; 1 if the wanted one is late or unproven."""
    missed = 0
    print(f"{'bins':>4} {'passes':>6} {'nights':>6} {'bound':>6} {'gap':>6} {'time':>8}")
    for bins, passes in [(12, 0.8), (12, 1.5), (12, 2.0), (12, 4.0), (36, 1.5), (36, 4.0)]:
        candidates, gain = season(bins)
        found = cover(candidates, gain, Amount(np.full(bins, passes * gain.max())), seconds=LIMIT_S)
        line = f"{bins:4d} {passes:6.1f} {found.cost:6.1f} {found.cost_bound:6.1f} {found.gap:6.1%}"
        print(f"{line} {found.seconds:6.2f} s", flush=True)
        if (bins, passes) == (12, 1.5):
            missed += found.seconds > WANTED_S or not found.proven
    return missed


if __name__ == "__main__":
    sys.exit(main())
