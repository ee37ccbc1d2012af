"""Matrices of rank correlations: what can be had, and how inputs hang together."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cellsim.uncertainty.dependence import (
    dependent_groups,
    lower_factor,
    matrix_fault,
    mix_rows,
    rank_correlation_matrix,
)
from cellsim.uncertainty.specs import DependenceSpec


def test_sections_fill_one_matrix() -> None:
    sections = [
        DependenceSpec(("d", "a"), ((1.0, 0.5), (0.5, 1.0)), 1),
        DependenceSpec(("b", "d"), ((1.0, -0.2), (-0.2, 1.0)), 4),
    ]

    found = rank_correlation_matrix(["a", "b", "c", "d"], sections)

    expected = np.eye(4)
    expected[0, 3] = expected[3, 0] = 0.5
    expected[1, 3] = expected[3, 1] = -0.2
    np.testing.assert_array_equal(found, expected)


def test_no_section_gives_no_matrix() -> None:
    assert rank_correlation_matrix(["a"], []) is None


def test_inputs_tied_through_a_third_are_one_group() -> None:
    matrix = np.eye(6)
    for first, second in ((0, 4), (4, 2), (1, 5)):
        matrix[first, second] = matrix[second, first] = 0.1

    assert dependent_groups(matrix) == [[0, 2, 4], [1, 5]]


@pytest.mark.parametrize("correlation", [-1.0, -0.3, 0.0, 0.99, 1.0])
def test_any_pair_can_be_had(correlation: float) -> None:
    assert matrix_fault([[1.0, correlation], [correlation, 1.0]]) is None


@pytest.mark.parametrize(
    ("correlation", "fits"), [(-0.48, True), (-0.49, False), (-0.51, False), (1.0, True)]
)
def test_three_inputs_can_oppose_each_other_only_so_far(correlation: float, fits: bool) -> None:
    """Equal correlations r of three inputs need r >= -1/2, and under a Gaussian copula rank
    correlations of (6 / pi) asin(-1/4) = -0.4826 or more."""
    matrix = np.full((3, 3), correlation)
    np.fill_diagonal(matrix, 1.0)

    assert (matrix_fault(matrix) is None) == fits


@given(st.integers(1, 6), st.integers(1, 6), st.integers(0, 2**32 - 1))
def test_factor_times_its_transpose_is_the_matrix(size: int, rank: int, seed: int) -> None:
    loadings = np.random.default_rng(seed).normal(size=(size, rank))
    loadings /= np.linalg.norm(loadings, axis=1, keepdims=True)
    matrix = loadings @ loadings.T

    factor = lower_factor(matrix)

    np.testing.assert_array_equal(factor, np.tril(factor))
    np.testing.assert_allclose(factor @ factor.T, matrix, atol=2e-6)
    np.testing.assert_allclose(np.linalg.norm(factor, axis=1), 1.0)


def test_factor_of_a_larger_matrix_begins_with_that_of_the_smaller() -> None:
    matrix = np.array([[1.0, 0.6, 0.2], [0.6, 1.0, 0.5], [0.2, 0.5, 1.0]])

    np.testing.assert_array_equal(lower_factor(matrix)[:2, :2], lower_factor(matrix[:2, :2]))


def test_rows_are_multiplied_in_place() -> None:
    factor = np.array([[1.0, 0.0, 0.0], [0.6, 0.8, 0.0], [0.5, -0.5, 0.5]])
    rows = np.random.default_rng(4).normal(size=(3, 50))
    expected = factor @ rows

    mix_rows(list(rows), factor)

    np.testing.assert_allclose(rows, expected, rtol=1e-14)
