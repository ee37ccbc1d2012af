"""The distributions of sample statistics: chi-squared, F and Student's t."""

from __future__ import annotations

import numpy as np
from scipy.special import gammainc, gammaincinv

from cellsim.functions.encoded import (
    Condition,
    FloatArray,
    Numbers,
    checked,
    chosen,
    numeric_function,
)
from cellsim.functions.probability_tails import (
    chi_squared_above,
    f_above,
    f_below,
    f_quantile,
    f_shares,
    gamma_quantile_above,
    t_above,
    t_quantile_above,
)
from cellsim.functions.registry import Logical, Number, Whole
from cellsim.functions.saddle_point import binomial_mass, gamma_density, stirling_error
from cellsim.values import ErrorValue

_NUM, _DIV0 = ErrorValue.NUM, ErrorValue.DIV0
_MOST_FREEDOM = 1e10
"""Common practice: more degrees of freedom are refused."""


def _float(number: Numbers) -> FloatArray:
    return np.asarray(number, dtype=np.float64)


def _truncated(number: Numbers) -> FloatArray:
    return np.trunc(_float(number))


def _outside(*freedoms: FloatArray) -> Condition:
    found: Condition = False
    for freedom in freedoms:
        found = found | (freedom < 1) | (freedom > _MOST_FREEDOM)
    return found


@numeric_function("CHISQ.DIST")
def chi_squared(x: Number, freedom: Whole, cumulative: Logical) -> FloatArray:
    """The chi-squared distribution: cumulative, or its density."""
    at, n = _float(x), _truncated(freedom)
    shape, ratio = n / 2, at / 2
    found = chosen(
        cumulative, lambda: gammainc(shape, ratio), lambda: gamma_density(ratio, shape) / 2
    )
    return checked(found, ((at < 0) | _outside(n), _NUM))


@numeric_function("CHISQ.DIST.RT", "CHIDIST")
def chi_squared_upper_tail(x: Number, freedom: Whole) -> FloatArray:
    """The probability that a chi-squared variable exceeds a value."""
    at, n = _float(x), _truncated(freedom)
    return checked(chi_squared_above(at, n), ((at < 0) | _outside(n), _NUM))


@numeric_function("CHISQ.INV")
def chi_squared_quantile(probability: Number, freedom: Whole) -> FloatArray:
    """The chi-squared quantile."""
    p, n = _float(probability), _truncated(freedom)
    return checked(2 * gammaincinv(n / 2, p), ((p < 0) | (p >= 1) | _outside(n), _NUM))


@numeric_function("CHISQ.INV.RT", "CHIINV")
def chi_squared_exceeded(probability: Number, freedom: Whole) -> FloatArray:
    """The chi-squared value that is exceeded with a probability."""
    p, n = _float(probability), _truncated(freedom)
    found = 2 * gamma_quantile_above(n / 2, p)
    return checked(found, ((p <= 0) | (p > 1) | _outside(n), _NUM))


@numeric_function("F.DIST")
def f_distribution(
    x: Number, numerator: Whole, denominator: Whole, cumulative: Logical
) -> FloatArray:
    """The F distribution: cumulative, or its density."""
    at, m, n = _float(x), _truncated(numerator), _truncated(denominator)
    found = chosen(cumulative, lambda: f_below(at, m, n), lambda: _f_density(at, m, n))
    return checked(found, ((at < 0) | _outside(m, n), _NUM))


def _f_density(x: FloatArray, m: FloatArray, n: FloatArray) -> FloatArray:
    """The density through a binomial mass; with m below 2 it is infinite at 0."""
    share, rest = f_shares(x, m, n)
    low = m / (m + n) / share * binomial_mass(m / 2, (m + n) / 2, share, rest)
    usual = binomial_mass((m - 2) / 2, (m + n - 2) / 2, share, rest)
    return m * rest / 2 * np.where(m < 2, low, usual)


@numeric_function("F.DIST.RT", "FDIST")
def f_upper_tail(x: Number, numerator: Whole, denominator: Whole) -> FloatArray:
    """The probability that an F variable exceeds a value."""
    at, m, n = _float(x), _truncated(numerator), _truncated(denominator)
    return checked(f_above(at, m, n), ((at < 0) | _outside(m, n), _NUM))


