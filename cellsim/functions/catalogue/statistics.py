"""Descriptive statistics: location, spread, order, association."""

from __future__ import annotations

import math
from collections import Counter

import numpy as np

from cellsim.functions.coercion import to_number
from cellsim.functions.order_statistics import percentile_inclusive
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    FloatArray,
    Number,
    NumberItems,
    Operand,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Value, encode_error


def _joined(numbers: tuple[list[float], ...]) -> list[float]:
    return [number for items in numbers for number in items]


def _stacked(numbers: tuple[FloatArray, ...]) -> FloatArray:
    return numbers[0] if len(numbers) == 1 else np.concatenate(numbers)


def _sum(numbers: list[float]) -> float:
    total = 0.0
    for number in numbers:
        total += number
    return total


@spreadsheet_function("AVERAGE", least=1)
def mean(*numbers: NumberItems) -> float | ErrorValue:
    """The arithmetic mean."""
    found = _joined(numbers)
    return _sum(found) / len(found) if found else ErrorValue.DIV0


@spreadsheet_function("MIN", least=1)
def smallest(*numbers: NumberItems) -> float:
    """The smallest number; 0 if there is none."""
    return min(_joined(numbers), default=0.0)


@spreadsheet_function("MAX", least=1)
def largest(*numbers: NumberItems) -> float:
    """The largest number; 0 if there is none."""
    return max(_joined(numbers), default=0.0)


def _all_values(context: Context, arguments: tuple[Value, ...]) -> list[float]:
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


@spreadsheet_function("AVERAGEA", least=1)
def mean_of_all(context: Context, *values: Operand) -> float | ErrorValue:
    """The mean, text counting as 0 and logicals as 0 and 1."""
    found = _all_values(context, values)
    return _sum(found) / len(found) if found else ErrorValue.DIV0


@spreadsheet_function("MINA", least=1)
def smallest_of_all(context: Context, *values: Operand) -> float:
    """The smallest, text counting as 0 and logicals as 0 and 1."""
    return min(_all_values(context, values), default=0.0)


@spreadsheet_function("MAXA", least=1)
def largest_of_all(context: Context, *values: Operand) -> float:
    """The largest, text counting as 0 and logicals as 0 and 1."""
    return max(_all_values(context, values), default=0.0)


@spreadsheet_function("MEDIAN", least=1)
def median(*numbers: NumberItems) -> float | ErrorValue:
    """The middle number."""
    found = sorted(_joined(numbers))
    if not found:
        return ErrorValue.NUM
    middle = len(found) // 2
    return found[middle] if len(found) % 2 else (found[middle - 1] + found[middle]) / 2


@over_draws("MEDIAN")
def median_over_draws(*numbers: FloatArray) -> FloatArray:
    """MEDIAN over draws."""
    data = np.sort(_stacked(numbers), axis=0)
    middle = len(data) // 2
    result: FloatArray = data[middle] if len(data) % 2 else (data[middle - 1] + data[middle]) / 2
    return result


@spreadsheet_function("MODE", "MODE.SNGL", least=1)
def most_frequent(*numbers: NumberItems) -> float | ErrorValue:
    """The most frequent number, the first of several; #N/A if none repeats."""
    counts = Counter(_joined(numbers))
    if not counts:
        return ErrorValue.NA
    value, count = counts.most_common(1)[0]
    return value if count > 1 else ErrorValue.NA


@spreadsheet_function("MODE.MULT", least=1)
def most_frequent_of_all(*numbers: NumberItems) -> Array | ErrorValue:
    """All most frequent numbers, down a column."""
    counts = Counter(_joined(numbers))
    most = max(counts.values(), default=0)
    if most < 2:
        return ErrorValue.NA
    found = [value for value, count in counts.items() if count == most]
    return Array(len(found), 1, list(found))


@spreadsheet_function("LARGE")
def kth_largest(numbers: NumberItems, place: Number) -> float | ErrorValue:
    """The number at a place from the top."""
    k = math.ceil(place)
    return sorted(numbers, reverse=True)[k - 1] if 1 <= k <= len(numbers) else ErrorValue.NUM


