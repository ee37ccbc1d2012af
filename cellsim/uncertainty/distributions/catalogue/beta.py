"""The beta distribution between two bounds, and the PERT distribution, which is one of them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property, lru_cache, partial

import numpy as np
from scipy import special

from cellsim.uncertainty.distributions.distribution import FloatArray, ScoreDistribution
from cellsim.uncertainty.distributions.family import (
    Family,
    ParameterError,
    ParameterSet,
    ParameterValue,
    any_number,
    positive,
    spell,
)
from cellsim.uncertainty.distributions.score_table import ScoreTable, build_score_table

_NEGLIGIBLE = 1e-17
"""Relative size of the second term of a quantile's series below which the leading one is all."""
_MOST_STEPS = 100
_LEAST_SHAPE, _MOST_SHAPE = 1e-3, 1e8
_SMALL_STEP = 1e-13


@dataclass(frozen=True, kw_only=True)
class Beta(ScoreDistribution):
    """The beta distribution, scaled to bounds.

    Quantiles come from a table of the logit over the normal score: their distances from either
    bound are within a relative error of `score_table.ERROR_BOUND`.

    Attributes:
        alpha: First shape, above 0.
        beta: Second shape, above 0.
        low: The lower bound.
        high: The upper bound, above `low`.
    """

    alpha: float
    beta: float
    low: float
    high: float

    @property
    def mean(self) -> float:
        """The mean."""
        return self.low + (self.high - self.low) * self.alpha / (self.alpha + self.beta)

    @property
    def sd(self) -> float:
        """The standard deviation."""
        total = self.alpha + self.beta
        share = math.sqrt(self.alpha / total * (self.beta / total) / (total + 1))
        return (self.high - self.low) * share

    @property
    def lower(self) -> float:
        """The lower bound."""
        return self.low

    @property
    def upper(self) -> float:
        """The upper bound."""
        return self.high

    @cached_property
    def _table(self) -> ScoreTable:
        return _logit_table(self.alpha, self.beta)

    def at_score(self, z: FloatArray) -> FloatArray:
        """The value as far out as `z` is in the standard normal distribution."""
        logit = self._table(z)
        near = np.exp(-np.abs(logit))
        near /= 1.0 + near
        near *= self.high - self.low
        return np.where(logit <= 0.0, self.low + near, self.high - near)

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        return _tail(self.alpha, self.beta, self._share_below(x), self._share_above(x))

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        return _tail(self.beta, self.alpha, self._share_above(x), self._share_below(x))

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        below, above = self._share_below(x), self._share_above(x)
        with np.errstate(divide="ignore", over="ignore"):
            logarithm = special.xlogy(self.alpha - 1.0, below)
            logarithm += special.xlogy(self.beta - 1.0, above)
            inside = np.exp(logarithm - special.betaln(self.alpha, self.beta))
        outside = (x < self.low) | (x > self.high)
        return np.where(outside, 0.0, inside / (self.high - self.low))

    def _share_below(self, x: FloatArray) -> FloatArray:
        return np.clip((x - self.low) / (self.high - self.low), 0.0, 1.0)

    def _share_above(self, x: FloatArray) -> FloatArray:
        return np.clip((self.high - x) / (self.high - self.low), 0.0, 1.0)


def _tail(alpha: float, beta: float, share: FloatArray, rest: FloatArray) -> FloatArray:
    """The beta cdf at a share of the width, given `rest = 1 - share` to full precision as well."""
    lower = share <= rest
    result = np.empty(np.broadcast_shapes(share.shape, rest.shape))
    result[lower] = special.betainc(alpha, beta, share[lower])
    result[~lower] = special.betaincc(beta, alpha, rest[~lower])
    return result


@lru_cache(maxsize=256)
def _logit_table(alpha: float, beta: float) -> ScoreTable:
    return build_score_table(partial(_logit_quantile, alpha, beta))


def _logit_quantile(alpha: float, beta: float, z: FloatArray) -> tuple[FloatArray, FloatArray]:
    """The logit of the beta quantile at normal scores, and its derivative by the score."""
    logit = np.empty(z.shape)
    low = z <= 0.0
    logit[low] = _lower_logit(alpha, beta, z[low])
    logit[~low] = -_lower_logit(beta, alpha, -z[~low])
    log_normal_density = -0.5 * z * z - 0.5 * math.log(2 * math.pi)
    with np.errstate(over="ignore"):
        slope = np.exp(log_normal_density - _log_logit_density(alpha, beta, logit))
    return logit, slope


def _lower_logit(alpha: float, beta: float, z: FloatArray) -> FloatArray:
    """The logit of the beta quantile at normal scores of 0 or less.

    Next to a bound it is the leading term of a series.
    """
    log_beta = float(special.betaln(alpha, beta))
    log_p = special.log_ndtr(z)
    log_below = (log_p + math.log(alpha) + log_beta) / alpha
    log_above = (special.log_ndtr(-z) + math.log(beta) + log_beta) / beta
    lowest = math.log(_NEGLIGIBLE / (1.0 + beta))
    highest = -math.log(_NEGLIGIBLE / (1.0 + alpha))
    near_low, near_high = log_below < lowest, -log_above > highest
    logit: FloatArray = np.where(near_low, log_below, -log_above)
    inside = ~(near_low | near_high)
    bounds = (lowest - 1.0, highest + 1.0)
    logit[inside] = _solved_logit(alpha, beta, z[inside], log_p[inside], bounds)
    return logit


