"""A distribution on condition that the value lies between a floor and a cap."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from cellsim.uncertainty.distributions.distribution import Distribution, FloatArray
from cellsim.uncertainty.distributions.family import ParameterError, spell
from cellsim.uncertainty.distributions.moments import combine_moments, moments_of


def truncate(distribution: Distribution, floor: float | None, cap: float | None) -> Distribution:
    """The distribution on condition that the value is neither below the floor nor above the cap.

    Raises:
        ParameterError: Nothing of the distribution lies there.
    """
    if floor is None and cap is None:
        return distribution
    low = -math.inf if floor is None else floor
    high = math.inf if cap is None else cap
    if not low < high:
        message = f"floor must be below cap, read {spell(low)} and {spell(high)}"
        raise ParameterError("floor", message)
    restricted = distribution.restricted(low, high)
    if restricted is not None:
        return restricted
    truncated = Truncated(base=distribution, floor=low, cap=high)
    if truncated.mass > 0.0:
        return truncated
    if floor is not None and (cap is None or distribution.cdf(np.array([floor]))[0] > 0.0):
        raise ParameterError("floor", f"floor {spell(low)} leaves nothing of the distribution")
    raise ParameterError("cap", f"cap {spell(high)} leaves nothing of the distribution")


@dataclass(frozen=True, kw_only=True)
class Truncated(Distribution):
    """A continuous distribution between two bounds.

    The quantile is the base's at `F(floor) + u (F(cap) - F(floor))`; both tails are kept to full
    precision by carrying what lies below and what lies above.

    Attributes:
        base: The distribution without bounds.
        floor: The lower bound, -inf for none.
        cap: The upper bound, inf for none.
    """

    base: Distribution
    floor: float
    cap: float

    @property
    def lower(self) -> float:
        """The lower bound."""
        return max(self.floor, self.base.lower)

    @property
    def upper(self) -> float:
        """The upper bound."""
        return min(self.cap, self.base.upper)

    @property
    def breaks(self) -> tuple[float, ...]:
        """Those of the base that lie inside."""
        return tuple(point for point in self.base.breaks if self.lower < point < self.upper)

    @cached_property
    def mass(self) -> float:
        """The probability of the base between the bounds, to full relative precision."""
        (not_above_floor, not_above_cap), (above_floor, above_cap) = self._tails
        if not_above_floor > 0.5:
            return above_floor - above_cap
        if above_cap > 0.5:
            return not_above_cap - not_above_floor
        return 1.0 - not_above_floor - above_cap

    @property
    def mean(self) -> float:
        """The mean between the bounds."""
        return self._moments[0]

    @property
    def sd(self) -> float:
        """The standard deviation between the bounds."""
        return self._moments[1]

    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:
        """The value with probability `p` below it and `q` above it."""
        (below, _), (_, above) = self._tails
        values = self.base.inverse(below + self.mass * p, above + self.mass * q)
        return np.clip(values, self.floor, self.cap)

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        (below, _), (above_floor, _) = self._tails
        upper_half = below > 0.5
        part = above_floor - self.base.survival(x) if upper_half else self.base.cdf(x) - below
        return np.clip(part / self.mass, 0.0, 1.0)

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        (_, not_above_cap), (_, above) = self._tails
        lower_half = above > 0.5
        part = not_above_cap - self.base.cdf(x) if lower_half else self.base.survival(x) - above
        return np.clip(part / self.mass, 0.0, 1.0)

    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`."""
        inside = (x >= self.floor) & (x <= self.cap)
        return np.where(inside, self.base.density(x) / self.mass, 0.0)

    @cached_property
    def _tails(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """The base's cdf and survival, each at floor and cap."""
        bounds = np.array([self.lower, self.upper])
        with np.errstate(invalid="ignore", over="ignore"):
            cdf, survival = self.base.cdf(bounds), self.base.survival(bounds)
        return (float(cdf[0]), float(cdf[1])), (float(survival[0]), float(survival[1]))

    @cached_property
    def _moments(self) -> tuple[float, float]:
        edges = (self.floor, *self.breaks, self.cap)
        if len(edges) == 2:
            return moments_of(self.inverse)
        pieces = [Truncated(base=self.base, floor=low, cap=high) for low, high in pairwise(edges)]
        return combine_moments([(piece.mass, piece.mean, piece.sd) for piece in pieces])
