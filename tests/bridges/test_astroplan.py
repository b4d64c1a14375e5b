import socket
import subprocess
import sys
import warnings

import numpy as np
import pytest
from astropy import units as u
from astropy.time import Time
from astropy.utils import iers
from skyfield_places import SITE

from coldglow.bridges.astroplan import constraint_mask, observer, observing_blocks, offline
from coldglow.describe.load import load_target
from coldglow.describe.records import Limits, Orbit
from coldglow.errors import RangeError
from coldglow.sky.clock import iso_from_tt, season_grid
from coldglow.sky.track import make_track

with offline():
    import astroplan

DEG = np.pi / 180
LIMITS = Limits(
    airmass_max=2.0,
    altitude_min_rad=20 * DEG,
    altitude_max_rad=np.pi / 2,
    sun_altitude_max_rad=-12 * DEG,
    daytime=False,
    sun_separation_min_rad=0.0,
    moon_separation_min_rad=0.0,
    elongation_min_rad=0.0,
    elongation_max_rad=np.pi,
    longest_visit_s=np.inf,
)


def track_over(first="2026-11-20", last="2026-11-24", place=SITE, step_s=600.0):
    target = load_target("uranus")
    grid = season_grid(first, last, step_s, place)
    return make_track(target, place, LIMITS, grid, target.rotation.systems[0])


@pytest.fixture(scope="module")
def track():
    return track_over()


def edges(mask):
    """Steps on either side of which the mask changes: rounding may decide them."""
    change = np.flatnonzero(np.diff(mask.astype(int)))
    return np.unique(np.concatenate([change, change + 1]))


def assert_same_but_for_edges(found, expected):
    different = np.setdiff1d(np.flatnonzero(found != expected), edges(expected))
    assert different.size == 0
    assert expected.any()
    assert not expected.all()


def test_altitude_of_astroplan_is_ours(track):
    found = constraint_mask(track, astroplan.AltitudeConstraint(min=30 * u.deg))
    assert_same_but_for_edges(found, track.altitude_rad >= 30 * DEG)


def test_night_of_astroplan_is_ours(track):
    found = constraint_mask(track, astroplan.AtNightConstraint.twilight_nautical())
    assert_same_but_for_edges(found, track.sun_altitude_rad <= -12 * DEG)


def test_the_moon_of_astroplan_is_ours():
    track = track_over("2026-11-01", "2026-11-28", step_s=3600.0)
    found = constraint_mask(track, astroplan.MoonSeparationConstraint(min=40 * u.deg))
    assert_same_but_for_edges(found, track.moon_separation_rad >= 40 * DEG)


def test_several_constraints_must_all_agree(track):
    both = [astroplan.AltitudeConstraint(min=30 * u.deg), astroplan.AtNightConstraint.twilight_nautical()]
    found = constraint_mask(track, both)
    np.testing.assert_array_equal(found, constraint_mask(track, both[0]) & constraint_mask(track, both[1]))
    assert constraint_mask(track, []).all()


def test_scores_allow_above_zero(track):
    scored = astroplan.AltitudeConstraint(min=30 * u.deg, max=90 * u.deg, boolean_constraint=False)
    assert_same_but_for_edges(constraint_mask(track, scored), track.altitude_rad > 30 * DEG)


def test_a_constraint_of_the_users_own(track):
    class Odd(astroplan.Constraint):
        def compute_constraint(self, times, observer, targets):
            assert times.shape == targets.shape  # one target, equal lengths
            return np.arange(times.size) % 2 == 1

    assert constraint_mask(track, Odd()).tolist() == (np.arange(track.airmass.size) % 2 == 1).tolist()


def test_far_dates_are_quiet_and_need_no_network(monkeypatch):
    def refuse(*_, **__):
        raise AssertionError("the network was asked")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    before = (iers.conf.auto_download, iers.conf.auto_max_age)
    far = track_over("2040-05-01", "2040-05-02", step_s=1800.0)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        found = constraint_mask(far, astroplan.AltitudeConstraint(min=30 * u.deg))
    assert (iers.conf.auto_download, iers.conf.auto_max_age) == before
    assert_same_but_for_edges(found, far.altitude_rad >= 30 * DEG)


