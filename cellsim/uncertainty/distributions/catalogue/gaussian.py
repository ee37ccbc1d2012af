"""The normal distribution."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy import special

from cellsim.uncertainty.distributions.distribution import FloatArray, ScoreDistribution
from cellsim.uncertainty.distributions.family import Family, ParameterSet, any_number, positive

Quantiles = list[tuple[float, float]]


@dataclass(frozen=True, kw_only=True)
class Normal(ScoreDistribution):
    """The normal distribution.

    Attributes:
        location: The mean.
        scale: The standard deviation, above 0.
    """

    location: float
    scale: float

    @property
    def mean(self) -> float:
        """The mean."""
        return self.location

    @property
    def sd(self) -> float:
        """The standard deviation."""
        return self.scale

    @property
    def lower(self) -> float:
        """Minus infinity."""
        return -math.inf

    @property
    def upper(self) -> float:
        """Infinity."""
        return math.inf

    def at_score(self, z: FloatArray) -> FloatArray:
        """The value as far out as `z` is in the standard normal distribution."""
        values = np.multiply(z, self.scale)
        values += self.location
        return values

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        result: FloatArray = special.ndtr((x - self.location) / self.scale)
        return result

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        result: FloatArray = special.ndtr((self.location - x) / self.scale)
        return result

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        z = (x - self.location) / self.scale
        result: FloatArray = np.exp(-0.5 * z * z) / (self.scale * math.sqrt(2 * math.pi))
        return result


def _by_moments(mean: float, sd: float) -> Normal:
    return Normal(location=mean, scale=sd)


def _by_quantiles(quantiles: Quantiles) -> Normal:
    (first, low), (second, high) = quantiles
    z_low, z_high = float(special.ndtri(first)), float(special.ndtri(second))
    scale = (high - low) / (z_high - z_low)
    return Normal(location=low - scale * z_low, scale=scale)


FAMILIES = (
    Family(
        name="normal",
        checks={"mean": any_number, "sd": positive},
        sets=(
            ParameterSet(("mean", "sd"), _by_moments),
            ParameterSet((), _by_quantiles, quantiles=2),
        ),
    ),
)
