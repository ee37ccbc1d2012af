"""Rank correlations between inputs and the Gaussian copula that carries them."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np
import numpy.typing as npt

from cellsim.uncertainty.specs import DependenceSpec

FloatArray = npt.NDArray[np.float64]

_EIGENVALUE_TOLERANCE = 1e-10
_PIVOT_TOLERANCE = 1e-12


def rank_correlation_matrix(
    names: Sequence[str], specs: Sequence[DependenceSpec]
) -> FloatArray | None:
    """The rank correlations of all inputs, those that no section names being independent.

    Args:
        names: Names of all inputs, in order.
        specs: The dependence sections; no pair in two of them.

    Returns:
        Shape (inputs, inputs), or None if there is no section.
    """
    if not specs:
        return None
    place = {name: position for position, name in enumerate(names)}
    matrix = np.eye(len(names))
    for spec in specs:
        for i, j in combinations(range(len(spec.inputs)), 2):
            first, second = place[spec.inputs[i]], place[spec.inputs[j]]
            matrix[first, second] = matrix[second, first] = spec.rank_correlation[i][j]
    return matrix


def matrix_fault(matrix: npt.ArrayLike) -> str | None:
    """Why a symmetric matrix with unit diagonal cannot be had as rank correlations, or None."""
    rank = np.asarray(matrix, dtype=np.float64)
    smallest = float(np.linalg.eigvalsh(rank)[0])
    if smallest < -_EIGENVALUE_TOLERANCE:
        return (
            "is not a correlation matrix: its entries contradict each other "
            f"(smallest eigenvalue {smallest:.3g}, expected 0 or more)"
        )
    smallest = float(np.linalg.eigvalsh(normal_score_correlation(rank))[0])
    if smallest < -_EIGENVALUE_TOLERANCE:
        return (
            "cannot be reached by a Gaussian copula "
            f"(smallest eigenvalue of the normal scores' correlation {smallest:.3g}, "
            "expected 0 or more); smaller correlations can"
        )
    return None


def normal_score_correlation(rank: FloatArray) -> FloatArray:
    """The linear correlation of normal scores that gives a Spearman rank correlation.

    `2 sin(pi rho / 6)` for a bivariate normal pair (K. Pearson 1907).
    """
    scores: FloatArray = 2.0 * np.sin(np.pi / 6.0 * rank)
    return np.where(np.abs(rank) == 1.0, rank, scores)


def lower_factor(matrix: FloatArray) -> FloatArray:
    """The lower Cholesky factor of a positive semidefinite correlation matrix.

    Row i depends on rows up to i only, so that a further input leaves the others' draws as they
    were. Pivots that vanish give a column of zeros. Rows have length 1.

    Args:
        matrix: Shape (n, n), symmetric, unit diagonal, smallest eigenvalue 0 or more.
    """
    size = len(matrix)
    factor = np.zeros((size, size))
    for column in range(size):
        rest = matrix[column:, column] - factor[column:, :column] @ factor[column, :column]
        if rest[0] > _PIVOT_TOLERANCE:
            factor[column:, column] = rest / np.sqrt(rest[0])
    lengths = np.sqrt(np.sum(factor * factor, axis=1))
    unit_rows: FloatArray = factor / lengths[:, np.newaxis]
    return unit_rows


def mix_rows(rows: Sequence[FloatArray], factor: FloatArray) -> None:
    """Multiplies rows by a lower triangular matrix, in place.

    Guarantees: each draw is computed by itself, so that its bits do not depend on the block.

    Args:
        rows: One for each input, shape (draws,).
        factor: Shape (inputs, inputs), lower triangular.
    """
    for position in reversed(range(len(rows))):  # the last first: it needs the others unmixed
        row = rows[position]
        row *= factor[position, position]
        for other in range(position):
            if factor[position, other] != 0.0:
                row += factor[position, other] * rows[other]


def dependent_groups(matrix: FloatArray) -> list[list[int]]:
    """The sets of two or more inputs that are tied to each other, directly or through others."""
    left = set(range(len(matrix)))
    groups = []
    while left:
        group = {min(left)}
        frontier = set(group)
        while frontier:
            tied = {j for i in frontier for j in left - group if matrix[i, j] != 0.0}
            group |= tied
            frontier = tied
        left -= group
        if len(group) > 1:
            groups.append(sorted(group))
    return groups
