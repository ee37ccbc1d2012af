"""Whole numbers as rows of 48 bits."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.functions.encoded import Numbers, checked, numeric_function
from cellsim.functions.registry import FloatArray, Number
from cellsim.values import ErrorValue

_LARGEST = float(2**48 - 1)
_FARTHEST = 53
_NUM = ErrorValue.NUM

Whole64 = npt.NDArray[np.int64]


def _outside(number: Numbers) -> npt.NDArray[np.bool_]:
    """Where a number is none of the 48-bit whole numbers."""
    values = np.asarray(number, dtype=np.float64)
    inside: npt.NDArray[np.bool_] = (
        (values >= 0) & (values <= _LARGEST) & (values == np.trunc(values))
    )
    return ~inside


def _whole(number: Numbers, bad: npt.NDArray[np.bool_]) -> Whole64:
    return np.where(bad, 0.0, number).astype(np.int64)


def _combined(
    operation: Callable[[Whole64, Whole64], Any], first: Numbers, second: Numbers
) -> FloatArray:
    bad, bad_too = _outside(first), _outside(second)
    found = operation(_whole(first, bad), _whole(second, bad_too)).astype(np.float64)
    return checked(found, (bad | bad_too, _NUM))


@numeric_function("BITAND")
def bits_in_both(first: Number, second: Number) -> FloatArray:
    """The bits that two numbers have in common."""
    return _combined(np.bitwise_and, first, second)


@numeric_function("BITOR")
def bits_in_either(first: Number, second: Number) -> FloatArray:
    """The bits that at least one of two numbers has."""
    return _combined(np.bitwise_or, first, second)


@numeric_function("BITXOR")
def bits_in_one(first: Number, second: Number) -> FloatArray:
    """The bits that exactly one of two numbers has."""
    return _combined(np.bitwise_xor, first, second)


def _shifted(number: Numbers, left: Numbers) -> FloatArray:
    # A float holds every product exactly, as it only changes the exponent.
    bad = _outside(number)
    far = ~(np.abs(left) <= _FARTHEST)
    found = np.floor(np.ldexp(np.where(bad, 0.0, number), np.where(far, 0, left).astype(np.int32)))
    return checked(found, (bad | far | (found > _LARGEST), _NUM))


@numeric_function("BITLSHIFT")
def shifted_left(number: Number, places: Number) -> FloatArray:
    """A number with its bits moved to the left (to the right where negative)."""
    return _shifted(number, np.trunc(places))


@numeric_function("BITRSHIFT")
def shifted_right(number: Number, places: Number) -> FloatArray:
    """A number with its bits moved to the right (to the left where negative)."""
    return _shifted(number, -np.trunc(places))