def test_space_has_no_such_constraints():
    track = track_over(place=Orbit(), step_s=6 * 3600.0)
    with pytest.raises(RangeError, match="in space"):
        constraint_mask(track, astroplan.AltitudeConstraint(min=30 * u.deg))


def stretches(track):
    runs = np.flatnonzero(np.diff(np.concatenate([[False], track.observable, [False]]).astype(int)))
    return [(int(first), int(end)) for first, end in runs.reshape(-1, 2)]


def test_blocks_carry_the_stretch(track):
    chosen = stretches(track)
    blocks = observing_blocks(track, chosen, "Uranus", configuration={"setting": "L-long"})
    assert len(blocks) == len(chosen) == 5
    for (first, end), block in zip(chosen, blocks, strict=True):
        assert block.duration.to_value(u.s) == pytest.approx((end - first) * 600.0)
        assert (block.end_time - block.start_time).to_value(u.s) == pytest.approx(
            (end - first) * 600.0, abs=1e-3
        )
        early = Time(str(iso_from_tt(track.grid.tt_s[first]))) - block.start_time
        assert early.to_value(u.s) == pytest.approx(300.0, abs=1e-3)
        assert block.configuration["setting"] == "L-long"
        assert block.target.name == "Uranus"
    middle = (chosen[2][0] + chosen[2][1] - 1) // 2
    assert blocks[2].target.coord.ra.rad == pytest.approx(track.ra_icrs_rad[middle])
    assert blocks[2].configuration["ra_rate"].to_value(u.rad / u.s) == pytest.approx(
        track.ra_rate_rad_s[middle]
    )
    assert [block.priority for block in blocks] == [1, 2, 3, 4, 5]


def test_an_astroplan_user_goes_on_from_there(track):
    blocks = observing_blocks(track, stretches(track)[:2], "Uranus", priorities=[2, 1])
    with offline():
        schedule = astroplan.Schedule(blocks[0].start_time - 1 * u.hour, blocks[1].end_time + 1 * u.hour)
        for block in blocks:
            schedule.insert_slot(block.start_time, block)
        assert len(schedule.observing_blocks) == 2
        table = schedule.to_table(show_unused=True)
        assert list(table["target"]).count("Uranus") == 2
        where = observer(SITE, "ours")
        altitude = where.altaz(blocks[0].start_time, blocks[0].target).alt
        mine = track.altitude_rad[stretches(track)[0][0]]
        # the block's one place is that of its middle, and its start half a step earlier
        assert altitude.rad == pytest.approx(mine, abs=1.5 * DEG)
        night = astroplan.is_observable(
            [astroplan.AltitudeConstraint(min=15 * u.deg)],
            where,
            [blocks[0].target],
            time_range=Time([blocks[0].start_time, blocks[0].end_time]),
        )
    assert night.all()


def test_a_scheduler_places_the_blocks_again(track):
    blocks = observing_blocks(track, stretches(track)[:2], "Uranus")
    for block in blocks:
        block.duration = 1 * u.hour
        block.constraints = [astroplan.AltitudeConstraint(min=20 * u.deg)]
    with offline():
        scheduler = astroplan.PriorityScheduler(
            constraints=[astroplan.AtNightConstraint.twilight_nautical()],
            observer=observer(SITE),
            transitioner=astroplan.Transitioner(1 * u.deg / u.s),
            time_resolution=10 * u.min,
        )
        schedule = astroplan.Schedule(blocks[0].start_time, blocks[1].end_time)
        scheduler(blocks, schedule)
    assert len(schedule.observing_blocks) == 2


def test_importing_the_bridge_sets_nothing_and_is_light():
    code = (
        "import sys; from astropy.utils import iers; a = iers.conf.auto_download, iers.conf.auto_max_age\n"
        "import coldglow.bridges.astroplan\n"
        "assert (iers.conf.auto_download, iers.conf.auto_max_age) == a\n"
        "assert 'astroplan' not in sys.modules\n"
    )
    subprocess.run([sys.executable, "-W", "error", "-c", code], check=True)
