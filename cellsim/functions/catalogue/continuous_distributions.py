"""Beta, gamma, exponential and Weibull distributions, the gamma function, Fisher's transformation."""

from __future__ import annotations

import numpy as np
from scipy.special import betainc, gamma, gammainc, gammaincinv

from cellsim.functions.encoded import FloatArray, Numbers, checked, chosen, numeric_function
from cellsim.functions.probability_tails import beta_shares
from cellsim.functions.registry import Logical, Number
from cellsim.functions.saddle_point import beta_density, gamma_density, log_gamma
from cellsim.values import ErrorValue

_NUM = ErrorValue.NUM


def _floats(*numbers: Numbers) -> list[FloatArray]:
    return [np.asarray(number, dtype=np.float64) for number in numbers]


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
    found = chosen(
        cumulative,
        lambda: np.asarray(betainc(a, b, share), dtype=np.float64),
        lambda: beta_density(share, (end - at) / width, a, b) / width,
    )
    return checked(
        found,
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
        start + (end - start) * beta_shares(a, b, p, 1 - p)[0],
        ((p <= 0) | (p > 1) | (a <= 0) | (b <= 0) | (start >= end), _NUM),
    )


@numeric_function("EXPON.DIST", "EXPONDIST")
def exponential(x: Number, rate: Number, cumulative: Logical) -> FloatArray:
    """The exponential distribution: cumulative, or its density."""
    at, of = _floats(x, rate)
    product = of * at
    found = chosen(cumulative, lambda: -np.expm1(-product), lambda: of * np.exp(-product))
    return checked(found, ((at < 0) | (of <= 0), _NUM))


@numeric_function("WEIBULL.DIST", "WEIBULL")
def weibull(x: Number, shape: Number, scale: Number, cumulative: Logical) -> FloatArray:
    """The Weibull distribution: cumulative, or its density."""
    at, a, b = _floats(x, shape, scale)
    ratio = at / b
    hazard = np.power(ratio, a)

    def density() -> FloatArray:
        survival = np.exp(-hazard)
        # Far out the power may overflow where the survival has long become zero.
        return np.where(survival == 0, 0.0, a / b * np.power(ratio, a - 1) * survival)

    found = chosen(cumulative, lambda: -np.expm1(-hazard), density)
    return checked(found, ((at < 0) | (a <= 0) | (b <= 0), _NUM))


@numeric_function("GAMMA.DIST", "GAMMADIST")
def gamma_distribution(x: Number, shape: Number, scale: Number, cumulative: Logical) -> FloatArray:
    """The gamma distribution: cumulative, or its density."""
    at, a, b = _floats(x, shape, scale)
    ratio = at / b
    found = chosen(cumulative, lambda: gammainc(a, ratio), lambda: gamma_density(ratio, a) / b)
    return checked(found, ((at < 0) | (a <= 0) | (b <= 0), _NUM))


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