@spreadsheet_function("SMALL")
def kth_smallest(numbers: NumberItems, place: Number) -> float | ErrorValue:
    """The number at a place from the bottom."""
    k = math.ceil(place)
    return sorted(numbers)[k - 1] if 1 <= k <= len(numbers) else ErrorValue.NUM


def _pick(data: FloatArray, place: FloatArray | float, *, from_top: bool) -> FloatArray:
    ordered = np.sort(data, axis=0)
    k = np.ceil(np.broadcast_to(place, ordered.shape[1:]))
    good = (k >= 1) & (k <= len(ordered))
    index = np.where(good, np.where(np.isnan(k), 1, k), 1).astype(np.intp)
    rows = len(ordered) - index if from_top else index - 1
    picked = np.take_along_axis(ordered, rows[None], axis=0)[0]
    return np.where(good, picked, encode_error(ErrorValue.NUM))


@over_draws("LARGE")
def kth_largest_over_draws(numbers: FloatArray, place: FloatArray | float) -> FloatArray:
    """LARGE over draws."""
    return _pick(numbers, place, from_top=True)


@over_draws("SMALL")
def kth_smallest_over_draws(numbers: FloatArray, place: FloatArray | float) -> FloatArray:
    """SMALL over draws."""
    return _pick(numbers, place, from_top=False)


@spreadsheet_function("PERCENTILE", "PERCENTILE.INC")
def percentile(numbers: NumberItems, share: Number) -> float:
    """The number below which a share of the numbers lies, ends included."""
    return percentile_inclusive(numbers, share)


@spreadsheet_function("QUARTILE", "QUARTILE.INC")
def quartile(numbers: NumberItems, quarter: Whole) -> float | ErrorValue:
    """A quartile, ends included."""
    return percentile_inclusive(numbers, quarter / 4) if 0 <= quarter <= 4 else ErrorValue.NUM


@over_draws("PERCENTILE", "PERCENTILE.INC")
def percentile_over_draws(numbers: FloatArray, share: FloatArray | float) -> FloatArray:
    """PERCENTILE over draws."""
    ordered = np.sort(numbers, axis=0)
    shares = np.broadcast_to(share, ordered.shape[1:])
    good = (shares >= 0) & (shares <= 1)
    place = np.where(good, shares, 0.0) * (len(ordered) - 1)
    low = np.floor(place).astype(np.intp)
    high = np.minimum(low + 1, len(ordered) - 1)
    below = np.take_along_axis(ordered, low[None], axis=0)[0]
    above = np.take_along_axis(ordered, high[None], axis=0)[0]
    return np.where(good, below + (above - below) * (place - low), encode_error(ErrorValue.NUM))


@over_draws("QUARTILE", "QUARTILE.INC")
def quartile_over_draws(numbers: FloatArray, quarter: FloatArray | float) -> FloatArray:
    """QUARTILE over draws."""
    return percentile_over_draws(numbers, np.trunc(quarter) / 4)


def _percent_rank(numbers: list[float], number: float, digits: int, *, ends: bool) -> float:
    ordered = sorted(numbers)
    if not ordered or digits < 1:
        raise Fault(ErrorValue.NUM)
    if not ordered[0] <= number <= ordered[-1]:
        raise Fault(ErrorValue.NA)
    below = sum(item < number for item in ordered)
    if number in ordered:
        place = float(below)
    else:
        low, high = ordered[below - 1], ordered[below]
        place = below - 1 + (number - low) / (high - low)
    share = (
        (place / (len(ordered) - 1) if len(ordered) > 1 else 1.0)
        if ends
        else (place + 1) / (len(ordered) + 1)
    )
    scale = 10.0**digits
    return math.floor(share * scale + 1e-9) / scale


@spreadsheet_function("PERCENTRANK", "PERCENTRANK.INC")
def percent_rank(numbers: NumberItems, number: Number, digits: Whole = 3) -> float:
    """The share of numbers below one, ends included, cut to some digits."""
    return _percent_rank(numbers, number, digits, ends=True)


