"""SUBTOTAL: a statistic of the cells in view, other subtotals passed over; and random numbers."""

from __future__ import annotations

import math
from collections.abc import Callable

from cellsim.functions.registry import CellArea, Context, Number, Whole, spreadsheet_function
from cellsim.values import ErrorValue, Fault, Scalar


def _variance(numbers: list[float], lost: int) -> float:
    if len(numbers) <= lost:
        raise Fault(ErrorValue.DIV0)
    centre = sum(numbers) / len(numbers)
    return sum((number - centre) ** 2 for number in numbers) / (len(numbers) - lost)


def _mean(numbers: list[float]) -> float:
    if not numbers:
        raise Fault(ErrorValue.DIV0)
    return sum(numbers) / len(numbers)


_STATISTICS: dict[int, Callable[[list[float]], float]] = {
    1: _mean,
    4: lambda numbers: max(numbers, default=0.0),
    5: lambda numbers: min(numbers, default=0.0),
    6: lambda numbers: math.prod(numbers) if numbers else 0.0,
    7: lambda numbers: math.sqrt(_variance(numbers, 1)),
    8: lambda numbers: math.sqrt(_variance(numbers, 0)),
    9: lambda numbers: sum(numbers, 0.0),
    10: lambda numbers: _variance(numbers, 1),
    11: lambda numbers: _variance(numbers, 0),
}


def _in_view(context: Context, where: CellArea, *, skip_hidden: bool) -> list[Scalar]:
    """The values of the cells that count: not filtered away, not hidden if asked, no subtotals."""
    found: list[Scalar] = []
    for area in where.areas:
        values = context.area_values(area)
        for row in range(values.rows):
            number = area.first_row + row
            if context.row_filtered(area.sheet, number):
                continue
            if skip_hidden and context.row_hidden(area.sheet, number):
                continue
            found += [
                values.at(row, column)
                for column in range(values.columns)
                if not context.holds_subtotal(area.sheet, number, area.first_column + column)
            ]
    return found


@spreadsheet_function("SUBTOTAL", least=2)
def subtotal(context: Context, kind: Whole, *ranges: CellArea) -> float | ErrorValue:
    """A statistic of the cells in view by its number; 101 to 111 pass over hidden rows too.

    1 mean, 2 count, 3 count of all, 4 maximum, 5 minimum, 6 product, 7 and 8 deviations, 9 sum, 10 and
    11 variances.
    """
    number = kind - 100 if kind > 100 else kind
    if not 1 <= number <= 11:
        return ErrorValue.VALUE
    values = [v for where in ranges for v in _in_view(context, where, skip_hidden=kind > 100)]
    if number == 3:
        return float(sum(value is not None for value in values))
    numbers = [value for value in values if type(value) is float]
    if number == 2:
        return float(len(numbers))
    for value in values:
        if isinstance(value, ErrorValue):
            return value
    return _STATISTICS[number](numbers)


@spreadsheet_function("RAND", volatile=True)
def uniform_random(context: Context) -> float:
    """A number from 0 to 1 of the cell's own fixed stream."""
    return context.random()


@spreadsheet_function("RANDBETWEEN", volatile=True)
def random_whole(context: Context, low: Number, high: Number) -> float | ErrorValue:
    """A whole number between two limits of the cell's own fixed stream."""
    first, last = math.ceil(low), math.floor(high)
    if first > last:
        return ErrorValue.NUM
    return float(first + math.floor(context.random() * (last - first + 1)))
