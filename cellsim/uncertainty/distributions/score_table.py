"""A monotone cubic in the normal score in place of an inverse function that is slow to compute."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from cellsim.uncertainty.distributions.distribution import FloatArray

Exact: TypeAlias = Callable[[FloatArray], tuple[FloatArray, FloatArray]]
"""Takes normal scores; gives a rising function of them and its derivative."""

REACH = 6.0
"""Scores further out than this are computed exactly."""

ERROR_BOUND = 1e-11
"""Largest absolute error of a table; checked where the error of a cubic is largest."""

_FEWEST, _MOST = 4_096, 16_384
_BLOCK = 32_768


@dataclass(frozen=True, slots=True, eq=False)
class ScoreTable:
    """A function of the normal score.

    Attributes:
        exact: The function that it stands for.
        coefficients: Shape (4, intervals): of the cubic in each interval of equal width over
            -REACH to REACH, constant term first, in the share of the interval; no intervals if the
            bound could not be met, and then every value is exact.
    """

    exact: Exact
    coefficients: FloatArray

    def __call__(self, z: FloatArray) -> FloatArray:
        """The function at scores `z`, within `ERROR_BOUND`."""
        if self.coefficients.shape[1] == 0:
            return self.exact(z)[0]
        result = np.empty(z.shape)
        flat_z, flat_result = z.reshape(-1), result.reshape(-1)
        for first in range(0, flat_z.size, _BLOCK):
            block = slice(first, first + _BLOCK)
            flat_result[block] = self._interpolate(flat_z[block])
        return result

    def _interpolate(self, z: FloatArray) -> FloatArray:
        intervals = self.coefficients.shape[1]
        place = z + REACH
        place *= intervals / (2 * REACH)
        outside = (place < 0) | (place >= intervals)
        any_outside = bool(outside.any())
        if any_outside:
            place[outside] = 0.0
        interval = place.astype(np.intp)
        place -= interval
        constant, linear, quadratic, cubic = self.coefficients
        result: FloatArray = cubic[interval]
        for coefficient in (quadratic, linear, constant):
            result *= place
            result += coefficient[interval]
        if any_outside:
            result[outside] = self.exact(z[outside])[0]
        return result


def build_score_table(exact: Exact) -> ScoreTable:
    """A table with as few intervals as meet `ERROR_BOUND`, from 4,096 to 16,384.

    Cubic Hermite interpolation with the true derivatives; its error is largest in the middle of an
    interval, and there each is compared with the exact function. Slopes must lie in the circle in
    which a cubic is monotone (Fritsch and Carlson 1980).

    Args:
        exact: The function and its derivative; rising, four times differentiable.
    """
    intervals = _FEWEST
    while intervals <= _MOST:
        coefficients = _hermite(exact, intervals)
        if coefficients is not None:
            return ScoreTable(exact, coefficients)
        intervals *= 2
    return ScoreTable(exact, np.empty((4, 0)))


def _hermite(exact: Exact, intervals: int) -> FloatArray | None:
    """The coefficients, or None if the bound is not met."""
    width = 2 * REACH / intervals
    knots = np.linspace(-REACH, REACH, intervals + 1)
    values, slopes = exact(knots)
    rise = np.diff(values)
    left, right = slopes[:-1] * width, slopes[1:] * width
    if not np.all(np.isfinite(rise)) or not np.all(left * left + right * right <= 9.0 * rise**2):
        return None
    coefficients = np.array(
        [values[:-1], left, 3 * rise - 2 * left - right, left + right - 2 * rise]
    )
    middle = values[:-1] + (rise + (left - right) / 4) / 2
    truth = exact((knots[:-1] + knots[1:]) / 2)[0]
    error = float(np.max(np.abs(middle - truth)))
    return coefficients if math.isfinite(error) and error <= ERROR_BOUND else None
