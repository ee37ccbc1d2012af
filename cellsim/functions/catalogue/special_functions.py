"""Bessel functions, the error function, and steps.

Stored Bessel values of spreadsheet programs are off in the eighth digit where they come from short
polynomials: I0(1) is stored as Abramowitz and Stegun 9.8.1 gives it, to the last digit. The functions
here are exact to double precision instead.
"""

from __future__ import annotations

import numpy as np
from scipy.special import erf, erfc, iv, jv, kn, yn

from cellsim.functions.encoded import checked, numeric_function
from cellsim.functions.registry import FloatArray, Number, Whole, over_draws, spreadsheet_function
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM


def _need_order(order: int) -> None:
    if order < 0:
        raise Fault(_NUM)


@spreadsheet_function("BESSELI", strict=True)
def bessel_i(x: Number, order: Whole) -> float:
    """The modified Bessel function of the first kind, of a whole order."""
    _need_order(order)
    return float(iv(order, x))


@spreadsheet_function("BESSELJ", strict=True)
def bessel_j(x: Number, order: Whole) -> float:
    """The Bessel function of the first kind, of a whole order."""
    _need_order(order)
    return float(jv(order, x))


@spreadsheet_function("BESSELK", strict=True)
def bessel_k(x: Number, order: Whole) -> float:
    """The modified Bessel function of the second kind, of a whole order."""
    _need_order(order)
    if x <= 0:
        raise Fault(_NUM)
    return float(kn(order, x))


@spreadsheet_function("BESSELY", strict=True)
def bessel_y(x: Number, order: Whole) -> float:
    """The Bessel function of the second kind, of a whole order."""
    _need_order(order)
    if x <= 0:
        raise Fault(_NUM)
    return float(yn(order, x))


@spreadsheet_function("ERF", strict=True)
def error_function(lower: Number, upper: Number | None = None) -> float:
    """The error function between two limits, or from 0 to one."""
    return float(erf(lower)) if upper is None else float(erf(upper) - erf(lower))


@over_draws("ERF")
def error_function_over_draws(
    lower: FloatArray | float, upper: FloatArray | float | None = None
) -> FloatArray:
    """ERF over draws."""
    return np.asarray(erf(lower) if upper is None else erf(upper) - erf(lower))


@numeric_function("ERF.PRECISE", strict=True)
def error_function_from_zero(x: Number) -> FloatArray:
    """The error function from 0 to a limit."""
    return np.asarray(erf(x))


@numeric_function("ERFC", "ERFC.PRECISE", strict=True)
def complementary_error_function(x: Number) -> FloatArray:
    """The error function from a limit to infinity."""
    return np.asarray(erfc(x))


@numeric_function("DELTA", strict=True)
def equal(first: Number, second: Number = 0.0) -> FloatArray:
    """1 if two numbers are equal, else 0."""
    return checked(np.equal(first, second).astype(np.float64))


@numeric_function("GESTEP", strict=True)
def at_least(number: Number, step: Number = 0.0) -> FloatArray:
    """1 if a number is at least as large as a step, else 0."""
    return checked(np.greater_equal(number, step).astype(np.float64))
