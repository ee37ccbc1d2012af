"""Interest rates and prices written in other ways."""

from __future__ import annotations

import numpy as np

from cellsim.functions.encoded import FloatArray, checked, numeric_function
from cellsim.functions.registry import Number, Whole
from cellsim.values import ErrorValue

_NUM, _DIV0 = ErrorValue.NUM, ErrorValue.DIV0


@numeric_function("EFFECT", strict=True)
def effective_rate(nominal: Number, periods: Whole) -> FloatArray:
    """The yearly rate with compounding of a nominal one."""
    rate, count = np.asarray(nominal), np.trunc(periods)
    result = np.expm1(count * np.log1p(rate / count))
    return checked(result, ((rate <= 0) | (count < 1), _NUM))


@numeric_function("NOMINAL", strict=True)
def nominal_rate(effective: Number, periods: Whole) -> FloatArray:
    """The nominal rate of a yearly one with compounding."""
    rate, count = np.asarray(effective), np.trunc(periods)
    result = count * np.expm1(np.log1p(rate) / count)
    return checked(result, ((rate <= 0) | (count < 1), _NUM))


@numeric_function("PDURATION")
def periods_to_reach(rate: Number, present: Number, future: Number) -> FloatArray:
    """The periods that an investment takes to reach a value."""
    r, begin, end = np.asarray(rate), np.asarray(present), np.asarray(future)
    result = (np.log(end) - np.log(begin)) / np.log1p(r)
    return checked(result, ((r <= 0) | (begin <= 0) | (end <= 0), _NUM))


@numeric_function("RRI")
def equivalent_rate(periods: Number, present: Number, future: Number) -> FloatArray:
    """The rate at which an amount grows to another."""
    count, begin, end = np.asarray(periods), np.asarray(present), np.asarray(future)
    result = np.power(end / begin, 1 / count) - 1
    return checked(result, ((count <= 0) | (begin == 0) | (end / begin < 0), _NUM))


def _digits(fraction: FloatArray) -> FloatArray:
    """The power of ten that holds the top of a fraction with this bottom."""
    return np.power(10.0, np.ceil(np.log10(np.maximum(fraction, 1.0))))


@numeric_function("DOLLARDE", strict=True)
def decimal_price(price: Number, fraction: Whole) -> FloatArray:
    """A price in fractions as a decimal one."""
    bottom, whole = np.trunc(fraction), np.trunc(price)
    result = whole + (price - whole) * _digits(bottom) / bottom
    return checked(result, (np.asarray(fraction) < 0, _NUM), (bottom == 0, _DIV0))


@numeric_function("DOLLARFR", strict=True)
def fractional_price(price: Number, fraction: Whole) -> FloatArray:
    """A decimal price in fractions."""
    bottom, whole = np.trunc(fraction), np.trunc(price)
    result = whole + (price - whole) * bottom / _digits(bottom)
    return checked(result, (np.asarray(fraction) < 0, _NUM), (bottom == 0, _DIV0))
