"""The rotational light curve of a target with spots, as the opening sees it."""

from __future__ import annotations

import numpy as np

from coldglow.answers.common.scenes import information_rate
from coldglow.answers.covering.coverage import spot_and_rest
from coldglow.describe.records import Request
from coldglow.detect.season import beams
from coldglow.report.results import Table, column, table
from coldglow.scenario import Scenario, follow
from coldglow.sky.clock import iso_from_tt, times_grid

POINTS = 73  # of one turn, both ends included


def light_curve_table(request: Request, scene: Scenario) -> Table:
    """Return the light in the opening over one turn around the best moment, over its mean.

    The airmass is kept at that of the best moment, so that only the rotation shows.
    """
    index = np.flatnonzero(scene.usable)
    best = int(index[np.argmax(information_rate(scene)[index])])
    turn_s = np.linspace(-0.5, 0.5, POINTS) * scene.track.system.period_s
    grid = times_grid([str(text) for text in iso_from_tt(scene.track.grid.tt_s[best] + turn_s, "ms")])
    track, use = follow(request, scene.use, grid), scene.use
    airmass = np.full(POINTS, float(np.nan_to_num(scene.track.airmass[best], nan=1.0)))
    seen = beams(scene.target, use.instrument, use.setting, track, airmass, scene.air.seeing_rad)
    columns = [
        column("longitude", np.degrees(track.sub_observer_longitude_rad), "deg", decimals=1),
        column("time", iso_from_tt(grid.tt_s, "m"), description="UTC"),
        column("relative_brightness", seen.path_factor / seen.path_factor[:-1].mean(), decimals=4),
    ]
    if request.coverage.spot:
        spot, rest = spot_and_rest(scene, track, airmass, request.coverage.spot)
        name = request.coverage.spot
        columns.append(column("spot_share", spot / (spot + rest), decimals=4, description=name))
    caption = f"Light in the opening of {use.instrument.name} over one turn, over its mean"
    return table(*columns, caption=caption, rows=range(0, POINTS, 6))
