"""astroplan in and out: its constraints as extra masks, chosen stretches as its observing blocks.

Nothing is set globally: astropy is told for the length of a call not to look for newer tables of the
Earth's rotation on the network, and its warnings about dates beyond its tables stay inside. Such dates
cost the masks a few seconds of time at most.

What astroplan forbids, `hours`, `cover`, `nights` and `plan` can leave out; what they choose becomes its
observing blocks:

>>> from dataclasses import replace
>>> from coldglow import hours, load_request
>>> from coldglow.answers.asking.chosen import requested
>>> from coldglow.bridges.astroplan import constraint_mask, observing_blocks, offline
>>> with offline():
...     from astropy import units as u
...     from astroplan import MoonSeparationConstraint
>>> season = load_request("examples/uranus-season.yaml")
>>> few = replace(season.dates, first="2027-12-20", last="2027-12-22", forbidden=())
>>> request = replace(season, dates=few, coverage=replace(season.coverage, asked=False))
>>> far = [MoonSeparationConstraint(min=30 * u.deg)]  # any constraint of astroplan, as many as wanted
>>> def allowed(track):
...     return constraint_mask(track, far)
>>> hours(request, also=allowed)["night"].tolist()
['2027-12-21', '2027-12-22', '2027-12-20']
>>> stretch = requested(request, also=allowed)[0]  # what `nights` would ask for
>>> block = observing_blocks(stretch.scene.track, [(stretch.first, stretch.end)], "Uranus")[0]
>>> block.start_time.isot[:16]
'2027-12-21T00:07'
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Any

import numpy as np
from astropy import units as u
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.time import Time
from astropy.utils import iers
from astropy.utils.exceptions import AstropyWarning
from erfa import ErfaWarning
from numpy.typing import NDArray

from coldglow.describe.records import Orbit, Site
from coldglow.errors import RangeError
from coldglow.sky.clock import iso_from_tt
from coldglow.sky.track import Track


@contextmanager
def offline() -> Iterator[None]:
    """Keep astropy and astroplan off the network and silent about it, inside the ``with`` block only."""
    with (
        iers.conf.set_temp("auto_download", False),
        iers.conf.set_temp("auto_max_age", None),
        warnings.catch_warnings(),
    ):
        warnings.simplefilter("ignore", AstropyWarning)
        warnings.simplefilter("ignore", ErfaWarning)
        yield


def observer(site: Site, name: str = "") -> Any:
    """Return the ``astroplan.Observer`` of a site, without an atmosphere: airless altitudes."""
    with offline():
        from astroplan import Observer  # looks for tables on the network when imported; slow as well

        location = EarthLocation.from_geodetic(
            site.longitude_rad * u.rad, site.latitude_rad * u.rad, site.height_m * u.m
        )
        return Observer(location=location, name=name or None)


def constraint_mask(track: Track, constraints: Any) -> NDArray[np.bool_]:
    """Return where every one of these astroplan constraints allows the target, ndarray[time].

    `constraints` is one or a sequence of ``astroplan.Constraint``. Each is called with the target's
    astrometric place at each time: one target, coordinates and times of equal length. Scores (of a
    constraint that is not boolean) allow where they are above zero. Combine it with ``track.observable``.

    Raises: RangeError in space.
    """
    if isinstance(track.place, Orbit):
        raise RangeError("astroplan's constraints are for sites on the Earth; this instrument is in space.")
    listed = list(constraints) if isinstance(constraints, Sequence) else [constraints]
    where = observer(track.place)
    with offline():
        from astroplan import FixedTarget

        target = FixedTarget(SkyCoord(track.ra_icrs_rad * u.rad, track.dec_icrs_rad * u.rad), name="target")
        times = Time(list(iso_from_tt(track.grid.tt_s, "ms")), format="isot", scale="utc")
        allowed = np.ones(times.size, dtype=bool)
        for constraint in listed:
            allowed &= np.asarray(constraint(where, target, times=times, grid_times_targets=False)) > 0
    return allowed


def observing_blocks(
    track: Track,
    stretches: Sequence[tuple[int, int]],
    name: str,
    priorities: Sequence[float] | None = None,
    configuration: dict[str, Any] | None = None,
) -> list[Any]:
    """Return chosen stretches as placed ``astroplan.ObservingBlock`` objects, in the order given.

    `stretches` are pairs (first, end) of steps, the end not included; a step owns half a step to either
    side of its time. A block carries the target at the middle of its stretch, its start and end, and the
    non-sidereal rates beside the given configuration. Its priority is its place in the list, 1 first, or
    what `priorities` says. An ``astroplan.Schedule`` takes them by ``insert_slot(block.start_time, block)``.
    """
    blocks = []
    with offline():
        from astroplan import FixedTarget, ObservingBlock

        for number, (first, end) in enumerate(stretches):
            middle = (first + end - 1) // 2
            half_s = track.grid.step_s / 2.0
            edges = np.array([track.grid.tt_s[first] - half_s, track.grid.tt_s[end - 1] + half_s])
            start, stop = Time(list(iso_from_tt(edges, "ms")), format="isot", scale="utc")
            place = SkyCoord(track.ra_icrs_rad[middle] * u.rad, track.dec_icrs_rad[middle] * u.rad)
            block = ObservingBlock(
                FixedTarget(place, name=name),
                (edges[1] - edges[0]) * u.s,
                priorities[number] if priorities else number + 1,
                configuration={
                    "ra_rate": (track.ra_rate_rad_s[middle] * u.rad / u.s).to(u.arcsec / u.hour),
                    "dec_rate": (track.dec_rate_rad_s[middle] * u.rad / u.s).to(u.arcsec / u.hour),
                    **(configuration or {}),
                },
                constraints=[],
                name=f"{name} {start.isot[:16]}",
            )
            block.start_time, block.end_time = start, stop
            if isinstance(track.place, Site):
                block.observer = observer(track.place)
            blocks.append(block)
    return blocks