@spreadsheet_function("PERCENTRANK.EXC")
def percent_rank_without_ends(numbers: NumberItems, number: Number, digits: Whole = 3) -> float:
    """The share of numbers below one, ends left out, cut to some digits."""
    return _percent_rank(numbers, number, digits, ends=False)


def squared_deviations(numbers: list[float]) -> float:
    """The sum of squared deviations from the mean, in two passes."""
    centre = _sum(numbers) / len(numbers)
    return _sum([(number - centre) ** 2 for number in numbers])


def _variance(numbers: list[float], lost: int) -> float:
    if len(numbers) <= lost:
        raise Fault(ErrorValue.DIV0)
    return squared_deviations(numbers) / (len(numbers) - lost)


@spreadsheet_function("VAR", "VAR.S", least=1)
def sample_variance(*numbers: NumberItems) -> float:
    """The variance of a sample."""
    return _variance(_joined(numbers), 1)


@spreadsheet_function("VARP", "VAR.P", least=1)
def population_variance(*numbers: NumberItems) -> float:
    """The variance of a population."""
    return _variance(_joined(numbers), 0)


@spreadsheet_function("STDEV", "STDEV.S", least=1)
def sample_deviation(*numbers: NumberItems) -> float:
    """The standard deviation of a sample."""
    return math.sqrt(_variance(_joined(numbers), 1))


@spreadsheet_function("STDEVP", "STDEV.P", least=1)
def population_deviation(*numbers: NumberItems) -> float:
    """The standard deviation of a population."""
    return math.sqrt(_variance(_joined(numbers), 0))


@spreadsheet_function("VARA", least=1)
def sample_variance_of_all(context: Context, *values: Operand) -> float:
    """The variance of a sample, text counting as 0."""
    return _variance(_all_values(context, values), 1)


@spreadsheet_function("VARPA", least=1)
def population_variance_of_all(context: Context, *values: Operand) -> float:
    """The variance of a population, text counting as 0."""
    return _variance(_all_values(context, values), 0)


@spreadsheet_function("STDEVA", least=1)
def sample_deviation_of_all(context: Context, *values: Operand) -> float:
    """The standard deviation of a sample, text counting as 0."""
    return math.sqrt(_variance(_all_values(context, values), 1))


@spreadsheet_function("STDEVPA", least=1)
def population_deviation_of_all(context: Context, *values: Operand) -> float:
    """The standard deviation of a population, text counting as 0."""
    return math.sqrt(_variance(_all_values(context, values), 0))


def _variance_over_draws(numbers: tuple[FloatArray, ...], lost: int) -> FloatArray:
    data = _stacked(numbers)
    if len(data) <= lost:
        return np.full(data.shape[1:], encode_error(ErrorValue.DIV0))
    total = np.zeros(data.shape[1])
    for row in data:
        total = total + row
    centre = total / len(data)
    squares = np.zeros(data.shape[1])
    for row in data:
        squares = squares + (row - centre) ** 2
    return squares / (len(data) - lost)


@over_draws("VAR", "VAR.S")
def sample_variance_over_draws(*numbers: FloatArray) -> FloatArray:
    """VAR over draws."""
    return _variance_over_draws(numbers, 1)


@over_draws("VARP", "VAR.P")
def population_variance_over_draws(*numbers: FloatArray) -> FloatArray:
    """VARP over draws."""
    return _variance_over_draws(numbers, 0)


@over_draws("STDEV", "STDEV.S")
def sample_deviation_over_draws(*numbers: FloatArray) -> FloatArray:
    """STDEV over draws."""
    return _root(_variance_over_draws(numbers, 1))


@over_draws("STDEVP", "STDEV.P")
def population_deviation_over_draws(*numbers: FloatArray) -> FloatArray:
    """STDEVP over draws."""
    return _root(_variance_over_draws(numbers, 0))


def _root(variance: FloatArray) -> FloatArray:
    return np.where(np.isnan(variance), variance, np.sqrt(variance))


