"""Comparisons over draws, by the same rules as on single values."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.functions.comparison import compare
from cellsim.program.ir import Op

AnyArray = npt.NDArray[Any]

COMPARISONS: dict[Op, np.ufunc] = {
    Op.EQUAL: np.equal,
    Op.NOT_EQUAL: np.not_equal,
    Op.LESS: np.less,
    Op.LESS_EQUAL: np.less_equal,
    Op.GREATER: np.greater,
    Op.GREATER_EQUAL: np.greater_equal,
}
_HOLDS_WHEN_EQUAL = frozenset({Op.EQUAL, Op.LESS_EQUAL, Op.GREATER_EQUAL})
_NEARLY = 1e-14
"""Numbers further apart than this, relatively, differ within 15 significant digits."""


def compare_over_draws(op: Op, left: AnyArray, right: AnyArray, out: AnyArray) -> None:
    """Compare numbers; those that agree to 15 significant digits count as equal.

    Args:
        op: The comparison.
        left: Numbers, shape (draws,) or ().
        right: Numbers, likewise.
        out: Where the flags go, shape (draws,).
    """
    COMPARISONS[op](left, right, out=out)
    if left is right or _is_zero(left) or _is_zero(right):
        return  # nothing but zero is equal to zero
    apart = np.subtract(left, right)
    np.absolute(apart, out=apart)
    near = (apart <= np.absolute(left) * _NEARLY) & (apart != 0)
    if near.any():
        lefts, rights = np.broadcast_arrays(left, right)
        for draw in np.flatnonzero(near):
            if compare(float(lefts[draw]), float(rights[draw])) == 0:
                out[draw] = op in _HOLDS_WHEN_EQUAL


def _is_zero(array: AnyArray) -> bool:
    return not array.ndim and bool(array == 0)
