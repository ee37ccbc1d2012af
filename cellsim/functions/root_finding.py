"""Roots of functions of one number: bracketed first, then polished."""

from __future__ import annotations

import math
from collections.abc import Callable

Evaluation = tuple[float, float]
"""Value and derivative."""

_MOST_STEPS = 200


def bracket_outward(
    value: Callable[[float], float], guess: float, low: float, high: float
) -> tuple[float, float] | None:
    """An interval around a guess at whose ends a function has different signs.

    The interval grows from the guess on both sides, so that of several roots the one nearest to the
    guess is enclosed.

    Args:
        value: The function.
        guess: Where to begin.
        low: The lower limit of the search.
        high: The upper limit.
    """
    guess = min(max(guess, low + (high - low) * 1e-12), high)
    centre = value(guess)
    if centre == 0:
        return guess, guess
    left = right = guess
    left_value = right_value = centre
    step = 0.01
    while left > low or right < high:
        if right < high:
            new = min(high, right + step)
            new_value = value(new)
            if _differ(right_value, new_value):
                return right, new
            right, right_value = new, new_value
        if left > low:
            new = max(low, left - step, low + (left - low) / 2 if left - step <= low else low)
            if new - low < 1e-12:
                new = low
            new_value = value(new)
            if _differ(left_value, new_value):
                return new, left
            left, left_value = new, new_value
        step *= 1.6
    return None


def _differ(a: float, b: float) -> bool:
    return (a <= 0 < b) or (b <= 0 < a) or (a < 0 <= b) or (b < 0 <= a)


def polish(evaluate: Callable[[float], Evaluation], low: float, high: float) -> float:
    """The root inside an interval, by Newton's method kept inside by bisection, to full precision."""
    if low == high:
        return low
    at_low, at_high = evaluate(low)[0], evaluate(high)[0]
    if at_low == 0:
        return low
    if at_high == 0:
        return high
    if at_low > 0:
        low, high = high, low
    x = (low + high) / 2
    for _ in range(_MOST_STEPS):
        value, slope = evaluate(x)
        if value == 0:
            return x
        if value < 0:
            low = x
        else:
            high = x
        new = x - value / slope if slope and math.isfinite(slope) else math.nan
        if not min(low, high) < new < max(low, high):
            new = (low + high) / 2
        if abs(new - x) <= 1e-16 * max(abs(new), 1e-3) or new in (low, high):
            return new
        x = new
    return x
