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

from cellsim.functions.encoded import FloatArray, Numbers, apart
from cellsim.functions.saddle_point import beta_density, log_beta


def gamma_quantile_above(shape: Numbers, probability: Numbers) -> FloatArray:
    """The standard gamma quantile that is exceeded with a probability in (0, 1]."""
    p = np.asarray(probability, dtype=np.float64)
    # 1 - p is exact from one half on, where the inverse of the upper tail is not reliable.
    a, above = np.broadcast_arrays(np.asarray(shape, dtype=np.float64), p)
    return apart(
        above < 0.5,
        gammainccinv,
        lambda a, p: gammaincinv(a, 1 - p),
        a,
        above,
    )


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
    return _beta_below(np.asarray(first) / 2, np.asarray(second) / 2, share, rest)


def f_above(x: Numbers, first: Numbers, second: Numbers) -> FloatArray:
    """The probability that an F variable with these degrees of freedom exceeds x >= 0."""
    share, rest = f_shares(x, first, second)
    return _beta_below(np.asarray(second) / 2, np.asarray(first) / 2, rest, share)


def _beta_below(a: Numbers, b: Numbers, share: FloatArray, rest: FloatArray) -> FloatArray:
    """The cumulative beta distribution at a share, from whichever of the two has more digits."""
    first, second, at, beyond = np.broadcast_arrays(
        *(np.asarray(number, dtype=np.float64) for number in (a, b, share, rest))
    )
    return apart(
        at < 0.5,
        lambda a, b, x, _: betainc(a, b, x),
        lambda a, b, _, y: betaincc(b, a, y),
        first,
        second,
        at,
        beyond,
    )


def beta_shares(
    a: Numbers, b: Numbers, below: Numbers, above: Numbers
) -> tuple[FloatArray, FloatArray]:
    """The quantile of the beta distribution, and one less it.

    Args:
        a: Its first parameter.
        b: Its second parameter.
        below: The probability up to the quantile.
        above: 1 - below; of the two the smaller one counts.
    """
    first, second, low, high = np.broadcast_arrays(
        *(np.asarray(number, dtype=np.float64) for number in (a, b, below, above))
    )
    turned = low > high
    share, rest = _beta_shares_of_tail(
        np.where(turned, second, first),
        np.where(turned, first, second),
        np.where(turned, high, low),
    )
    return np.where(turned, rest, share), np.where(turned, share, rest)


_SMALL = 1e-8
_RARE = 1e-12


def _beta_shares_of_tail(
    a: FloatArray, b: FloatArray, p: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Both shares for a probability of at most one half.

    SciPy's inverse fails on very small quantiles and loses digits far out in the tail. The former
    come from the power series of the incomplete beta function (DLMF 8.17.7) here, the latter are
    improved by Newton's method on logarithms.
    """
    leading = np.exp((np.log(p) + np.log(a) + log_beta(a, b)) / a)
    series = leading * (1 + (b - 1) / (a + 1) * leading)
    small = leading * (1 + b) < _SMALL
    found = betaincinv(a, b, p)
    share = np.where(small, series, np.where(np.isnan(found), leading, found))
    rest = apart(share < 0.9, lambda x, *_: 1 - x, lambda _, *of: betainccinv(*of), share, b, a, p)
    far = ~small & (p < _RARE)
    lost = far & ~(np.abs(np.log(betainc(a, b, share) / p)) < 1)
    if np.any(lost):
        share[lost] = _bisected(a[lost], b[lost], p[lost], leading[lost])
        rest[lost] = 1 - share[lost]
    if np.any(far):
        for _ in range(4):
            reached = betainc(a, b, share)
            slope = beta_density(share, rest, a, b)
            step = np.where(reached > 0, np.log(reached / p) * reached / slope, 0.0)
            step = np.where(far & np.isfinite(step), step, 0.0)
            share, rest = share - step, rest + step
    return share, rest


def _bisected(a: FloatArray, b: FloatArray, p: FloatArray, leading: FloatArray) -> FloatArray:
    """A quantile far below the mean, by bisection of its logarithm."""
    # The series' further terms are a factor of at most (1 - x)^(b - 1), 100 for any x up to 0.99.
    low = np.log(np.minimum(leading * 100 ** (-1 / a), 0.5))
    high = np.log(a / (a + b))
    for _ in range(60):
        middle = (low + high) / 2
        above = betainc(a, b, np.exp(middle)) >= p
        low, high = np.where(above, low, middle), np.where(above, middle, high)
    return np.exp(high)


def f_quantile(below: Numbers, above: Numbers, first: Numbers, second: Numbers) -> FloatArray:
    """The F quantile.

    Args:
        below: The probability up to it.
        above: 1 - below; of the two the smaller one counts.
        first: Degrees of freedom of the numerator.
        second: Degrees of freedom of the denominator.
    """
    share, rest = beta_shares(np.asarray(first) / 2, np.asarray(second) / 2, below, above)
    return share / rest * (np.asarray(second, dtype=np.float64) / first)


def t_above(x: Numbers, freedom: Numbers) -> FloatArray:
    """The probability that a Student variable exceeds x; the degrees of freedom may be fractional."""
    return np.asarray(stdtr(freedom, -np.asarray(x, dtype=np.float64)))


def t_quantile_above(probability: Numbers, freedom: Numbers) -> FloatArray:
    """The Student quantile that is exceeded with a probability in (0, 1/2]."""
    both = 2 * np.asarray(probability, dtype=np.float64)
    # The shares are n / (n + t^2) and t^2 / (n + t^2).
    share, rest = beta_shares(np.asarray(freedom) / 2, 0.5, both, 1 - both)
    return np.asarray(np.sqrt(rest / share * freedom))
