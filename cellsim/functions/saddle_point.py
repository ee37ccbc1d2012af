"""Probability masses and densities by the saddle-point expansion, over draws or for one.

Source: C. Loader, "Fast and accurate computation of binomial probabilities" (2000). Logarithms of
factorials of large numbers would cancel and lose up to half of the digits; the expansion takes
their Stirling errors and deviances instead, which stay small.

All functions take numbers or arrays that broadcast, and give float64 arrays. Arguments outside the
stated domains give numbers without meaning or NaN, never an exception; call them with NumPy's
floating-point warnings off.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.special import betaln, gammaln, xlogy, zeta

from cellsim.functions.encoded import FloatArray, Numbers

_SERIES_FROM = 16.0
"""From here five terms of Stirling's series are exact to double precision."""

_HALF_LOG_TWO_PI = 0.5 * np.log(2 * np.pi)
_EULER = float(np.euler_gamma)
_ZETA = [float((-1) ** k * zeta(k) / k) for k in range(2, 31)]
_NEAR = 0.25


def log_gamma(x: Numbers) -> FloatArray:
    """The logarithm of the gamma function of positive numbers.

    Near its zeros at 1 and 2 it is summed as a Taylor series (Abramowitz and Stegun, formula
    6.1.33), so that it keeps its relative accuracy there.
    """
    given = np.asarray(x, dtype=np.float64)
    base = np.where(given < 1.5, 1.0, 2.0)
    z = np.clip(given - base, -_NEAR, _NEAR)
    total = np.zeros_like(z)
    for coefficient in reversed(_ZETA):
        total = z * (coefficient + total)
    near = np.where(base == 2, np.log1p(z), 0.0) + z * (total - _EULER)
    return np.where(np.abs(given - base) < _NEAR, near, gammaln(given))


def stirling_error(n: Numbers) -> FloatArray:
    """The logarithm of n! less that of Stirling's formula, for n > 0, whole or not."""
    x = np.asarray(n, dtype=np.float64)
    direct = gammaln(x + 1) - (x + 0.5) * np.log(x) + x - _HALF_LOG_TWO_PI
    square = 1 / np.square(x)
    series = (
        1 / 12 - square * (1 / 360 - square * (1 / 1260 - square * (1 / 1680 - square / 1188)))
    ) / x
    return np.where(x < _SERIES_FROM, direct, series)


def log_beta(a: Numbers, b: Numbers) -> FloatArray:
    """The logarithm of the beta function of positive numbers, exact where one is much larger."""
    first, second = np.asarray(a, dtype=np.float64), np.asarray(b, dtype=np.float64)
    less, more = np.minimum(first, second), np.maximum(first, second)
    both = less + more
    expanded = (
        log_gamma(less)
        + less * (1 - np.log(both))
        - (more - 0.5) * np.log1p(less / more)
        + stirling_error(more)
        - stirling_error(both)
    )
    return np.where(more < _SERIES_FROM, betaln(less, more), expanded)


def deviance(x: Numbers, mean: Numbers) -> FloatArray:
    """The deviance x log(x / mean) + mean - x, for x >= 0 and mean > 0, exact where they are close."""
    given, m = np.asarray(x, dtype=np.float64), np.asarray(mean, dtype=np.float64)
    v = (given - m) / (given + m)
    square = np.square(v)
    series = np.zeros_like(square)
    for odd in range(33, 1, -2):
        series = square * (1 / odd + series)
    close = (given - m) * v + 2 * given * v * series
    return np.where(np.abs(v) < 0.25, close, xlogy(given, given / m) + m - given)


def poisson_mass(x: Numbers, mean: Numbers) -> FloatArray:
    """mean^x exp(-mean) / x!, for x >= 0, whole or not, and mean >= 0."""
    given, m = np.asarray(x, dtype=np.float64), np.asarray(mean, dtype=np.float64)
    direct = np.exp(xlogy(given, m) - m - gammaln(given + 1))
    expanded = np.exp(-stirling_error(given) - deviance(given, m)) / np.sqrt(2 * np.pi * given)
    found = np.where(given < _SERIES_FROM, direct, expanded)
    found = np.where(m == 0, np.where(given == 0, 1.0, 0.0), found)
    return np.where(np.isposinf(m) & np.isfinite(given), 0.0, found)


def gamma_density(x: Numbers, shape: Numbers) -> FloatArray:
    """The density of the standard gamma distribution for x >= 0; infinite or NaN at a pole."""
    a = np.asarray(shape, dtype=np.float64)
    low = a < 1
    mass = poisson_mass(np.where(low, a, a - 1), x)
    return np.where(low, a / np.asarray(x) * mass, mass)


def binomial_mass(x: Numbers, n: Numbers, p: Numbers, q: Numbers) -> FloatArray:
    """The binomial coefficient of n over x times p^x q^(n - x), for 0 <= x <= n, whole or not.

    Args:
        x: Successes.
        n: Attempts.
        p: Probability of success.
        q: 1 - p, given too because its digits may be known better than those of the difference.
    """
    successes, attempts = np.asarray(x, dtype=np.float64), np.asarray(n, dtype=np.float64)
    failures = attempts - successes
    exponent = (
        stirling_error(attempts)
        - stirling_error(successes)
        - stirling_error(failures)
        - deviance(successes, attempts * p)
        - deviance(failures, attempts * q)
    )
    found = np.exp(exponent) * np.sqrt(attempts / (2 * np.pi * successes * failures))
    found = np.where((np.asarray(p) == 0) | (np.asarray(q) == 0), 0.0, found)
    found = np.where(failures == 0, _power(attempts, p, q), found)
    return np.where(successes == 0, _power(attempts, q, p), found)


def beta_density(share: Numbers, rest: Numbers, a: Numbers, b: Numbers) -> FloatArray:
    """The density of the beta distribution at a share of 0 to 1, of which the rest is given too."""
    first, second = np.asarray(a, dtype=np.float64), np.asarray(b, dtype=np.float64)
    logarithm = np.where(np.asarray(share) < 0.5, np.log1p(-np.asarray(share)), np.log(rest))
    direct = np.exp(
        xlogy(first - 1, share)
        + np.where(second == 1, 0.0, (second - 1) * logarithm)
        - log_beta(first, second)
    )
    last = first + second - 1
    expanded = last * binomial_mass(first - 1, last - 1, share, rest)
    return np.where((first <= 2) | (second <= 2), direct, expanded)


def _power(n: FloatArray, base: Numbers, rest: Numbers) -> FloatArray:
    """base^n, where rest = 1 - base holds the digits that a base near 1 has lost."""
    one: npt.NDArray[np.float64] = np.asarray(base, dtype=np.float64)
    logarithm = np.where(one > 0.5, np.log1p(-np.asarray(rest, dtype=np.float64)), np.log(one))
    return np.where(n == 0, 1.0, np.exp(n * logarithm))
