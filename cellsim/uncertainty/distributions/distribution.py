"""What a distribution is: how likely values are, and which value belongs to a probability."""

from __future__ import annotations

import dataclasses
from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
import numpy.typing as npt
from scipy import special

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Distribution(ABC):
    """One distribution of one number. Every method works elementwise and leaves its argument alone.

    Attributes:
        discrete: Whether it takes separate values only.
        family: Name of the family that it was asked for.
        words: The family and the parameters that it was asked for, as a reader meets them.
    """

    discrete: ClassVar[bool] = False
    family: str = dataclasses.field(default="", compare=False)
    words: str = dataclasses.field(default="", compare=False)

    @property
    @abstractmethod
    def mean(self) -> float:
        """The mean."""

    @property
    @abstractmethod
    def sd(self) -> float:
        """The standard deviation."""

    @property
    @abstractmethod
    def lower(self) -> float:
        """The lower bound, -inf if there is none."""

    @property
    @abstractmethod
    def upper(self) -> float:
        """The upper bound, inf if there is none."""

    @abstractmethod
    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""

    @abstractmethod
    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`, to full precision however small it is."""

    @abstractmethod
    def density(self, x: FloatArray) -> FloatArray:
        """The probability density at `x`; of a discrete distribution, the probability of `x`."""

    @abstractmethod
    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:
        """The value with probability `p` below it and `q` above it.

        Args:
            p: Probabilities.
            q: `1 - p`; given beside `p` so that neither tail loses precision.
        """

    def quantile(self, u: FloatArray) -> FloatArray:
        """The value with probability `u` at or below it, for `u` inside (0, 1)."""
        return self.inverse(u, 1.0 - u)

    def at_score(self, z: FloatArray) -> FloatArray:
        """The value as far out as `z` is in the standard normal distribution."""
        return self.inverse(special.ndtr(z), special.ndtr(-z))

    @property
    def breaks(self) -> tuple[float, ...]:
        """The values inside the bounds where the density has a kink or a step, rising."""
        return ()

    def restricted(self, floor: float, cap: float) -> Distribution | None:  # noqa: ARG002
        """The distribution between two bounds if it has a way of its own, else None.

        Raises:
            ParameterError: Nothing of the distribution lies there.
        """
        return None

    def describe(self) -> str:
        """The family and its parameters in words, such as `uniform, low 0, high 1`."""
        return self.words or self.family


class ScoreDistribution(Distribution):
    """A distribution whose value is easiest to tell from the normal score."""

    @abstractmethod
    def at_score(self, z: FloatArray) -> FloatArray:
        """The value as far out as `z` is in the standard normal distribution."""

    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:
        """The value with probability `p` below it and `q` above it."""
        return self.at_score(normal_score(p, q))

    def quantile(self, u: FloatArray) -> FloatArray:
        """The value with probability `u` at or below it, for `u` inside (0, 1)."""
        return self.at_score(special.ndtri(u))


def normal_score(p: FloatArray, q: FloatArray) -> FloatArray:
    """The standard normal quantile at `p`, given `q = 1 - p` to full precision as well."""
    score: FloatArray = special.ndtri(np.minimum(p, q))
    return np.where(p <= q, score, -score)
