"""Spread and shape: variances, deviations, skewness and kurtosis."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.moments import (
    all_values,
    joined,
    squared_deviations,
    stacked,
    total,
    variance,
)
from cellsim.functions.registry import (
    Context,
    FloatArray,
    NumberItems,
    Operand,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import ErrorValue, encode_error


@spreadsheet_function("VAR", "VAR.S", least=1)
def samplevariance(*numbers: NumberItems) -> float:
    """The variance of a sample."""
    return variance(joined(numbers), 1)


@spreadsheet_function("VARP", "VAR.P", least=1)
def populationvariance(*numbers: NumberItems) -> float:
    """The variance of a population."""
    return variance(joined(numbers), 0)


@spreadsheet_function("STDEV", "STDEV.S", least=1)
def sample_deviation(*numbers: NumberItems) -> float:
    """The standard deviation of a sample."""
    return math.sqrt(variance(joined(numbers), 1))


@spreadsheet_function("STDEVP", "STDEV.P", least=1)
def population_deviation(*numbers: NumberItems) -> float:
    """The standard deviation of a population."""
    return math.sqrt(variance(joined(numbers), 0))


@spreadsheet_function("VARA", least=1)
def sample_variance_of_all(context: Context, *values: Operand) -> float:
    """The variance of a sample, text counting as 0."""
    return variance(all_values(context, values), 1)


@spreadsheet_function("VARPA", least=1)
def population_variance_of_all(context: Context, *values: Operand) -> float:
    """The variance of a population, text counting as 0."""
    return variance(all_values(context, values), 0)


@spreadsheet_function("STDEVA", least=1)
def sample_deviation_of_all(context: Context, *values: Operand) -> float:
    """The standard deviation of a sample, text counting as 0."""
    return math.sqrt(variance(all_values(context, values), 1))


@spreadsheet_function("STDEVPA", least=1)
def population_deviation_of_all(context: Context, *values: Operand) -> float:
    """The standard deviation of a population, text counting as 0."""
    return math.sqrt(variance(all_values(context, values), 0))


def _variance_over_draws(numbers: tuple[FloatArray, ...], lost: int) -> FloatArray:
    data = stacked(numbers)
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
    found = joined(numbers)
    return squared_deviations(found) if found else ErrorValue.NUM


@spreadsheet_function("AVEDEV", least=1)
def mean_deviation(*numbers: NumberItems) -> float | ErrorValue:
    """The mean of absolute deviations from the mean."""
    found = joined(numbers)
    if not found:
        return ErrorValue.NUM
    centre = total(found) / len(found)
    return total([abs(number - centre) for number in found]) / len(found)


@spreadsheet_function("SKEW", least=1)
def sample_skewness(*numbers: NumberItems) -> float | ErrorValue:
    """The skewness of a sample."""
    found = joined(numbers)
    n = len(found)
    if n < 3 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = total(found) / n, math.sqrt(variance(found, 1))
    return (
        n / ((n - 1) * (n - 2)) * total([((number - centre) / deviation) ** 3 for number in found])
    )


@spreadsheet_function("SKEW.P", least=1)
def population_skewness(*numbers: NumberItems) -> float | ErrorValue:
    """The skewness of a population."""
    found = joined(numbers)
    n = len(found)
    if n < 3 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = total(found) / n, math.sqrt(variance(found, 0))
    return total([((number - centre) / deviation) ** 3 for number in found]) / n


@spreadsheet_function("KURT", least=1)
def sample_excess_kurtosis(*numbers: NumberItems) -> float | ErrorValue:
    """The excess kurtosis of a sample."""
    found = joined(numbers)
    n = len(found)
    if n < 4 or squared_deviations(found) == 0:
        return ErrorValue.DIV0
    centre, deviation = total(found) / n, math.sqrt(variance(found, 1))
    fourth = total([((number - centre) / deviation) ** 4 for number in found])
    return n * (n + 1) / ((n - 1) * (n - 2) * (n - 3)) * fourth - 3 * (n - 1) ** 2 / (
        (n - 2) * (n - 3)
    )
