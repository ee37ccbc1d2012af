"""Tails and quantiles of distributions from the incomplete beta and gamma functions.

Each tail is computed by itself, never as one less the other, so that small probabilities keep their
digits. All functions take numbers or arrays that broadcast and raise nothing; call them with NumPy's
floating-point warnings off.

Source of the relations: Abramowitz and Stegun, sections 26.4 to 26.7.
"""

from __future__ import annotations

import numpy as np
from scipy.special import (
    betainc,
    betaincc,
    betainccinv,
    betaincinv,
    gammaincc,
    gammainccinv,
    gammaincinv,
    stdtr,
)

from cellsim.functions.encoded import FloatArray, Numbers


def gamma_quantile_above(shape: Numbers, probability: Numbers) -> FloatArray:
    """The standard gamma quantile that is exceeded with a probability in (0, 1]."""
    p = np.asarray(probability, dtype=np.float64)
    # 1 - p is exact from one half on, where the inverse of the upper tail is not reliable.
    return np.where(p < 0.5, gammainccinv(shape, p), gammaincinv(shape, 1 - p))


def chi_squared_above(x: Numbers, freedom: Numbers) -> FloatArray:
    """The probability that a chi-squared variable exceeds x >= 0."""
    return np.asarray(gammaincc(np.asarray(freedom) / 2, np.asarray(x) / 2))


def f_shares(x: Numbers, first: Numbers, second: Numbers) -> tuple[FloatArray, FloatArray]:
    """The beta variable that belongs to an F ratio x >= 0, and one less it."""
    ratio = np.asarray(x, dtype=np.float64) * (np.asarray(first, dtype=np.float64) / second)
    return 1 / (1 + 1 / ratio), 1 / (1 + ratio)


def f_below(x: Numbers, first: Numbers, second: Numbers) -> FloatArray:
    """The probability that an F variable with these degrees of freedom is at most x >= 0."""
    share, rest = f_shares(x, first, second)
    a, b = np.asarray(first) / 2, np.asarray(second) / 2
    return np.where(share < 0.5, betainc(a, b, share), betaincc(b, a, rest))


def f_above(x: Numbers, first: Numbers, second: Numbers) -> FloatArray:
    """The probability that an F variable with these degrees of freedom exceeds x >= 0."""
    share, rest = f_shares(x, first, second)
    a, b = np.asarray(first) / 2, np.asarray(second) / 2
    return np.where(share < 0.5, betaincc(a, b, share), betainc(b, a, rest))


def f_quantile(below: Numbers, above: Numbers, first: Numbers, second: Numbers) -> FloatArray:
    """The F quantile.

    Args:
        below: The probability up to it.
        above: 1 - below; of the two the smaller one counts.
        first: Degrees of freedom of the numerator.
        second: Degrees of freedom of the denominator.
    """
    a, b = np.asarray(first) / 2, np.asarray(second) / 2
    low, high = np.asarray(below, dtype=np.float64), np.asarray(above, dtype=np.float64)
    share = np.where(low < high, betaincinv(a, b, low), betainccinv(a, b, high))
    rest = np.where(low < high, betainccinv(b, a, low), betaincinv(b, a, high))
    return share / rest * (np.asarray(second, dtype=np.float64) / first)


def t_above(x: Numbers, freedom: Numbers) -> FloatArray:
    """The probability that a Student variable exceeds x; the degrees of freedom may be fractional."""
    return np.asarray(stdtr(freedom, -np.asarray(x, dtype=np.float64)))


def t_quantile_above(probability: Numbers, freedom: Numbers) -> FloatArray:
    """The Student quantile that is exceeded with a probability in (0, 1/2]."""
    half = np.asarray(freedom, dtype=np.float64) / 2
    both = 2 * np.asarray(probability, dtype=np.float64)
    share = betaincinv(half, 0.5, both)  # n / (n + t^2)
    rest = betainccinv(0.5, half, both)  # t^2 / (n + t^2)
    return np.asarray(np.sqrt(rest / share * freedom))
