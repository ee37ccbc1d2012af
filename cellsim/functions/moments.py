"""Sums, means and variances of plain lists of numbers, and how arguments become such lists."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence

import numpy as np

from cellsim.functions.coercion import to_number
from cellsim.functions.registry import Context, FloatArray
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Value


def joined(numbers: Sequence[list[float]]) -> list[float]:
    """The numbers of several arguments in one list."""
    return [number for items in numbers for number in items]


def stacked(numbers: Sequence[FloatArray]) -> FloatArray:
    """The same over draws: shape (numbers, draws)."""
    return numbers[0] if len(numbers) == 1 else np.concatenate(numbers)


def total(numbers: Iterable[float]) -> float:
    """The sum from left to right; Python's own `sum` rounds otherwise from version to version."""
    result = 0.0
    for number in numbers:
        result += number
    return result


def average(numbers: list[float]) -> float:
    """The arithmetic mean.

    Raises:
        Fault: There is no number (#DIV/0!).
    """
    if not numbers:
        raise Fault(ErrorValue.DIV0)
    return total(numbers) / len(numbers)


def squared_deviations(numbers: list[float]) -> float:
    """The sum of squared deviations from the mean, in two passes."""
    centre = total(numbers) / len(numbers)
    return total((number - centre) ** 2 for number in numbers)


def variance(numbers: list[float], lost: int) -> float:
    """The variance.

    Args:
        numbers: The numbers.
        lost: Degrees of freedom lost: 1 for a sample, 0 for a population.

    Raises:
        Fault: There are not more numbers than that (#DIV/0!).
    """
    if len(numbers) <= lost:
        raise Fault(ErrorValue.DIV0)
    return squared_deviations(numbers) / (len(numbers) - lost)


def mode(numbers: list[float]) -> float:
    """The most frequent number, the first of several.

    Raises:
        Fault: None repeats (#N/A).
    """
    counts = Counter(numbers)
    value, count = counts.most_common(1)[0] if counts else (0.0, 0)
    if count < 2:
        raise Fault(ErrorValue.NA)
    return value


def all_values(context: Context, arguments: tuple[Value, ...]) -> list[float]:
    """Numbers, with logicals as 1 and 0 and text in ranges as 0: the rule of the ...A functions."""
    found: list[float] = []
    for argument in arguments:
        if isinstance(argument, LambdaValue):
            raise Fault(ErrorValue.CALC)
        if not isinstance(argument, (Reference, Array)):
            found.append(to_number(argument))
            continue
        arrays = (
            [argument]
            if isinstance(argument, Array)
            else [context.area_values(a) for a in argument.areas]
        )
        for item in (item for array in arrays for item in array.items):
            if isinstance(item, ErrorValue):
                raise Fault(item)
            if item is not None:
                found.append(0.0 if isinstance(item, str) else float(item))
    return found
