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


def test_means_on_both_sides_are_those_of_the_draws() -> None:
    draws = np.sort(np.random.default_rng(5).normal(1.0, 4.0, 1001))
    found = exceedance(draws, 0.5)
    assert found.mean_above == pytest.approx(draws[draws > 0.5].mean(), rel=1e-12)
    assert found.mean_others == pytest.approx(draws[draws <= 0.5].mean(), rel=1e-12)


def test_a_side_without_draws_has_no_mean_and_huge_draws_do_not_overflow() -> None:
    huge = np.full(10, 1.7e308)
    assert exceedance(huge, 0.0).mean_others is None
    assert exceedance(huge, 0.0).mean_above == pytest.approx(1.7e308, rel=1e-12)
    assert exceedance(huge, 1.75e308).mean_above is None
