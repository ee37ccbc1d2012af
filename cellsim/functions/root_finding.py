"""Roots of functions of a rate, one draw at a time: enclosed first, then polished.

The search for a root starts at a guess and widens on both sides, so that of several roots the one
nearest the guess is found. Polishing is Newton's method kept inside the interval by bisection (Press et
al., Numerical Recipes, "Newton-Raphson Method Using Derivative"). The forms over draws in
`root_finding_over_draws` take the same steps.
"""

from __future__ import annotations

import bisect
import math
from collections.abc import Callable
from functools import lru_cache

Evaluation = tuple[float, float]
"""Value and derivative."""

LOWEST_RATE = -1 + 1e-9
HIGHEST_RATE = 1e6
"""Roots are looked for between these rates."""

MOST_STEPS = 250
_PATIENCE = 15
_FIRST_STEP = 0.005
_GROWTH = 1.25


@lru_cache(maxsize=256)
def search_rates(guess: float) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """The rates at which roots are looked for, upward and downward from a guess, both beginning there.

    Args:
        guess: Above -1.
    """
    up, down = [guess], [guess]
    step = _FIRST_STEP
    while up[-1] < HIGHEST_RATE:
        up.append(min(up[-1] + step, HIGHEST_RATE))
        step *= _GROWTH
    step = _FIRST_STEP
    while down[-1] > LOWEST_RATE:
        reach = down[-1] - LOWEST_RATE
        if reach <= 1e-9:
            down.append(LOWEST_RATE)
        else:
            down.append(down[-1] - min(step, reach / 2))
        step *= _GROWTH
    return tuple(up), tuple(down)


def rates_between(
    guess: float, floor: float, ceiling: float
) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """The search rates up and down from a guess that bound a stretch between two rates or lie in it."""
    up, down = search_rates(guess)
    first_up = max(bisect.bisect_right(up, floor) - 1, 0)
    up = up[first_up : bisect.bisect_left(up, ceiling) + 1]
    mirrored = [-rate for rate in down]
    first_down = max(bisect.bisect_right(mirrored, -ceiling) - 1, 0)
    down = down[first_down : bisect.bisect_left(mirrored, -floor) + 1]
    return up, down


def enclose(
    value: Callable[[float], float],
    guess: float,
    floor: float = LOWEST_RATE,
    ceiling: float = HIGHEST_RATE,
) -> tuple[float, float] | None:
    """The two neighbouring search rates nearest a guess between which a function changes sign.

    Args:
        value: The function; where it overflows it may raise OverflowError or give NaN.
        guess: Where to begin, above -1.
        floor: There is no root below.
        ceiling: There is no root above.

    Returns:
        The lower and the higher rate, equal where a search rate is a root; None if there is none.
    """

    def safe(rate: float) -> float:
        try:
            return value(rate)
        except (OverflowError, ZeroDivisionError):
            return math.nan

    sides = [list(side) for side in rates_between(guess, floor, ceiling) if len(side) > 1]
    values = [safe(side[0]) for side in sides]
    for side, here in zip(sides, values, strict=True):
        if here == 0:
            return side[0], side[0]
    for place in range(1, max((len(side) for side in sides), default=0)):
        for number, side in enumerate(sides):
            if place >= len(side):
                continue
            new, old = safe(side[place]), values[number]
            if new == 0:
                return side[place], side[place]
            if (old < 0 < new) or (new < 0 < old):
                near, far = side[place - 1], side[place]
                return min(near, far), max(near, far)
            values[number] = new
    return None


def is_bisecting_turn(turn: int) -> bool:
    """Whether a step is a bisection although Newton's would do: some are, where it is slow to settle."""
    return turn >= _PATIENCE and turn % 3 == 0


def polish(
    evaluate: Callable[[float], Evaluation],
    low: float,
    high: float,
    *,
    start: float | None = None,
    rising: bool | None = None,
    negligible: float = 0.0,
) -> float:
    """The root inside an interval, to full precision.

    Args:
        evaluate: Value and derivative at a point.
        low: The lower end.
        high: The higher end.
        start: Where to begin; the middle by default.
        rising: Whether the function is negative below the root; found from `low` by default.
        negligible: A Newton step this small leaves an error far below rounding.
    """
    if low == high:
        return low
    if rising is None:
        rising = evaluate(low)[0] < 0
    x = (low + high) / 2 if start is None else start
    for turn in range(MOST_STEPS):
        value, slope = evaluate(x)
        if value == 0:
            return x
        if (value < 0) == rising:
            low = x
        else:
            high = x
        step = value / slope if slope else math.inf
        new = x - step
        if abs(step) <= max(negligible, 2e-16 * abs(x)):
            return new if low < new < high else x
        if not low < new < high or is_bisecting_turn(turn):
            new = (low + high) / 2
        if new in (low, high):
            return new
        x = new
    return x
