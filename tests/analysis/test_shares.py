"""Shares of draws and their intervals against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from cellsim.analysis.shares import exceedance, wilson_share


@pytest.mark.parametrize(
    ("hits", "count"), [(0, 10), (1, 10), (10, 10), (37, 1000), (999_999, 1_000_000)]
)
def test_interval_is_wilsons(hits: int, count: int) -> None:
    expected = stats.binomtest(hits, count).proportion_ci(method="wilson")
    found = wilson_share(hits, count)
    assert found.lower == pytest.approx(expected.low, rel=1e-9, abs=1e-12)
    assert found.upper == pytest.approx(expected.high, rel=1e-12)
    assert found.lower <= found.share <= found.upper


def test_draws_equal_to_the_threshold_are_neither_above_nor_below() -> None:
    found = exceedance(np.array([1.0, 2.0, 2.0, 2.0, 5.0]), 2.0)
    assert (found.below.hits, found.equal, found.above.hits) == (1, 3, 1)
