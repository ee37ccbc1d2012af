"""The lognormal distribution, shifted if wanted."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy import special

from cellsim.uncertainty.distributions.distribution import FloatArray, ScoreDistribution
from cellsim.uncertainty.distributions.family import (
    Family,
    ParameterError,
    ParameterSet,
    any_number,
    positive,
    spell,
)


@dataclass(frozen=True, kw_only=True)
class Lognormal(ScoreDistribution):
    """`shift + exp(mu + sigma Z)` with Z standard normal.

    Attributes:
        mu: Mean of the logarithm of what exceeds the shift.
        sigma: Its standard deviation, above 0.
        shift: The lower bound.
    """

    mu: float
    sigma: float
    shift: float

    @property
    def mean(self) -> float:
        """The mean of the variable itself, shift included."""
        return self.shift + math.exp(self.mu + self.sigma**2 / 2)

    @property
    def sd(self) -> float:
        """The standard deviation of the variable itself."""
        return math.exp(self.mu + self.sigma**2 / 2) * math.sqrt(math.expm1(self.sigma**2))

    @property
    def lower(self) -> float:
        """The shift."""
        return self.shift

    @property
    def upper(self) -> float:
        """Infinity."""
        return math.inf

    def at_score(self, z: FloatArray) -> FloatArray:
        """The value as far out as `z` is in the standard normal distribution."""
        values = np.multiply(z, self.sigma)
        values += self.mu
        np.exp(values, out=values)
        values += self.shift
        return values

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        result: FloatArray = special.ndtr(self._score(x))
        return result

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        result: FloatArray = special.ndtr(-self._score(x))
        return result

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        excess = np.maximum(x - self.shift, 0.0)
        z = self._score(x)
        with np.errstate(divide="ignore", invalid="ignore"):
            inside = np.exp(-0.5 * z * z) / (excess * self.sigma * math.sqrt(2 * math.pi))
        return np.where(excess > 0.0, inside, 0.0)

    def _score(self, x: FloatArray) -> FloatArray:
        with np.errstate(divide="ignore"):
            z: FloatArray = (np.log(np.maximum(x - self.shift, 0.0)) - self.mu) / self.sigma
        return z


def _by_logarithm(mu: float, sigma: float, shift: float = 0.0) -> Lognormal:
    built = Lognormal(mu=mu, sigma=sigma, shift=shift)
    try:
        finite = math.isfinite(built.mean) and math.isfinite(built.sd)
    except OverflowError:
        finite = False
    if not finite:
        read = f"mu {spell(mu)} and sigma {spell(sigma)}"
        message = f"the logarithm's spread is too wide for a finite standard deviation, with {read}"
        raise ParameterError("sigma", message)
    return built


def _by_moments(mean: float, sd: float, shift: float = 0.0) -> Lognormal:
    if mean <= shift:
        bound = f"the shift, {spell(shift)}" if shift else "0"
        raise ParameterError("mean", f"mean must be above {bound}, read {spell(mean)}")
    excess = mean - shift
    variance = math.log1p((sd / excess) ** 2)
    return _by_logarithm(math.log(excess) - variance / 2, math.sqrt(variance), shift)


def _by_quantiles(quantiles: list[tuple[float, float]], shift: float = 0.0) -> Lognormal:
    (first, low), (second, high) = quantiles
    if low <= shift:
        bound = f"the shift, {spell(shift)}" if shift else "0"
        message = f"the lower quantile must be above {bound}, read {spell(low)}"
        raise ParameterError("", message)
    z_low, z_high = float(special.ndtri(first)), float(special.ndtri(second))
    log_low, log_high = math.log(low - shift), math.log(high - shift)
    sigma = (log_high - log_low) / (z_high - z_low)
    return _by_logarithm(log_low - sigma * z_low, sigma, shift)


FAMILIES = (
    Family(
        name="lognormal",
        checks={
            "mean": any_number,
            "sd": positive,
            "mu": any_number,
            "sigma": positive,
            "shift": any_number,
        },
        sets=(
            ParameterSet(("mean", "sd"), _by_moments, optional=("shift",)),
            ParameterSet(("mu", "sigma"), _by_logarithm, optional=("shift",)),
            ParameterSet((), _by_quantiles, optional=("shift",), quantiles=2),
        ),
    ),
)
