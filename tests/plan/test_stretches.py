"""Stretches of a small invented season, against sums done step by step."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow.plan.goal import marginalise, snr
from coldglow.plan.stretches import Steps, best_windows, longitude_rate, runs, season_chart, table

PERIOD_S = 62064.0


def season(nights: int = 4, step_s: float = 600.0, hole: bool = True, seed: int = 0) -> Steps:
    rng = np.random.default_rng(seed)
    time_s = np.arange(0.0, nights * 86400.0, step_s)
    hour = time_s % 86400.0 / 3600.0
    observable = (hour >= 8.0) & (hour < 16.0)
    if hole:
        observable &= ~((hour >= 10.0) & (hour < 10.5))
    slopes = rng.normal(size=(time_s.size, 6, 4)) * np.array([1.0, 0.01, 1.0, 1.0])
    airmass = 1.0 + ((hour - 12.0) / 6.0) ** 2
    return Steps(
        time_s=time_s,
        step_s=step_s,
        observable=observable,
        night=np.where(hour > 6.0, time_s // 86400.0, -1).astype(np.int64),
        matrix=np.einsum("tki,tkj->tij", slopes, slopes) * 1e-3 / airmass[:, None, None],
        shutter_share=np.full(time_s.size, 0.8),
        airmass=airmass,
        longitude_rad=np.mod(2.0 * np.pi * time_s / PERIOD_S, 2.0 * np.pi),
        range_rate_m_s=1e-3 * time_s,
        line_transmission=1.0 / airmass,
    )


def test_runs_end_at_gaps_and_nights():
    steps = season()
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night)
    assert first.size == 8
    hours = (steps.time_s[first] % 86400.0 / 3600.0).tolist()
    assert hours == [8.0, 10.5] * 4
    assert ((end - first) * 600.0 / 3600.0).tolist() == [2.0, 5.5] * 4
    kept = np.delete(np.arange(steps.time_s.size), first[1] + 10)  # a hole in the grid is a gap too
    first, _ = runs(steps.time_s[kept], steps.step_s, steps.observable[kept], steps.night[kept])
    assert first.size == 9


def test_longest_visit_splits_a_run():
    steps = season(1, hole=False)
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night, longest_s=3.0 * 3600.0)
    assert ((end - first) * steps.step_s / 3600.0).tolist() == [3.0, 3.0, 2.0]
    assert np.array_equal(first[1:], end[:-1])


def test_row_against_a_plain_sum_with_overhead_at_the_start():
    steps = season()
    rows = table(steps, [52, 63], [60, 90], overhead_s=900.0, visit_floor=0.05)
    seconds = np.full(8, 0.8 * 600.0)
    seconds[0], seconds[1] = 0.0, 0.8 * 300.0
    rest = marginalise(np.tensordot(seconds, steps.matrix[52:60], axes=1))
    np.testing.assert_allclose(rows.matrix[0], rest, rtol=1e-9)
    assert rows.snr[0] == pytest.approx(float(snr(rest[0, 0], 0.05)), rel=1e-9)
    assert rows.airmass_max[0] == steps.airmass[52:60].max()
    assert rows.airmass_min[1] == steps.airmass[63:90].min()
    assert (rows.start_s[0], rows.end_s[0]) == (52 * 600.0 - 300.0, 59 * 600.0 + 300.0)
    weight = seconds * steps.matrix[52:60, 0, 0]
    expected = np.average(steps.range_rate_m_s[52:60], weights=weight)
    assert rows.range_rate_m_s[0] == pytest.approx(expected, rel=1e-9)
    turned = np.mod(2.0 * np.pi * rows.end_s / PERIOD_S, 2.0 * np.pi)
    np.testing.assert_allclose(rows.longitude_end_rad, turned, atol=1e-9)


def test_a_stretch_shorter_than_its_overhead_yields_nothing():
    rows = table(season(), [52], [54], overhead_s=5000.0)
    assert rows.snr[0] == 0.0


def test_no_stretch_is_a_value():
    steps = season()
    nothing = np.zeros(0, dtype=np.int64)
    assert table(steps, nothing, nothing).snr.size == 0
    assert best_windows(steps, 10.0 * 3600.0).snr.size == 0


@given(st.integers(0, 50), st.floats(600.0, 5.0 * 3600.0), st.floats(0.0, 3000.0))
def test_best_window_against_all_windows(seed, length_s, overhead_s):
    steps = season(2, seed=seed)
    rows = best_windows(steps, length_s, overhead_s)
    size = int(np.ceil(length_s / steps.step_s - 1e-9))
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night)
    for night in (0, 1):
        starts = [
            s
            for a, b in zip(first, end, strict=True)
            if steps.night[a] == night
            for s in range(a, b - size + 1)
        ]
        every = table(steps, starts, np.array(starts) + size, overhead_s)
        assert rows.snr[rows.night == night][0] == pytest.approx(every.snr.max(), rel=1e-9, abs=1e-12)
    assert sorted(rows.rank) == [1, 2]
    assert rows.snr[rows.rank == 1] >= rows.snr[rows.rank == 2]


def test_halves_add_to_the_whole_before_marginalisation_and_lose_after():
    steps = season(hole=False)
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night)
    middle = (first + end) // 2
    begin, stop = np.column_stack((first, middle)).ravel(), np.column_stack((middle, end)).ravel()
    whole, parts = table(steps, first, end), table(steps, begin, stop)

    def plain(a, b):
        return np.array([steps.matrix[i:j].sum(axis=0) for i, j in zip(a, b, strict=True)])

    np.testing.assert_allclose(plain(begin, stop).reshape(-1, 2, 4, 4).sum(axis=1), plain(first, end))
    both = parts.matrix.reshape(-1, 2, 2, 2).sum(axis=1)
    assert np.all(both[:, 0, 0] < whole.matrix[:, 0, 0])  # each half fits a continuum of its own
    paid = table(steps, begin, stop, 900.0).matrix.reshape(-1, 2, 2, 2).sum(axis=1)
    assert np.all(paid[:, 0, 0] < both[:, 0, 0])  # and is acquired for itself


def test_equal_nights_rank_by_date():
    steps = season(5, hole=False)
    same = np.broadcast_to(np.diag([1.0, 1.0, 1.0, 1.0]), steps.matrix.shape)
    steps = Steps(**{name: getattr(steps, name) for name in Steps.__slots__} | {"matrix": same})
    rows = best_windows(steps, 3.0 * 3600.0)
    assert rows.rank.tolist() == [1, 2, 3, 4, 5]
    assert np.all(rows.start_s % 86400.0 == 8.0 * 3600.0 - 300.0)  # the earliest of equal windows


def test_longitude_rate_across_a_wrap_and_a_gap():
    steps = season(2)
    np.testing.assert_allclose(longitude_rate(steps), 2.0 * np.pi / PERIOD_S, rtol=1e-9)


def test_chart_puts_each_night_in_its_row():
    steps = season(3)
    hour, chart = season_chart(steps, steps.airmass)
    assert chart.shape == (3, 144)
    assert hour[0] == pytest.approx(1.0 / 12.0)
    seen = np.isfinite(chart)
    assert seen.sum() == steps.observable.sum()
    assert np.array_equal(seen[0], seen[2])
    assert chart[1, 60] == pytest.approx(np.nan, nan_ok=True)  # 10.0 h, in the hole
    assert chart[1, 72] == pytest.approx(1.0)  # 12 h


def test_a_visit_shorter_than_a_step_is_a_step():
    steps = season(nights=1)
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night, longest_s=60.0)
    assert np.all(end - first == 1)
    assert first.size == steps.observable.sum()


def test_rate_of_longitude_is_that_towards_the_nearer_neighbour():
    steps = replace(season(nights=1), time_s=np.array([0.0, 100.0, 300.0, 350.0]))
    steps = replace(steps, longitude_rad=np.array([0.0, 1.0, 2.0, 2.9]))
    np.testing.assert_allclose(longitude_rate(steps), [1e-2, 1e-2, 0.9 / 50.0, 0.9 / 50.0])


def test_chart_of_wide_columns_holds_the_mean_of_what_can_be_observed():
    steps = season(nights=2, step_s=600.0)
    hour, chart = season_chart(steps, steps.airmass, 24)  # six steps in each hour
    for night in (0, 1):
        for k in (8, 10, 15):
            inside = (steps.time_s // 3600.0 == 24 * night + k) & steps.observable
            assert chart[night, k] == pytest.approx(steps.airmass[inside].mean(), rel=1e-12)
    assert hour[10] == 10.5


def test_longitudes_of_a_stretch_are_those_half_a_step_beyond_its_steps():
    steps = season(2)
    first, end = runs(steps.time_s, steps.step_s, steps.observable, steps.night)
    rows = table(steps, first, end)
    half = np.pi * steps.step_s / PERIOD_S
    for found, expected in (
        (rows.longitude_start_rad, steps.longitude_rad[first] - half),
        (rows.longitude_end_rad, steps.longitude_rad[end - 1] + half),
    ):
        np.testing.assert_allclose(np.exp(1j * found), np.exp(1j * expected), atol=1e-6)
        assert np.all((found >= 0.0) & (found < 2.0 * np.pi))