@spreadsheet_function("DEVSQ", least=1)
def deviations_squared(*numbers: NumberItems) -> float | ErrorValue:
    """The sum of squared deviations from the mean."""
    found = _joined(numbers)
    return squared_deviations(found) if found else ErrorValue.NUM


@spreadsheet_function("AVEDEV", least=1)
def mean_deviation(*numbers: NumberItems) -> float | ErrorValue:
    """The mean of absolute deviations from the mean."""
    found = _joined(numbers)
    if not found:
        return ErrorValue.NUM
    centre = _sum(found) / len(found)
    return _sum([abs(number - centre) for number in found]) / len(found)


@spreadsheet_function("GEOMEAN", least=1)
def geometric_mean(*numbers: NumberItems) -> float | ErrorValue:
    """The geometric mean of positive numbers."""
    found = _joined(numbers)
    if not found or min(found) <= 0:
        return ErrorValue.NUM
    return math.exp(math.fsum(math.log(number) for number in found) / len(found))


@spreadsheet_function("HARMEAN", least=1)
def harmonic_mean(*numbers: NumberItems) -> float | ErrorValue:
    """The harmonic mean of positive numbers."""
    found = _joined(numbers)
    if not found or min(found) <= 0:
        return ErrorValue.NUM
    return len(found) / _sum([1 / number for number in found])


@spreadsheet_function("TRIMMEAN")
def trimmed_mean(numbers: NumberItems, share: Number) -> float | ErrorValue:
    """The mean without a share of the numbers, half of it at each end."""
    if not numbers or not 0 <= share < 1:
        return ErrorValue.NUM
    cut = int(len(numbers) * share / 2 + 1e-9)
    kept = sorted(numbers)[cut : len(numbers) - cut]
    return _sum(kept) / len(kept)


@spreadsheet_function("SKEW", least=1)
def sample_skewness(*numbers: NumberItems) -> float | ErrorValue:
    """The skewness of a sample."""
    found = _joined(numbers)
    n = len(found)
    if n < 3 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = _sum(found) / n, math.sqrt(_variance(found, 1))
    return (
        n / ((n - 1) * (n - 2)) * _sum([((number - centre) / deviation) ** 3 for number in found])
    )


@spreadsheet_function("SKEW.P", least=1)
def population_skewness(*numbers: NumberItems) -> float | ErrorValue:
    """The skewness of a population."""
    found = _joined(numbers)
    n = len(found)
    if n < 3 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = _sum(found) / n, math.sqrt(_variance(found, 0))
    return _sum([((number - centre) / deviation) ** 3 for number in found]) / n


@spreadsheet_function("KURT", least=1)
def sample_excess_kurtosis(*numbers: NumberItems) -> float | ErrorValue:
    """The excess kurtosis of a sample."""
    found = _joined(numbers)
    n = len(found)
    if n < 4 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = _sum(found) / n, math.sqrt(_variance(found, 1))
    fourth = _sum([((number - centre) / deviation) ** 4 for number in found])
    return n * (n + 1) / ((n - 1) * (n - 2) * (n - 3)) * fourth - 3 * (n - 1) ** 2 / (
        (n - 2) * (n - 3)
    )


@spreadsheet_function("STANDARDIZE")
def standard_score(number: Number, centre: Number, deviation: Number) -> float | ErrorValue:
    """How many standard deviations a number lies from a mean."""
    return (number - centre) / deviation if deviation > 0 else ErrorValue.NUM


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


@spreadsheet_function("PROB")
def probability_between(
    values: ArrayValues, probabilities: ArrayValues, low: Number, high: Number | None = None
) -> float | ErrorValue:
    """The probability that a value lies between two limits."""
    if len(values.items) != len(probabilities.items):
        return ErrorValue.NA
    pairs = [
        (value, share)
        for value, share in zip(values.items, probabilities.items, strict=True)
        if type(value) is float and type(share) is float
    ]
    total = _sum([share for _, share in pairs])
    if any(not 0 < share <= 1 for _, share in pairs) or abs(total - 1) > 1e-9:
        return ErrorValue.NUM
    top = low if high is None else high
    return _sum([share for value, share in pairs if low <= value <= top])
