"""Tests of hypotheses about means, variances and counts; each gives a probability.

Source of the statistics: NIST/SEMATECH e-Handbook of Statistical Methods, sections 1.3.5.3 (t tests,
with Welch's degrees of freedom), 1.3.5.9 (F test), 7.2.2 (tests of a mean), 7.4.5 (contingency
tables). What becomes of text, blanks and errors is common practice, as stored values show.
"""

from __future__ import annotations

import numpy as np
from scipy.special import ndtr

from cellsim.functions.encoded import FloatArray, Numbers, checked, single
from cellsim.functions.least_squares import paired_numbers, refuse_errors
from cellsim.functions.probability_tails import chi_squared_above, f_above, f_below, t_above
from cellsim.functions.registry import (
    ArrayValues,
    Number,
    Stack,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, encode_error

_NUM, _DIV0, _NA = ErrorValue.NUM, ErrorValue.DIV0, ErrorValue.NA
_NUM_CODE = encode_error(_NUM)


def _numbers(values: Array) -> FloatArray:
    """The numbers among values, text, logicals and blanks passed over.

    Raises:
        Fault: An item is an error.
    """
    refuse_errors(*values.items)
    return np.array([item for item in values.items if type(item) is float])


def _total(items: FloatArray) -> FloatArray:
    """Sums over items one by one, so that none depends on how many draws stand beside it."""
    return np.asarray(np.cumsum(items, axis=0)[-1])


def _moments(items: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Means and sample variances of at least two items; these are 0 where all items are equal."""
    shifted = items - items[0]
    mean = _total(shifted) / len(items)
    return items[0] + mean, _total(np.square(shifted - mean)) / (len(items) - 1)


def _paired(first: FloatArray, second: FloatArray, tails: Numbers) -> FloatArray:
    """The t test of pairs."""
    mean, variance = _moments(first - second)
    return _t_probability(mean, variance / len(first), len(first) - 1.0, tails)


def _equal_variances(first: FloatArray, second: FloatArray, tails: Numbers) -> FloatArray:
    """The t test of two samples with a common variance."""
    n, m = len(first), len(second)
    (mean_a, variance_a), (mean_b, variance_b) = _moments(first), _moments(second)
    pooled = ((n - 1) * variance_a + (m - 1) * variance_b) / (n + m - 2)
    return _t_probability(mean_a - mean_b, pooled * (1 / n + 1 / m), n + m - 2.0, tails)


def _unequal_variances(first: FloatArray, second: FloatArray, tails: Numbers) -> FloatArray:
    """The t test of two samples with variances of their own, by Welch's degrees of freedom."""
    n, m = len(first), len(second)
    (mean_a, variance_a), (mean_b, variance_b) = _moments(first), _moments(second)
    part_a, part_b = variance_a / n, variance_b / m
    share = part_a / (part_a + part_b)
    freedom = 1 / (np.square(share) / (n - 1) + np.square(1 - share) / (m - 1))
    return _t_probability(mean_a - mean_b, part_a + part_b, freedom, tails)


def _t_probability(
    difference: FloatArray, variance: FloatArray, freedom: Numbers, tails: Numbers
) -> FloatArray:
    """The probability of so large a difference of means, from its estimated variance."""
    found = np.asarray(tails) * t_above(np.abs(difference) / np.sqrt(variance), freedom)
    return checked(found, (variance == 0, _DIV0))


_KINDS = {1: _paired, 2: _equal_variances, 3: _unequal_variances}


def _t_test(first: FloatArray, second: FloatArray, tails: Numbers, kind: int) -> FloatArray:
    if kind == 1 and len(first) != len(second):
        return checked(0.0, (True, _NA))
    if len(first) < 2 or len(second) < 2:
        return checked(0.0, (True, _DIV0))
    return _KINDS[kind](first, second, tails)


@spreadsheet_function("T.TEST", "TTEST")
def t_test(
    first: ArrayValues, second: ArrayValues, tails: Whole, kind: Whole
) -> float | ErrorValue:
    """The probability of so large a difference of means: of pairs, or of samples (kinds 2 and 3)."""
    if tails not in {1, 2} or kind not in _KINDS:
        return _NUM
    if kind == 1:
        x, y = (np.array(numbers) for numbers in paired_numbers(first, second))
    else:
        x, y = _numbers(first), _numbers(second)
    return single(_t_test)(x, y, float(tails), kind)


@over_draws("T.TEST", "TTEST")
def t_test_over_draws(first: Stack, second: Stack, tails: Numbers, kind: Numbers) -> FloatArray:
    """T.TEST over draws."""
    count, which = np.trunc(np.asarray(tails)), np.trunc(np.asarray(kind))
    found = np.full(first.data.shape[1], _NUM_CODE)
    for number in _KINDS:
        if np.any(which == number):
            probability = _t_test(first.data, second.data, count, number)
            found = np.where(which == number, probability, found)
    return np.where((count == 1) | (count == 2), found, _NUM_CODE)


def _f_test(first: FloatArray, second: FloatArray) -> FloatArray:
    if len(first) < 2 or len(second) < 2:
        return checked(0.0, (True, _DIV0))
    (_, variance_a), (_, variance_b) = _moments(first), _moments(second)
    ratio, freedoms = variance_a / variance_b, (len(first) - 1.0, len(second) - 1.0)
    tail = np.minimum(f_below(ratio, *freedoms), f_above(ratio, *freedoms))
    return checked(2 * tail, ((variance_a == 0) | (variance_b == 0), _DIV0))


@spreadsheet_function("F.TEST", "FTEST")
def f_test(first: ArrayValues, second: ArrayValues) -> float | ErrorValue:
    """The probability, in both tails, of so unequal variances of two samples."""
    return single(_f_test)(_numbers(first), _numbers(second))


@over_draws("F.TEST", "FTEST")
def f_test_over_draws(first: Stack, second: Stack) -> FloatArray:
    """F.TEST over draws."""
    return _f_test(first.data, second.data)


def _z_test(items: FloatArray, mean: Numbers, deviation: Numbers | None) -> FloatArray:
    outside = False if deviation is None else np.asarray(deviation) <= 0
    if len(items) < 2:
        return checked(0.0, (outside, _NUM), (True, _DIV0 if len(items) else _NA))
    found, variance = _moments(items)
    spread = np.sqrt(variance) if deviation is None else np.asarray(deviation)
    z = (found - mean) / (spread / np.sqrt(len(items)))
    return checked(ndtr(-z), (outside, _NUM), (spread == 0, _DIV0))


@spreadsheet_function("Z.TEST", "ZTEST")
def z_test(
    values: ArrayValues, mean: Number, deviation: Number | None = None
) -> float | ErrorValue:
    """The probability that the mean of a sample would be larger, if a mean were the true one."""
    return single(_z_test)(_numbers(values), mean, deviation)


@over_draws("Z.TEST", "ZTEST")
def z_test_over_draws(values: Stack, mean: Numbers, deviation: Numbers | None = None) -> FloatArray:
    """Z.TEST over draws."""
    return _z_test(values.data, mean, deviation)


def _chi_squared_test(
    observed: FloatArray, expected: FloatArray, rows: int, columns: int
) -> FloatArray:
    freedom = (rows - 1) * (columns - 1) if rows > 1 and columns > 1 else rows * columns - 1
    if not freedom:
        return checked(0.0, (True, _NA))
    if not len(observed):
        return checked(0.0, (True, _DIV0))
    statistic = _total(np.square(observed - expected) / expected)
    without = (expected == 0).any(axis=0)
    return checked(chi_squared_above(statistic, freedom), (without, _DIV0), (statistic < 0, _NUM))


@spreadsheet_function("CHISQ.TEST", "CHITEST")
def chi_squared_test(observed: ArrayValues, expected: ArrayValues) -> float | ErrorValue:
    """The probability that chance alone takes counts so far from those expected."""
    if len(observed.items) != len(expected.items):
        return _NA
    refuse_errors(*observed.items, *expected.items)
    x, y = (np.array(numbers) for numbers in paired_numbers(observed, expected))
    return single(_chi_squared_test)(x, y, observed.rows, observed.columns)


@over_draws("CHISQ.TEST", "CHITEST")
def chi_squared_test_over_draws(observed: Stack, expected: Stack) -> FloatArray:
    """CHISQ.TEST over draws."""
    if len(observed.data) != len(expected.data):
        return checked(0.0, (True, _NA))
    return _chi_squared_test(observed.data, expected.data, observed.rows, observed.columns)
