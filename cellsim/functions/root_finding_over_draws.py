"""Roots of functions of a rate in all draws at once.

The steps are those of `root_finding`. What happens in a draw depends on that draw alone, so that results
do not change with the number of draws taken together. Points are given as x = ln(1 + rate).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol, TypeVar

import numpy as np
import numpy.typing as npt

from cellsim.functions.root_finding import (
    HIGHEST_RATE,
    LOWEST_RATE,
    MOST_STEPS,
    is_bisecting_turn,
    rates_between,
)

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
Places = npt.NDArray[np.intp]

_CHUNK = 16_384
"""Values of a function to find at a time, points times draws."""


class Equations(Protocol):
    """One equation in a rate for each draw."""

    @property
    def draws(self) -> int:
        """The number of draws."""

    def evaluate(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Value and derivative at a point for each draw, all of shape (draws,)."""

    def values(self, rates: Sequence[float]) -> FloatArray:
        """Values, true in sign, at the same rates in all draws, shape (rates, draws)."""

    def subset(self: AnyEquations, chosen: Places) -> AnyEquations:
        """The equations of some draws."""


AnyEquations = TypeVar("AnyEquations", bound=Equations)


def enclose_over_draws(
    equations: AnyEquations,
    guess: float,
    floor: float = LOWEST_RATE,
    ceiling: float = HIGHEST_RATE,
) -> tuple[FloatArray, FloatArray, BoolArray]:
    """The neighbouring search rates nearest a guess between which each draw's function changes sign.

    Args:
        equations: The equations.
        guess: Where to begin, above -1.
        floor: There are no roots below.
        ceiling: There are no roots above.

    Returns:
        The lower and the higher rates, shape (draws,), equal where a search rate is a root, NaN where
        there is none; and whether the function is negative at the lower rate.
    """
    low, high = np.full(equations.draws, np.nan), np.full(equations.draws, np.nan)
    rising = np.zeros(equations.draws, dtype=bool)
    sides = rates_between(guess, floor, ceiling)
    left = np.arange(equations.draws)
    place = 0
    while len(left) and place + 1 < max(len(side) for side in sides):
        part = equations.subset(left)
        end = place + max(8, min(64, _CHUNK // len(left)))
        first = np.full(len(left), end)
        for side in sides:
            chunk = np.array(side[place : end + 1])
            if len(chunk) < 2:
                continue
            values = part.values(chunk.tolist())
            signs = np.sign(values)
            crossed = (signs[1:] == 0) | (signs[:-1] == 0) | (signs[1:] * signs[:-1] == -1)
            steps = np.where(crossed.any(axis=0), crossed.argmax(axis=0), end)
            found = np.flatnonzero(steps < first)
            first[found] = steps[found]
            ends = _ends(chunk, signs, steps[found], found)
            low[left[found]], high[left[found]], rising[left[found]] = ends
        left = left[np.isnan(low[left])]
        place = end
    return low, high, rising


def _ends(
    rates: FloatArray, signs: FloatArray, steps: Places, draws: Places
) -> tuple[FloatArray, FloatArray, BoolArray]:
    """Lower and higher rate of the step in which each draw's function changes sign, and its sign there."""
    near, far = rates[steps], rates[steps + 1]
    at_near, at_far = signs[steps, draws], signs[steps + 1, draws]
    near, far = np.where(at_far == 0, far, near), np.where(at_near == 0, near, far)
    low = np.minimum(near, far)
    return low, np.maximum(near, far), np.where(low == near, at_near, at_far) < 0


@dataclass(slots=True)
class Brackets:
    """Where each draw's root lies, in x = ln(1 + rate); every array of shape (draws,).

    Attributes:
        low: The lower ends.
        high: The higher ends.
        point: Where to go on; the root once it is settled; NaN where there is none.
        rising: Whether the function is negative below the root.
        negligible: A Newton step this small leaves an error far below rounding.
    """

    low: FloatArray
    high: FloatArray
    point: FloatArray
    rising: BoolArray
    negligible: FloatArray

    def subset(self, chosen: Places) -> Brackets:
        """Those of some draws, copied."""
        return Brackets(
            self.low[chosen],
            self.high[chosen],
            self.point[chosen],
            self.rising[chosen],
            self.negligible[chosen],
        )

    def put(self, chosen: Places, part: Brackets) -> None:
        """Set the ends and points of some draws."""
        self.low[chosen], self.high[chosen], self.point[chosen] = part.low, part.high, part.point


ALL_TURNS = range(MOST_STEPS)


def polish_over_draws(
    equations: AnyEquations, brackets: Brackets, turns: range = ALL_TURNS
) -> BoolArray:
    """Narrow each draw's bracket to its root.

    Args:
        equations: The equations.
        brackets: Where the roots lie; its points become the roots.
        turns: Which steps to take, `range(MOST_STEPS)` in all; a later call goes on with the rest.

    Returns:
        Whether a draw's root is settled, to full precision.
    """
    settled = np.zeros(equations.draws, dtype=bool)
    places = np.arange(equations.draws)
    part = brackets.subset(places)
    for turn in turns:
        value, slope = equations.evaluate(part.point)
        done = _step(part, value, slope, bisecting=is_bisecting_turn(turn)) & ~settled[places]
        brackets.point[places[done]] = part.point[done]
        settled[places[done]] = True
        failed = np.isnan(value)
        left = np.flatnonzero(~settled[places] & ~failed)
        if len(left) * 4 <= len(places) * 3:  # few are left: pack them together
            lost = np.flatnonzero(failed)
            brackets.put(places[lost], part.subset(lost))
            equations, part, places = equations.subset(left), part.subset(left), places[left]
        if not len(left):
            break
    left = np.flatnonzero(~settled[places])
    brackets.put(places[left], part.subset(left))
    return settled


def _step(part: Brackets, value: FloatArray, slope: FloatArray, *, bisecting: bool) -> BoolArray:
    """Move every point of a bracket on; where a value is NaN, nothing moves."""
    x = part.point
    is_low = (value < 0) == part.rising
    is_high = ~is_low & ~np.isnan(value)
    is_low &= ~np.isnan(value)
    part.low, part.high = np.where(is_low, x, part.low), np.where(is_high, x, part.high)
    step = value / slope
    new = x - step
    small = (np.abs(step) <= np.maximum(part.negligible, 2e-16 * np.abs(x))) | (value == 0)
    inside = (part.low < new) & (new < part.high)
    middle = (part.low + part.high) / 2
    new = np.where(inside & (small | (not bisecting)), new, np.where(small, x, middle))
    part.point = np.where(np.isnan(value), x, new)
    settled: BoolArray = small | (new == part.low) | (new == part.high)
    return settled
