"""The table in place of a slow inverse stays within its bound, or is not used."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.distributions.score_table import ERROR_BOUND, build_score_table

FloatArray = npt.NDArray[np.float64]


def smooth(z: FloatArray) -> tuple[FloatArray, FloatArray]:
    return np.sinh(z / 4) + z, np.cosh(z / 4) / 4 + 1


def steep(z: FloatArray) -> tuple[FloatArray, FloatArray]:
    return 1e6 * np.tanh(50 * z) + z, 5e7 / np.cosh(np.clip(50 * z, -300, 300)) ** 2 + 1


def stepped(z: FloatArray) -> tuple[FloatArray, FloatArray]:
    return np.floor(z), np.zeros_like(z)


def test_smooth_function_is_tabulated_within_the_bound() -> None:
    table = build_score_table(smooth)
    z = np.linspace(-9, 9, 100_001)

    assert table.coefficients.shape == (4, 4096)
    assert np.max(np.abs(table(z) - smooth(z)[0])) <= ERROR_BOUND


@pytest.mark.parametrize("function", [steep, stepped])
def test_function_that_cannot_be_tabulated_is_computed_exactly(function: object) -> None:
    table = build_score_table(function)  # type: ignore[arg-type]
    z = np.linspace(-2, 2, 1001)

    assert table.coefficients.shape == (4, 0)
    np.testing.assert_array_equal(table(z), table.exact(z)[0])


def test_tails_beyond_the_table_are_exact() -> None:
    table = build_score_table(smooth)
    z = np.array([-40.0, -6.0001, 6.0, 6.5, 40.0])

    np.testing.assert_array_equal(table(z), smooth(z)[0])


def test_block_borders_do_not_show() -> None:
    table = build_score_table(smooth)
    z = np.linspace(-6.5, 6.5, 70_000)

    pieces = np.concatenate([table(part) for part in np.array_split(z, 17)])

    np.testing.assert_array_equal(table(z), pieces)
    np.testing.assert_array_equal(table(z.reshape(7, -1)).ravel(), pieces)


def exact_beta_cdf(alpha: int, beta: int, x: float) -> Fraction:
    """The binomial sum that a beta cdf with whole shapes is, without rounding."""
    share, last = Fraction(x), alpha + beta - 1
    return sum(
        (
            math.comb(last, count) * share**count * (1 - share) ** (last - count)
            for count in range(alpha, last + 1)
        ),
        start=Fraction(0),
    )


@settings(deadline=None, max_examples=25)
@given(st.integers(1, 30), st.integers(1, 30))
def test_beta_quantiles_are_within_the_bound_of_the_true_function(alpha: int, beta: int) -> None:
    distribution = build_distribution("beta", {"alpha": alpha, "beta": beta})
    u = np.array([1e-12, 1e-6, 0.01, 0.3, 0.5, 0.8, 0.99, 1 - 1e-6])

    x = distribution.quantile(u)

    # the bound holds for the distance to either end; the rest is rounding of the value and of u
    allowed = 2 * ERROR_BOUND * np.minimum(x, 1 - x) + 2 * np.spacing(x)
    for value, wanted, slope in zip(x, u, distribution.density(x) * allowed, strict=True):
        missed = exact_beta_cdf(alpha, beta, float(value)) - Fraction(float(wanted))
        assert abs(float(missed)) <= slope + 1e-13 * wanted


@pytest.mark.parametrize(("alpha", "beta"), [(2.0, 5.0), (0.5, 0.5), (0.01, 3.0), (1e5, 2e5)])
def test_beta_quantiles_near_the_bounds_keep_their_relative_precision(
    alpha: float, beta: float
) -> None:
    below = build_distribution("beta", {"alpha": alpha, "beta": beta})
    above = build_distribution("beta", {"alpha": beta, "beta": alpha, "low": -1, "high": 0})
    z = np.linspace(-8.2, 8.2, 401)

    np.testing.assert_allclose(below.at_score(z), -above.at_score(-z), rtol=3 * ERROR_BOUND)
