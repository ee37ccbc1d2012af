"""Matrices."""

from __future__ import annotations

import numpy as np

from cellsim.functions.registry import Matrix, Whole, spreadsheet_function
from cellsim.values import Array, ErrorValue

_LARGEST_UNIT = 2_000


def _as_array(matrix: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> Array | ErrorValue:
    if not np.isfinite(matrix).all():
        return ErrorValue.NUM
    return Array.from_rows(matrix.tolist())


@spreadsheet_function("MMULT")
def matrix_product(left: Matrix, right: Matrix) -> Array | ErrorValue:
    """The product of two matrices."""
    return _as_array(left @ right) if left.shape[1] == right.shape[0] else ErrorValue.VALUE


@spreadsheet_function("MDETERM")
def determinant(matrix: Matrix) -> float | ErrorValue:
    """The determinant of a square matrix."""
    return float(np.linalg.det(matrix)) if matrix.shape[0] == matrix.shape[1] else ErrorValue.VALUE


@spreadsheet_function("MINVERSE")
def matrix_inverse(matrix: Matrix) -> Array | ErrorValue:
    """The inverse of a square matrix; #NUM! if there is none."""
    if matrix.shape[0] != matrix.shape[1]:
        return ErrorValue.VALUE
    try:
        return _as_array(np.linalg.inv(matrix).astype(np.float64))
    except np.linalg.LinAlgError:
        return ErrorValue.NUM


@spreadsheet_function("MUNIT")
def unit_matrix(size: Whole) -> Array | ErrorValue:
    """The unit matrix of a size."""
    if size < 1:
        return ErrorValue.VALUE
    return _as_array(np.eye(size)) if size <= _LARGEST_UNIT else ErrorValue.NUM
