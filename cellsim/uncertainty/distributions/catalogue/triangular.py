"""The triangular distribution."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from cellsim.uncertainty.distributions.distribution import Distribution, FloatArray
from cellsim.uncertainty.distributions.family import (
    Family,
    ParameterError,
    ParameterSet,
    any_number,
    spell,
)


@dataclass(frozen=True, kw_only=True)
class Triangular(Distribution):
    """The triangular distribution; the mode may lie on a bound.

    Attributes:
        low: The lower bound.
        mode: The most likely value.
        high: The upper bound, above `low`.
    """

    low: float
    mode: float
    high: float

    @property
    def mean(self) -> float:
        """The mean of bounds and mode."""
        return self.mode + ((self.low - self.mode) + (self.high - self.mode)) / 3

    @property
    def sd(self) -> float:
        """The standard deviation."""
        left, right = self.mode - self.low, self.high - self.mode
        return math.sqrt((left * left + left * right + right * right) / 18)

    @property
    def lower(self) -> float:
        """The lower bound."""
        return self.low

    @property
    def upper(self) -> float:
        """The upper bound."""
        return self.high

    @property
    def breaks(self) -> tuple[float, ...]:
        """The mode, unless it lies on a bound."""
        return (self.mode,) if self.low < self.mode < self.high else ()

    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:
        """The value with probability `p` below it and `q` above it."""
        width = self.high - self.low
        left = self.low + np.sqrt(p * (width * (self.mode - self.low)))
        right = self.high - np.sqrt(q * (width * (self.high - self.mode)))
        return np.where(p <= (self.mode - self.low) / width, left, right)

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        return np.where(x <= self.mode, self._left_tail(x), 1.0 - self._right_tail(x))

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        return np.where(x <= self.mode, 1.0 - self._left_tail(x), self._right_tail(x))

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        peak = 2.0 / (self.high - self.low)
        with np.errstate(divide="ignore", invalid="ignore"):
            left = peak * (x - self.low) / (self.mode - self.low)
            right = peak * (self.high - x) / (self.high - self.mode)
        slopes = np.where(x < self.mode, left, np.where(x > self.mode, right, peak))
        return np.where((x < self.low) | (x > self.high), 0.0, slopes)

    def _left_tail(self, x: FloatArray) -> FloatArray:
        """The cdf at values up to the mode."""
        area = (self.high - self.low) * (self.mode - self.low)
        if area == 0.0:
            return np.zeros_like(x)
        return np.clip(x - self.low, 0.0, self.mode - self.low) ** 2 / area

    def _right_tail(self, x: FloatArray) -> FloatArray:
        """The survival at values from the mode on."""
        area = (self.high - self.low) * (self.high - self.mode)
        if area == 0.0:
            return np.zeros_like(x)
        return np.clip(self.high - x, 0.0, self.high - self.mode) ** 2 / area


def _by_bounds(low: float, mode: float, high: float) -> Triangular:
    return Triangular(low=low, mode=mode, high=high)


def _by_quantiles(mode: float, quantiles: list[tuple[float, float]]) -> Triangular:
    """The triangle with this mode and these quantiles, one on each side of it.

    With u**2 the probability below the mode and v**2 that above, s and t the roots of the
    probabilities beyond the quantiles, the width w satisfies `mode - low quantile = w u (u - s)`
    and `high quantile - mode = w v (v - t)`; the angle whose sine is u and cosine is v follows from
    their ratio, by bisection of a falling function.
    """
    (first, low), (second, high) = quantiles
    if not low <= mode <= high:
        between = f"between the quantiles, {spell(low)} and {spell(high)}"
        raise ParameterError("mode", f"mode must lie {between}, read {spell(mode)}")
    s, t = math.sqrt(first), math.sqrt(1.0 - second)

    def unbalance(angle: float) -> float:
        u, v = math.sin(angle), math.cos(angle)
        return (mode - low) * v * (v - t) - (high - mode) * u * (u - s)

    least, most = math.asin(s), math.acos(t)
    while True:
        middle = (least + most) / 2
        if not least < middle < most:
            break
        least, most = (middle, most) if unbalance(middle) > 0 else (least, middle)
    u, v = math.sin(middle), math.cos(middle)
    left, right = u * (u - s), v * (v - t)
    width = (mode - low) / left if mode - low > high - mode else (high - mode) / right
    return Triangular(low=mode - width * u * u, mode=mode, high=mode + width * v * v)


FAMILIES = (
    Family(
        name="triangular",
        checks={"low": any_number, "mode": any_number, "high": any_number},
        sets=(
            ParameterSet(("low", "mode", "high"), _by_bounds),
            ParameterSet(("mode",), _by_quantiles, quantiles=2),
        ),
        rising=("low", "mode", "high"),
    ),
)
