"""Where skyfield, with the packaged kernel, sees Uranus from an invented site: an independent library."""

from __future__ import annotations

import math
from contextlib import closing

import numpy as np
from skyfield.api import load, load_file, wgs84

from coldglow.describe.records import Site
from coldglow.sky.ephemeris import _packaged_kernel

SITE = Site(math.radians(-68.0), math.radians(-25.0), 4300.0)  # invented


def skyfield_place(moments, site=SITE):
    """Astrometric place of Uranus at ndarray[time] of UTC datetime64.

    Right ascension, declination (rad), distance (au), its rate (km/s), rates of the angles (rad/s), distance
    from the Sun when the light left (au).
    """
    scale = load.timescale(builtin=True)
    day = moments.astype("datetime64[D]")
    seconds = (moments - day) / np.timedelta64(1, "s")
    year, month, date = np.array([[int(part) for part in str(d).split("-")] for d in day]).T
    when = scale.utc(year, month, date, 0, 0, seconds)
    with closing(load_file(str(_packaged_kernel()))) as kernel:
        body = kernel["uranus barycenter"]
        ground = wgs84.latlon(
            math.degrees(site.latitude_rad), math.degrees(site.longitude_rad), elevation_m=site.height_m
        )
        seen = (kernel["earth"] + ground).at(when).observe(body)
        ra, dec, distance = seen.radec()
        _, _, _, dec_rate, ra_rate, rate = seen.frame_latlon_and_rates(_Icrf)
        left = scale.tt_jd(when.tt - seen.light_time)
        sun = (body - kernel["sun"]).at(left).distance().au
    return (
        ra.radians,
        dec.radians,
        distance.au,
        rate.km_per_s,
        ra_rate.radians.per_second,
        dec_rate.radians.per_second,
        sun,
    )


class _Icrf:
    """ICRS axes, as skyfield's frames describe themselves."""

    @staticmethod
    def rotation_at(_):
        return np.eye(3)

    @staticmethod
    def _dRdt_times_RT_at(_):
        return np.zeros((3, 3))