def _solved_logit(
    alpha: float, beta: float, z: FloatArray, log_p: FloatArray, bounds: tuple[float, float]
) -> FloatArray:
    """The logit of the beta quantile at normal scores of 0 or less, away from the bounds.

    The inverse that scipy offers loses its way where the shapes differ by many powers of ten, so
    it is only the start of Newton's method on the logarithm of the cdf, which is concave in the
    logit, with bisection where a step would leave the bracket.
    """
    share = np.nan_to_num(special.betaincinv(alpha, beta, special.ndtr(z)), nan=0.5)
    logit = np.clip(special.logit(share), *bounds)
    spread = math.sqrt(special.polygamma(1, alpha) + special.polygamma(1, beta))
    small = _SMALL_STEP * (1.0 + spread + np.abs(logit))
    below, above = np.full_like(z, bounds[0]), np.full_like(z, bounds[1])
    for _ in range(_MOST_STEPS):
        cdf = _tail(alpha, beta, special.expit(logit), special.expit(-logit))
        with np.errstate(divide="ignore", over="ignore", invalid="ignore"):
            log_cdf = np.log(cdf)
            step = (log_cdf - log_p) * np.exp(log_cdf - _log_logit_density(alpha, beta, logit))
        too_high = log_cdf >= log_p
        above, below = np.where(too_high, logit, above), np.where(too_high, below, logit)
        close = np.abs(step) <= small
        stays = close | ((logit - step > below) & (logit - step < above))
        logit = np.where(stays, logit - step, (below + above) / 2.0)
        if close.all():
            break
    return logit


def _log_logit_density(alpha: float, beta: float, logit: FloatArray) -> FloatArray:
    """The logarithm of the density of a beta variable's logit."""
    log_below, log_above = special.log_expit(logit), special.log_expit(-logit)
    result: FloatArray = alpha * log_below + beta * log_above - special.betaln(alpha, beta)
    return result


def _by_shapes(alpha: float, beta: float, low: float = 0.0, high: float = 1.0) -> Beta:
    _check_bounds(low, high)
    return Beta(alpha=alpha, beta=beta, low=low, high=high)


def _by_moments(mean: float, sd: float, low: float = 0.0, high: float = 1.0) -> Beta:
    _check_bounds(low, high)
    if not low < mean < high:
        message = f"mean must lie between {spell(low)} and {spell(high)}, read {spell(mean)}"
        raise ParameterError("mean", message)
    share, spread = (mean - low) / (high - low), sd / (high - low)
    total = share * (1.0 - share) / spread**2 - 1.0
    if total <= 0.0:
        most = (high - low) * math.sqrt(share * (1.0 - share))
        message = f"sd must be below {spell(most)} for this mean and these bounds, read {spell(sd)}"
        raise ParameterError("sd", message)
    alpha, beta = share * total, (1.0 - share) * total
    if _shape(alpha) or _shape(beta):
        read = f"alpha {spell(alpha)} and beta {spell(beta)}"
        message = f"sd {spell(sd)} is too extreme for this mean and these bounds: it gives {read}"
        raise ParameterError("sd", message)
    return Beta(alpha=alpha, beta=beta, low=low, high=high)


def _pert(low: float, mode: float, high: float, weight: float = 4.0) -> Beta:
    """The beta distribution whose mean is `(low + weight mode + high) / (weight + 2)`."""
    width = high - low
    alpha = 1.0 + weight * (mode - low) / width
    beta = 1.0 + weight * (high - mode) / width
    return Beta(alpha=alpha, beta=beta, low=low, high=high)


def _shape(value: ParameterValue) -> str | None:
    """Accepts the shapes for which the incomplete beta function is precise."""
    fits = isinstance(value, float | int) and _LEAST_SHAPE <= value <= _MOST_SHAPE
    return None if fits else f"a number from {_LEAST_SHAPE:g} to {_MOST_SHAPE:.0f}"


def _weight(value: ParameterValue) -> str | None:
    """Accepts positive weights that give such shapes."""
    fits = isinstance(value, float | int) and 0 < value < _MOST_SHAPE
    return None if fits else f"a number above 0 and below {_MOST_SHAPE:.0f}"


def _check_bounds(low: float, high: float) -> None:
    if not low < high:
        message = f"low must be below high, read {spell(low)} and {spell(high)}"
        raise ParameterError("low", message)


FAMILIES = (
    Family(
        name="beta",
        checks={
            "alpha": _shape,
            "beta": _shape,
            "mean": any_number,
            "sd": positive,
            "low": any_number,
            "high": any_number,
        },
        sets=(
            ParameterSet(("alpha", "beta"), _by_shapes, optional=("low", "high")),
            ParameterSet(("mean", "sd"), _by_moments, optional=("low", "high")),
        ),
        rising=("low", "high"),
    ),
    Family(
        name="pert",
        checks={"low": any_number, "mode": any_number, "high": any_number, "weight": _weight},
        sets=(ParameterSet(("low", "mode", "high"), _pert, optional=("weight",)),),
        rising=("low", "mode", "high"),
    ),
)
