"""Kernels that serve one draw and many alike: NumPy arithmetic with spreadsheet errors encoded in NaNs."""

from __future__ import annotations

from collections.abc import Callable
from functools import wraps
from typing import Any, TypeAlias, TypeVar

import numpy as np
import numpy.typing as npt

from cellsim.functions.registry import over_draws, spreadsheet_function
from cellsim.values import ErrorValue, decode_error, encode_error

FloatArray: TypeAlias = npt.NDArray[np.float64]
Numbers: TypeAlias = FloatArray | float
"""A number, or one for each draw."""

Condition: TypeAlias = npt.NDArray[np.bool_] | np.bool_ | bool

Kernel = TypeVar("Kernel", bound=Callable[..., FloatArray])

_NUM = encode_error(ErrorValue.NUM)


def checked(result: Numbers, *rules: tuple[Condition, ErrorValue]) -> FloatArray:
    """A result with errors put where they belong: the first rule that holds, #NUM! where infinite.

    Args:
        result: The numbers, whatever they are where a rule holds.
        rules: Conditions and the errors that they mean, the first taking precedence.
    """
    values = np.where(np.isfinite(result), result, _NUM)
    for condition, error in reversed(rules):
        values = np.where(condition, encode_error(error), values)
    return values


def chosen(
    flag: Numbers, if_set: Callable[[], FloatArray], if_not: Callable[[], FloatArray]
) -> FloatArray:
    """One of two results by a logical argument; both are computed only where draws differ in it.

    Args:
        flag: 0 or 1, one for all draws or one each.
        if_set: Gives the result where it is not 0.
        if_not: Gives the result where it is 0.
    """
    if np.ndim(flag):
        return np.where(np.not_equal(flag, 0), if_set(), if_not())
    return if_set() if flag else if_not()


def apart(
    condition: npt.NDArray[np.bool_],
    if_true: Callable[..., Any],
    if_false: Callable[..., Any],
    *numbers: FloatArray,
) -> FloatArray:
    """One of two results in each draw, each computed in its own draws only.

    The `where` argument of ufuncs would serve too, but SciPy's have been seen to write beyond their
    arrays with it (scipy.special.gammainccinv, SciPy 1.17).

    Args:
        condition: Which draws take the first result.
        if_true: Gives the result from the numbers of its draws.
        if_false: Likewise for the other draws.
        numbers: Arrays of the shape of the condition.
    """
    if condition.all():
        return np.asarray(if_true(*numbers))
    if not condition.any():
        return np.asarray(if_false(*numbers))
    found = np.empty(condition.shape)
    found[condition] = if_true(*(array[condition] for array in numbers))
    found[~condition] = if_false(*(array[~condition] for array in numbers))
    return found


def numeric_function(*names: str, strict: bool = False) -> Callable[[Kernel], Kernel]:
    """Register a kernel that serves one draw and many: for both forms under the same names.

    Its parameters are annotated as those of any kernel, and take a number or an array of them;
    `Whole` ones come not yet truncated over draws. It returns an array with errors encoded.

    Args:
        names: Names in upper case.
        strict: As for `spreadsheet_function`.
    """

    def register(kernel: Kernel) -> Kernel:
        over_draws(*names)(kernel)
        spreadsheet_function(*names, strict=strict)(single(kernel))
        return kernel

    return register


def single(kernel: Callable[..., FloatArray]) -> Callable[..., float | ErrorValue]:
    """A kernel over draws as a function of plain numbers."""

    @wraps(kernel)
    def call(*arguments: Any, **options: Any) -> float | ErrorValue:
        with np.errstate(all="ignore"):
            number = float(kernel(*arguments, **options))
        return number if number == number else decode_error(number)

    call.__annotations__ = {**kernel.__annotations__, "return": float}
    return call
