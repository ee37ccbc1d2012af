"""Straight lines and exponential curves through data, correlation, covariance."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.least_squares import Fit, fit_line, paired_numbers
from cellsim.functions.moments import total
from cellsim.functions.registry import (
    ArrayValues,
    FloatArray,
    Logical,
    Number,
    Stack,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Scalar, encode_error


def _sums(x: list[float], y: list[float]) -> tuple[float, float, float, float, float]:
    """Means, and sums of squared and crossed deviations."""
    n = len(x)
    mean_x, mean_y = total(x) / n, total(y) / n
    sxx = total((a - mean_x) ** 2 for a in x)
    syy = total((b - mean_y) ** 2 for b in y)
    sxy = total((a - mean_x) * (b - mean_y) for a, b in zip(x, y, strict=True))
    return mean_x, mean_y, sxx, syy, sxy


@spreadsheet_function("CORREL", "PEARSON")
def correlation(first: ArrayValues, second: ArrayValues) -> float | ErrorValue:
    """The linear correlation of two lists of numbers."""
    x, y = paired_numbers(first, second)
    if not x:
        return ErrorValue.DIV0
    _, _, sxx, syy, sxy = _sums(x, y)
    if sxx == 0 or syy == 0:
        return ErrorValue.DIV0
    return sxy / math.sqrt(sxx * syy)


@over_draws("CORREL", "PEARSON")
def correlation_over_draws(first: Stack, second: Stack) -> FloatArray | None:
    """CORREL over draws."""
    if first.data.shape != second.data.shape:
        return None
    x = first.data - first.data.sum(axis=0) / len(first.data)
    y = second.data - second.data.sum(axis=0) / len(second.data)
    scale = np.sqrt((x * x).sum(axis=0) * (y * y).sum(axis=0))
    return np.where(scale == 0, encode_error(ErrorValue.DIV0), (x * y).sum(axis=0) / scale)


@spreadsheet_function("RSQ")
def squared_correlation(known_y: ArrayValues, known_x: ArrayValues) -> float | ErrorValue:
    """The square of the linear correlation."""
    found = correlation(known_y, known_x)
    return found if isinstance(found, ErrorValue) else found * found


def _covariance(first: Array, second: Array, lost: int) -> float:
    x, y = paired_numbers(first, second)
    if len(x) <= lost:
        raise Fault(ErrorValue.DIV0)
    return _sums(x, y)[4] / (len(x) - lost)


@spreadsheet_function("COVAR", "COVARIANCE.P")
def population_covariance(first: ArrayValues, second: ArrayValues) -> float:
    """The covariance of a population."""
    return _covariance(first, second, 0)


@spreadsheet_function("COVARIANCE.S")
def sample_covariance(first: ArrayValues, second: ArrayValues) -> float:
    """The covariance of a sample."""
    return _covariance(first, second, 1)


def _line(known_y: Array, known_x: Array) -> tuple[float, float]:
    y, x = paired_numbers(known_y, known_x)  # an error among the first comes first
    if not x:
        raise Fault(ErrorValue.DIV0)
    mean_x, mean_y, sxx, _, sxy = _sums(x, y)
    if sxx == 0:
        raise Fault(ErrorValue.DIV0)
    slope = sxy / sxx
    return slope, mean_y - slope * mean_x


@spreadsheet_function("SLOPE")
def slope(known_y: ArrayValues, known_x: ArrayValues) -> float:
    """The slope of the least-squares line."""
    return _line(known_y, known_x)[0]


@spreadsheet_function("INTERCEPT")
def intercept(known_y: ArrayValues, known_x: ArrayValues) -> float:
    """Where the least-squares line meets the axis."""
    return _line(known_y, known_x)[1]


@spreadsheet_function("FORECAST", "FORECAST.LINEAR")
def on_the_line(x: Number, known_y: ArrayValues, known_x: ArrayValues) -> float:
    """The value of the least-squares line at a place."""
    gradient, start = _line(known_y, known_x)
    return start + gradient * x


@spreadsheet_function("STEYX")
def error_about_the_line(known_y: ArrayValues, known_x: ArrayValues) -> float | ErrorValue:
    """The standard error about the least-squares line."""
    y, x = paired_numbers(known_y, known_x)  # an error among the first comes first
    if len(x) < 3:
        return ErrorValue.DIV0
    _, _, sxx, syy, sxy = _sums(x, y)
    return math.sqrt((syy - sxy * sxy / sxx) / (len(x) - 2)) if sxx else ErrorValue.DIV0


def _predicted(
    fit: Fit, known_y: Array, known_x: Array | None, new_x: Array | None
) -> tuple[Array, list[float]]:
    """The array whose shape the answer has, and the fitted values."""
    where = new_x or known_x or known_y
    if known_x is None and new_x is None:
        return known_y, fit.at([[float(k + 1)] for k in range(len(known_y.items))])
    rows = fit.rows_of(where)
    shape = where if fit.variables == 1 else Array(len(rows), 1, [0.0] * len(rows))
    if fit.variables > 1 and known_y.rows == 1:
        shape = Array(1, len(rows), [0.0] * len(rows))
    return shape, fit.at(rows)


@spreadsheet_function("TREND")
def values_on_the_line(
    known_y: ArrayValues,
    known_x: ArrayValues | None = None,
    new_x: ArrayValues | None = None,
    constant: Logical = True,
) -> Array:
    """Values of the least-squares line, at the known or at new places."""
    shape, values = _predicted(
        fit_line(known_y, known_x, constant=constant), known_y, known_x, new_x
    )
    return Array(shape.rows, shape.columns, list(values))


def _logarithms(values: Array) -> Array:
    items: list[Scalar] = []
    for item in values.items:
        if isinstance(item, float) and item <= 0:
            raise Fault(ErrorValue.NUM)
        items.append(math.log(item) if isinstance(item, float) else item)
    return Array(values.rows, values.columns, items)


@spreadsheet_function("GROWTH")
def values_on_the_curve(
    known_y: ArrayValues,
    known_x: ArrayValues | None = None,
    new_x: ArrayValues | None = None,
    constant: Logical = True,
) -> Array:
    """Values of the exponential curve fitted by least squares to the logarithms."""
    logs = _logarithms(known_y)
    shape, values = _predicted(fit_line(logs, known_x, constant=constant), known_y, known_x, new_x)
    return Array(shape.rows, shape.columns, [math.exp(value) for value in values])


@spreadsheet_function("LINEST")
def line_statistics(
    known_y: ArrayValues,
    known_x: ArrayValues | None = None,
    constant: Logical = True,
    more: Logical = False,
) -> Array:
    """The coefficients of the least-squares line, last variable first; with more, their statistics."""
    return fit_line(known_y, known_x, constant=constant).table(more=more)


@spreadsheet_function("LOGEST")
def curve_statistics(
    known_y: ArrayValues,
    known_x: ArrayValues | None = None,
    constant: Logical = True,
    more: Logical = False,
) -> Array:
    """The coefficients of the exponential curve; with more, the statistics of the line of logarithms."""
    table = fit_line(_logarithms(known_y), known_x, constant=constant).table(more=more)
    width = table.columns
    items = [
        math.exp(x) if k < width and isinstance(x, float) else x for k, x in enumerate(table.items)
    ]
    return Array(table.rows, width, items)
