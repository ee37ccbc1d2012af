"""The uniform distribution."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from cellsim.uncertainty.distributions.distribution import Distribution, FloatArray
from cellsim.uncertainty.distributions.family import Family, ParameterSet, any_number, positive


@dataclass(frozen=True, kw_only=True)
class Uniform(Distribution):
    """The uniform (rectangular) distribution.

    Attributes:
        low: The lower bound.
        high: The upper bound, above `low`.
    """

    low: float
    high: float

    @property
    def mean(self) -> float:
        """The middle."""
        return self.low + (self.high - self.low) / 2

    @property
    def sd(self) -> float:
        """The width over the root of 12."""
        return (self.high - self.low) / math.sqrt(12)

    @property
    def lower(self) -> float:
        """The lower bound."""
        return self.low

    @property
    def upper(self) -> float:
        """The upper bound."""
        return self.high

    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:
        """The value with probability `p` below it and `q` above it."""
        width = self.high - self.low
        return np.where(p <= q, self.low + width * p, self.high - width * q)

    def quantile(self, u: FloatArray) -> FloatArray:
        """The value with probability `u` at or below it, for `u` inside (0, 1)."""
        values = np.multiply(u, self.high - self.low)
        values += self.low
        return np.minimum(values, self.high, out=values)

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        return np.clip((x - self.low) / (self.high - self.low), 0.0, 1.0)

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        return np.clip((self.high - x) / (self.high - self.low), 0.0, 1.0)

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        inside = (x >= self.low) & (x <= self.high)
        return np.where(inside, 1.0 / (self.high - self.low), 0.0)


def _by_bounds(low: float, high: float) -> Uniform:
    return Uniform(low=low, high=high)


def _by_moments(mean: float, sd: float) -> Uniform:
    half = sd * math.sqrt(3)
    return Uniform(low=mean - half, high=mean + half)


def _by_quantiles(quantiles: list[tuple[float, float]]) -> Uniform:
    (first, low), (second, high) = quantiles
    width = (high - low) / (second - first)
    return Uniform(low=low - width * first, high=high + width * (1 - second))


FAMILIES = (
    Family(
        name="uniform",
        checks={"low": any_number, "high": any_number, "mean": any_number, "sd": positive},
        sets=(
            ParameterSet(("low", "high"), _by_bounds),
            ParameterSet(("mean", "sd"), _by_moments),
            ParameterSet((), _by_quantiles, quantiles=2),
        ),
        rising=("low", "high"),
    ),
)
