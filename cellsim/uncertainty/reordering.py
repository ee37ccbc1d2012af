"""Induces rank correlations by reordering (Iman and Conover 1982), so that margins stay as they are."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial

import numpy as np
import numpy.typing as npt
from scipy import special

from cellsim.uncertainty.concurrency import run_tasks
from cellsim.uncertainty.dependence import mix_rows

FloatArray = npt.NDArray[np.float64]

_BLOCK = 32_768


def normal_scores(draws: int) -> FloatArray:
    """Rising normal scores (van der Waerden), the normal quantiles at i / (draws + 1)."""
    scores: FloatArray = special.ndtri(np.arange(1, draws + 1) / (draws + 1.0))
    return scores


def correlate_scores(rows: Sequence[FloatArray], factor: FloatArray, threads: int = 1) -> None:
    """Replaces shuffled scores by scores whose linear correlation is the one wanted, exactly.

    The sample correlation that shuffling leaves by chance is taken out first, unless there are too
    few draws to do so. Row i of the result depends on rows up to i only.

    Args:
        rows: For each input its scores in an order of its own, shape (draws,); all with mean 0 and
            the same sum of squares. Overwritten.
        factor: Lower factor of the correlation wanted, shape (inputs, inputs).
        threads: How many threads share the work; changes no bit of the result.
    """
    weights = factor
    if rows[0].size > len(rows):
        chance = np.linalg.cholesky(_correlation(rows, threads))
        weights = np.tril(np.linalg.solve(chance.T, factor.T).T)
    run_tasks(
        [
            partial(mix_rows, [row[first : first + _BLOCK] for row in rows], weights)
            for first in range(0, rows[0].size, _BLOCK)
        ],
        threads,
    )


def order_like(values: FloatArray, scores: FloatArray) -> FloatArray:
    """The values in the order of the scores: the least value where the least score is, and so on.

    Args:
        values: Rising, shape (draws,).
        scores: Shape (draws,).
    """
    ordered = np.empty_like(values)
    ordered[np.argsort(scores)] = values
    return ordered


def _correlation(rows: Sequence[FloatArray], threads: int) -> FloatArray:
    """Linear correlations of rows with mean 0 and the same sum of squares."""
    matrix = np.eye(len(rows))
    square = _inner_product(rows[0], rows[0])

    def fill(first: int, second: int) -> None:
        value = _inner_product(rows[first], rows[second]) / square
        matrix[first, second] = matrix[second, first] = value

    pairs = [(first, second) for second in range(len(rows)) for first in range(second)]
    run_tasks([partial(fill, *pair) for pair in pairs], threads)
    return matrix


def _inner_product(left: FloatArray, right: FloatArray) -> float:
    """The sum of products in an order that does not depend on threads of a linear algebra library."""
    return sum(
        float(np.sum(left[first : first + _BLOCK] * right[first : first + _BLOCK]))
        for first in range(0, left.size, _BLOCK)
    )
