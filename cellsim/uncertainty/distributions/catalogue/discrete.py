"""Distributions over a list of values."""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np

from cellsim.uncertainty.distributions.distribution import Distribution, FloatArray
from cellsim.uncertainty.distributions.family import (
    Family,
    ParameterError,
    ParameterSet,
    number_list,
    probability,
    probability_list,
    spell,
)


@dataclass(frozen=True, kw_only=True)
class Discrete(Distribution):
    """A list of values, each with its probability.

    Attributes:
        values: The values, rising.
        probabilities: The probability of each, above 0, with sum 1.
    """

    discrete: ClassVar[bool] = True
    values: tuple[float, ...]
    probabilities: tuple[float, ...]

    @property
    def mean(self) -> float:
        """The mean."""
        return math.fsum(x * p for x, p in zip(self.values, self.probabilities, strict=True))

    @property
    def sd(self) -> float:
        """The standard deviation."""
        mean = self.mean
        squares = ((x - mean) ** 2 for x in self.values)
        return math.sqrt(math.fsum(d * p for d, p in zip(squares, self.probabilities, strict=True)))

    @property
    def lower(self) -> float:
        """The least value."""
        return self.values[0]

    @property
    def upper(self) -> float:
        """The greatest value."""
        return self.values[-1]

    @cached_property
    def _points(self) -> FloatArray:
        return np.array(self.values)

    @cached_property
    def _below(self) -> FloatArray:
        """The probability below each value, and 1 at the end."""
        return np.append(np.append(0.0, np.cumsum(self.probabilities)[:-1]), 1.0)

    def inverse(self, p: FloatArray, q: FloatArray) -> FloatArray:  # noqa: ARG002
        """The least value with a probability of `p` or more at or below it."""
        place = np.searchsorted(self._below[1:-1], p)
        return self._points[place]

    def cdf(self, x: FloatArray) -> FloatArray:
        """The probability of a value at or below `x`."""
        return self._below[np.searchsorted(self._points, x, side="right")]

    def survival(self, x: FloatArray) -> FloatArray:
        """The probability of a value above `x`."""
        above = np.append(np.cumsum(self.probabilities[::-1])[::-1], 0.0)
        above[0] = 1.0
        return above[np.searchsorted(self._points, x, side="right")]

    def density(self, x: FloatArray) -> FloatArray:
        """The probability of `x`."""
        place = np.minimum(np.searchsorted(self._points, x), len(self.values) - 1)
        return np.where(self._points[place] == x, np.array(self.probabilities)[place], 0.0)

    def restricted(self, floor: float, cap: float) -> Discrete:
        """The distribution over those values that are neither below the floor nor above the cap.

        Raises:
            ParameterError: None is left.
        """
        kept = [
            (value, weight)
            for value, weight in zip(self.values, self.probabilities, strict=True)
            if floor <= value <= cap
        ]
        if not kept:
            key, bound = ("floor", floor) if self.upper < floor else ("cap", cap)
            raise ParameterError(key, f"{key} {spell(bound)} leaves none of the values")
        return _from_weights(kept)


def _from_weights(pairs: list[tuple[float, float]]) -> Discrete:
    """The distribution over values with weights of any sum above 0."""
    weights: defaultdict[float, list[float]] = defaultdict(list)
    for value, weight in pairs:
        weights[value].append(weight)
    total = math.fsum(weight for _, weight in pairs)
    merged = {value: math.fsum(several) / total for value, several in sorted(weights.items())}
    kept = {value: weight for value, weight in merged.items() if weight > 0.0}
    return Discrete(values=tuple(kept), probabilities=tuple(kept.values()))


def _by_weights(values: tuple[float, ...], weights: tuple[float, ...]) -> Discrete:
    if len(values) != len(weights):
        message = f"values and weights must be as many, read {len(values)} and {len(weights)}"
        raise ParameterError("weights", message)
    return _from_weights(list(zip(values, weights, strict=True)))


def _bernoulli(probability: float) -> Discrete:
    return _from_weights([(0.0, 1.0 - probability), (1.0, probability)])


FAMILIES = (
    Family(
        name="discrete",
        checks={"values": number_list, "weights": probability_list},
        sets=(ParameterSet(("values", "weights"), _by_weights),),
    ),
    Family(
        name="bernoulli",
        checks={"probability": probability},
        sets=(ParameterSet(("probability",), _bernoulli),),
    ),
)
