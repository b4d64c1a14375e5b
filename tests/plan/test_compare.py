"""Ranking by several criteria."""

from __future__ import annotations

import numpy as np
import pytest

from coldglow.plan.compare import ranking


def test_first_criterion_then_second_never_last():
    nights = [3.0, 2.0, np.inf, 2.0, np.nan]
    hours = [1.0, 9.0, 1.0, 5.0, 0.5]
    assert ranking(nights, hours).tolist() == [3, 1, 0, 4, 2]


def test_rounding_is_no_difference_and_equal_results_keep_their_order():
    assert ranking([1.0 + 1e-13, 1.0, 1.0], [2.0, 1.0, 1.0]).tolist() == [1, 2, 0]


def test_nothing_to_rank_by():
    with pytest.raises(ValueError, match="at least one criterion"):
        ranking()
