"""Means, extremes and frequencies."""

from __future__ import annotations

import math
from collections import Counter

from cellsim.functions.moments import (
    all_values,
    average,
    joined,
    mode,
    total,
)
from cellsim.functions.registry import (
    Context,
    Number,
    NumberItems,
    Operand,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue


@spreadsheet_function("AVERAGE", least=1)
def mean(*numbers: NumberItems) -> float:
    """The arithmetic mean."""
    return average(joined(numbers))


@spreadsheet_function("MIN", least=1)
def smallest(*numbers: NumberItems) -> float:
    """The smallest number; 0 if there is none."""
    return min(joined(numbers), default=0.0)


@spreadsheet_function("MAX", least=1)
def largest(*numbers: NumberItems) -> float:
    """The largest number; 0 if there is none."""
    return max(joined(numbers), default=0.0)


@spreadsheet_function("AVERAGEA", least=1)
def mean_of_all(context: Context, *values: Operand) -> float | ErrorValue:
    """The mean, text counting as 0 and logicals as 0 and 1."""
    found = all_values(context, values)
    return total(found) / len(found) if found else ErrorValue.DIV0


@spreadsheet_function("MINA", least=1)
def smallest_of_all(context: Context, *values: Operand) -> float:
    """The smallest, text counting as 0 and logicals as 0 and 1."""
    return min(all_values(context, values), default=0.0)


@spreadsheet_function("MAXA", least=1)
def largest_of_all(context: Context, *values: Operand) -> float:
    """The largest, text counting as 0 and logicals as 0 and 1."""
    return max(all_values(context, values), default=0.0)


@spreadsheet_function("MODE", "MODE.SNGL", least=1)
def most_frequent(*numbers: NumberItems) -> float:
    """The most frequent number, the first of several; #N/A if none repeats."""
    return mode(joined(numbers))


@spreadsheet_function("MODE.MULT", least=1)
def most_frequent_of_all(*numbers: NumberItems) -> Array | ErrorValue:
    """All most frequent numbers, down a column."""
    counts = Counter(joined(numbers))
    most = max(counts.values(), default=0)
    if most < 2:
        return ErrorValue.NA
    found = [value for value, count in counts.items() if count == most]
    return Array(len(found), 1, list(found))


@spreadsheet_function("GEOMEAN", least=1)
def geometric_mean(*numbers: NumberItems) -> float | ErrorValue:
    """The geometric mean of positive numbers."""
    found = joined(numbers)
    if not found or min(found) <= 0:
        return ErrorValue.NUM
    return math.exp(math.fsum(math.log(number) for number in found) / len(found))


@spreadsheet_function("HARMEAN", least=1)
def harmonic_mean(*numbers: NumberItems) -> float | ErrorValue:
    """The harmonic mean of positive numbers."""
    found = joined(numbers)
    if not found or min(found) <= 0:
        return ErrorValue.NUM
    return len(found) / total([1 / number for number in found])


@spreadsheet_function("TRIMMEAN")
def trimmed_mean(numbers: NumberItems, share: Number) -> float | ErrorValue:
    """The mean without a share of the numbers, half of it at each end."""
    if not numbers or not 0 <= share < 1:
        return ErrorValue.NUM
    cut = int(len(numbers) * share / 2 + 1e-9)
    kept = sorted(numbers)[cut : len(numbers) - cut]
    return total(kept) / len(kept)


@spreadsheet_function("FREQUENCY")
def frequencies(numbers: NumberItems, limits: NumberItems) -> Array:
    """How many numbers lie up to each limit and above the last, down a column."""
    ordered = sorted(limits)
    counts = [0] * (len(limits) + 1)
    for number in numbers:
        place = next((k for k, limit in enumerate(ordered) if number <= limit), len(ordered))
        counts[place] += 1
    by_limit: dict[float, list[int]] = {}
    for limit, count in zip(ordered, counts, strict=False):
        by_limit.setdefault(limit, []).append(count)
    result = [float(by_limit[limit].pop(0)) for limit in limits]
    return Array(len(result) + 1, 1, [*result, float(counts[-1])])
