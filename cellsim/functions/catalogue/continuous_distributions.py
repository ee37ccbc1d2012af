"""Beta, gamma, exponential and Weibull distributions, the gamma function, Fisher's transformation."""

from __future__ import annotations

import numpy as np
from scipy.special import betainc, betaincinv, betaln, gamma, gammainc, gammaincinv, xlog1py, xlogy

from cellsim.functions.encoded import FloatArray, Numbers, checked, numeric_function
from cellsim.functions.registry import Logical, Number
from cellsim.functions.saddle_point import binomial_mass, log_gamma, poisson_mass
from cellsim.values import ErrorValue

_NUM = ErrorValue.NUM


def _floats(*numbers: Numbers) -> list[FloatArray]:
    return [np.asarray(number, dtype=np.float64) for number in numbers]


def _beta_density(share: FloatArray, rest: FloatArray, a: FloatArray, b: FloatArray) -> FloatArray:
    direct = np.exp(xlogy(a - 1, share) + xlog1py(b - 1, -share) - betaln(a, b))
    expanded = (a + b - 1) * binomial_mass(a - 1, a + b - 2, share, rest)
    return np.where((a <= 2) | (b <= 2), direct, expanded)


@numeric_function("BETA.DIST")
def beta_distribution(
    x: Number,
    alpha: Number,
    beta: Number,
    cumulative: Logical,
    low: Number = 0.0,
    high: Number = 1.0,
) -> FloatArray:
    """The beta distribution between two limits: cumulative, or its density."""
    at, a, b, start, end = _floats(x, alpha, beta, low, high)
    width = end - start
    share = (at - start) / width
    density = _beta_density(share, (end - at) / width, a, b) / width
    return checked(
        np.where(np.asarray(cumulative) != 0, betainc(a, b, share), density),
        ((a <= 0) | (b <= 0) | (at < start) | (at > end) | (start >= end), _NUM),
    )


@numeric_function("BETADIST")
def beta_cumulative(
    x: Number, alpha: Number, beta: Number, low: Number = 0.0, high: Number = 1.0
) -> FloatArray:
    """The cumulative beta distribution between two limits."""
    at, a, b, start, end = _floats(x, alpha, beta, low, high)
    return checked(
        np.asarray(betainc(a, b, (at - start) / (end - start)), dtype=np.float64),
        ((a <= 0) | (b <= 0) | (at < start) | (at > end) | (start >= end), _NUM),
    )


@numeric_function("BETA.INV", "BETAINV")
def beta_quantile(
    probability: Number, alpha: Number, beta: Number, low: Number = 0.0, high: Number = 1.0
) -> FloatArray:
    """The quantile of the beta distribution between two limits."""
    p, a, b, start, end = _floats(probability, alpha, beta, low, high)
    return checked(
        start + (end - start) * betaincinv(a, b, p),
        ((p <= 0) | (p > 1) | (a <= 0) | (b <= 0) | (start >= end), _NUM),
    )


@numeric_function("EXPON.DIST", "EXPONDIST")
def exponential(x: Number, rate: Number, cumulative: Logical) -> FloatArray:
    """The exponential distribution: cumulative, or its density."""
    at, of = _floats(x, rate)
    product = of * at
    found = np.where(np.asarray(cumulative) != 0, -np.expm1(-product), of * np.exp(-product))
    return checked(found, ((at < 0) | (of <= 0), _NUM))


@numeric_function("WEIBULL.DIST", "WEIBULL")
def weibull(x: Number, shape: Number, scale: Number, cumulative: Logical) -> FloatArray:
    """The Weibull distribution: cumulative, or its density."""
    at, a, b = _floats(x, shape, scale)
    ratio = at / b
    hazard = np.power(ratio, a)
    survival = np.exp(-hazard)
    # Far out the power in the density may overflow where the survival has long become zero.
    density = np.where(survival == 0, 0.0, a / b * np.power(ratio, a - 1) * survival)
    found = np.where(np.asarray(cumulative) != 0, -np.expm1(-hazard), density)
    return checked(found, ((at < 0) | (a <= 0) | (b <= 0), _NUM))


@numeric_function("GAMMA.DIST", "GAMMADIST")
def gamma_distribution(x: Number, shape: Number, scale: Number, cumulative: Logical) -> FloatArray:
    """The gamma distribution: cumulative, or its density."""
    at, a, b = _floats(x, shape, scale)
    ratio = at / b
    low_shape = a / ratio * poisson_mass(a, ratio)
    density = np.where(a < 1, low_shape, poisson_mass(a - 1, ratio)) / b
    return checked(
        np.where(np.asarray(cumulative) != 0, gammainc(a, ratio), density),
        ((at < 0) | (a <= 0) | (b <= 0), _NUM),
    )


@numeric_function("GAMMA.INV", "GAMMAINV")
def gamma_quantile(probability: Number, shape: Number, scale: Number) -> FloatArray:
    """The quantile of the gamma distribution."""
    p, a, b = _floats(probability, shape, scale)
    return checked(
        b * gammaincinv(a, p),
        ((p < 0) | (p >= 1) | (a <= 0) | (b <= 0), _NUM),
    )


@numeric_function("GAMMA")
def gamma_function(number: Number) -> FloatArray:
    """The gamma function."""
    (x,) = _floats(number)
    return checked(gamma(x), ((x <= 0) & (x == np.floor(x)), _NUM))


@numeric_function("GAMMALN", "GAMMALN.PRECISE")
def logarithm_of_gamma(number: Number) -> FloatArray:
    """The natural logarithm of the gamma function."""
    (x,) = _floats(number)
    return checked(log_gamma(x), (x <= 0, _NUM))


@numeric_function("FISHER")
def fisher_transformation(correlation: Number) -> FloatArray:
    """Fisher's transformation of a correlation coefficient."""
    (r,) = _floats(correlation)
    return checked(np.arctanh(r), (np.abs(r) >= 1, _NUM))


@numeric_function("FISHERINV")
def fisher_inverse(transformed: Number) -> FloatArray:
    """The correlation coefficient of which a number is Fisher's transformation."""
    return checked(np.tanh(np.asarray(transformed, dtype=np.float64)))
