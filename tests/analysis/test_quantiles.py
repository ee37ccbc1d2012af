"""Quantiles and their intervals against numpy, scipy and published ranks."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from cellsim.analysis.quantiles import (
    binomial_quantile,
    interval_ranks,
    quantile_table,
    quantiles_of_sorted,
)

# Ranks of the 95 % binomial order-statistic interval (Conover 1999, Practical Nonparametric
# Statistics, section 3.2), worked out with scipy.stats.quantile_test: n, p, r, s, coverage.
RANKS = [
    (10, 0.5, 2, 9, 0.978516),
    (20, 0.5, 6, 15, 0.958611),
    (25, 0.5, 8, 18, 0.956715),
    (30, 0.5, 10, 21, 0.957226),
    (100, 0.5, 40, 61, 0.964800),
    (100, 0.9, 84, 96, 0.955690),
    (1000, 0.05, 37, 65, 0.958095),
    (1000, 0.95, 936, 964, 0.958095),
    (10000, 0.95, 9457, 9543, 0.951528),
]


@pytest.mark.parametrize(("count", "p", "low", "high", "coverage"), RANKS)
def test_ranks_enclose_the_quantile_with_the_coverage_worked_out(
    count: int, p: float, low: int, high: int, coverage: float
) -> None:
    r, s = interval_ranks(count, np.array([p]), 0.95)
    assert (int(r[0]), int(s[0])) == (low, high)
    exact = stats.binom.cdf(high - 1, count, p) - stats.binom.cdf(low - 1, count, p)
    assert exact == pytest.approx(coverage, abs=5e-7)


@pytest.mark.parametrize("count", [1, 2, 7, 1000, 1_000_000])
@pytest.mark.parametrize("probability", [0.025, 0.3, 0.975])
def test_binomial_quantiles_are_those_of_scipy(count: int, probability: float) -> None:
    shares = np.linspace(0.001, 0.999, 333)
    expected = np.maximum(stats.binom.ppf(probability, count, shares), 0)
    assert (binomial_quantile(probability, count, shares) == expected).all()


def test_interval_agrees_with_scipy_quantile_test() -> None:
    data = np.sort(np.random.default_rng(2).lognormal(size=300))
    found = quantile_table(data, np.array([0.1, 0.5, 0.9]))
    for k, p in enumerate((0.1, 0.5, 0.9)):
        low, high = np.array(stats.quantile_test(data, p=p).confidence_interval(0.95))
        assert (found.lower[k], found.upper[k]) == (low, high)


@pytest.mark.parametrize("count", [1, 2, 3, 10, 1001])
def test_values_are_numpy_linear_quantiles(count: int) -> None:
    data = np.sort(np.random.default_rng(count).normal(size=count))
    probabilities = np.linspace(0, 1, 41)
    expected = np.quantile(data, probabilities)
    assert quantiles_of_sorted(data, probabilities) == pytest.approx(expected, rel=1e-13, abs=1e-15)


def test_few_draws_leave_far_quantiles_unbounded() -> None:
    found = quantile_table(np.arange(10.0), np.array([0.0, 0.01, 0.5, 0.99, 1.0]))
    assert np.isnan(found.lower[[0, 1, 4]]).all()
    assert np.isnan(found.upper[[0, 3, 4]]).all()
    assert not np.isnan(found.lower[2])
    assert found.upper[1] >= found.values[1]


def test_values_never_turn_back() -> None:
    data = np.sort(np.random.default_rng(9).choice([0.1, 0.1 + 1e-16, 0.3], 5000))
    found = quantile_table(data, np.linspace(0, 1, 1001))
    assert (np.diff(found.values) >= 0).all()