@numeric_function("F.INV")
def f_value(probability: Number, numerator: Whole, denominator: Whole) -> FloatArray:
    """The F quantile."""
    p, m, n = _float(probability), _truncated(numerator), _truncated(denominator)
    return checked(f_quantile(p, 1 - p, m, n), ((p < 0) | (p >= 1) | _outside(m, n), _NUM))


@numeric_function("F.INV.RT", "FINV")
def f_exceeded(probability: Number, numerator: Whole, denominator: Whole) -> FloatArray:
    """The F value that is exceeded with a probability."""
    p, m, n = _float(probability), _truncated(numerator), _truncated(denominator)
    return checked(f_quantile(1 - p, p, m, n), ((p <= 0) | (p > 1) | _outside(m, n), _NUM))


@numeric_function("T.DIST")
def student(x: Number, freedom: Whole, cumulative: Logical) -> FloatArray:
    """Student's distribution: cumulative, or its density."""
    at, n = _float(x), _truncated(freedom)
    found = chosen(cumulative, lambda: t_above(-at, n), lambda: _t_density(at, n))
    # The density's constant divides by the degrees of freedom: stored values show #DIV/0! for none.
    return checked(found, (np.equal(cumulative, 0) & (n == 0), _DIV0), (_outside(n), _NUM))


def _t_density(x: FloatArray, n: FloatArray) -> FloatArray:
    """The density, its constant from Stirling errors, since that of gamma functions would cancel."""
    half = n / 2
    # Gamma(half + 1/2) / (sqrt(half) Gamma(half)), by n! = Gamma(n + 1) and Stirling's formula
    constant = stirling_error(half + 0.5) - stirling_error(half) + half * np.log1p(0.5 / half) - 0.5
    ratio = np.abs(x) / np.sqrt(n)
    spread = np.where(ratio > 1e150, np.log(ratio), np.log1p(np.square(ratio)) / 2)
    return np.asarray(np.exp(constant - (n + 1) * spread) / np.sqrt(2 * np.pi))


@numeric_function("T.DIST.RT")
def student_upper_tail(x: Number, freedom: Whole) -> FloatArray:
    """The probability that a Student variable exceeds a value."""
    n = _truncated(freedom)
    return checked(t_above(x, n), (_outside(n), _NUM))


@numeric_function("T.DIST.2T")
def student_both_tails(x: Number, freedom: Whole) -> FloatArray:
    """The probability that a Student variable exceeds a value in size."""
    at, n = _float(x), _truncated(freedom)
    return checked(2 * t_above(at, n), ((at < 0) | _outside(n), _NUM))


@numeric_function("TDIST")
def student_tails(x: Number, freedom: Whole, tails: Whole) -> FloatArray:
    """The probability that a Student variable exceeds a value, in one tail or both."""
    at, n, count = _float(x), _truncated(freedom), _truncated(tails)
    return checked(
        count * t_above(at, n),
        ((at < 0) | _outside(n) | ((count != 1) & (count != 2)), _NUM),
    )


@numeric_function("T.INV")
def student_quantile(probability: Number, freedom: Whole) -> FloatArray:
    """Student's quantile."""
    p, n = _float(probability), _truncated(freedom)
    size = t_quantile_above(np.minimum(p, 1 - p), n)
    return checked(np.where(p < 0.5, -size, size), ((p <= 0) | (p >= 1) | _outside(n), _NUM))


@numeric_function("T.INV.2T", "TINV")
def student_exceeded(probability: Number, freedom: Whole) -> FloatArray:
    """The size that a Student variable exceeds with a probability."""
    p, n = _float(probability), _truncated(freedom)
    return checked(t_quantile_above(p / 2, n), ((p <= 0) | (p > 1) | _outside(n), _NUM))


@numeric_function("CONFIDENCE.T")
def confidence_half_width(alpha: Number, deviation: Number, size: Whole) -> FloatArray:
    """Half the width of Student's confidence interval of a mean."""
    a, s, n = _float(alpha), _float(deviation), _truncated(size)
    return checked(
        t_quantile_above(a / 2, n - 1) * s / np.sqrt(n),
        ((a <= 0) | (a >= 1) | (s <= 0) | (n < 1), _NUM),
        (n == 1, _DIV0),
    )
