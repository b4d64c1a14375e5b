"""The time account adds up."""

from __future__ import annotations

import pytest

from coldglow.plan.account import time_account


def test_account_by_hand():
    account = time_account(
        clock_s=[36000.0, 18000.0, 36000.0],
        shutter_s=[25000.0, 12000.0, 25000.0],
        calibration_s=[1800.0, 900.0, 1800.0],
        cost=[1.0, 0.5, 1.0],
        needed=[True, True, False],
    )
    assert account.science_s == 37000.0
    assert account.calibration_s == 2700.0
    assert account.overhead_s == 54000.0 - 37000.0 - 2700.0
    assert account.weather_s == 36000.0
    assert (account.nights_needed, account.nights_weather, account.nights_total) == (1.5, 1.0, 2.5)
    parts = account.science_s + account.calibration_s + account.overhead_s + account.weather_s
    assert parts == pytest.approx(account.total_s)
