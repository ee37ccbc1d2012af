"""SUBTOTAL and AGGREGATE: a statistic of the cells in view, other subtotals passed over; and random numbers."""

from __future__ import annotations

import math
from collections.abc import Callable

from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import single_value
from cellsim.functions.moments import average, mode, total, variance
from cellsim.functions.order_statistics import (
    kth_from_an_end,
    percentile_exclusive,
    percentile_inclusive,
)
from cellsim.functions.registry import (
    ArrayOperand,
    CellArea,
    Context,
    Number,
    Whole,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Reference, Scalar, Value

_STATISTICS: dict[int, Callable[[list[float]], float]] = {
    1: average,
    4: lambda numbers: max(numbers, default=0.0),
    5: lambda numbers: min(numbers, default=0.0),
    6: lambda numbers: math.prod(numbers) if numbers else 0.0,
    7: lambda numbers: math.sqrt(variance(numbers, 1)),
    8: lambda numbers: math.sqrt(variance(numbers, 0)),
    9: total,
    10: lambda numbers: variance(numbers, 1),
    11: lambda numbers: variance(numbers, 0),
}


def _in_view(
    context: Context,
    where: CellArea,
    *,
    skip_hidden: bool,
    skip_filtered: bool = True,
    skip_subtotals: bool = True,
) -> list[Scalar]:
    """The values of the cells that count: not filtered away, not hidden if asked, no subtotals."""
    found: list[Scalar] = []
    for area in where.areas:
        values = context.area_values(area)
        for row in range(values.rows):
            number = area.first_row + row
            if skip_filtered and context.row_filtered(area.sheet, number):
                continue
            if skip_hidden and context.row_hidden(area.sheet, number):
                continue
            found += [
                values.at(row, column)
                for column in range(values.columns)
                if not skip_subtotals
                or not context.holds_subtotal(area.sheet, number, area.first_column + column)
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


@spreadsheet_function("AGGREGATE", least=3)
def aggregate(context: Context, kind: Whole, option: Whole, *values: ArrayOperand) -> Value:
    """A statistic by its number, passing over hidden rows, errors or other subtotals as an option says.

    Kinds 1 to 11 as SUBTOTAL; 12 median, 13 mode; with a further argument 14 large, 15 small, 16 and 18
    percentiles, 17 and 19 quartiles. Options 1, 3, 5 and 7 pass over hidden rows, 2, 3, 6 and 7 over
    errors, 0 to 3 over subtotals.
    """
    if not 1 <= kind <= 19 or not 0 <= option <= 7:
        return ErrorValue.VALUE
    place: float | None = None
    if kind >= 14:
        if len(values) != 2:
            return ErrorValue.VALUE
        place = to_number(single_value(values[1], context))
        values = values[:1]
    items = [
        item for value in values for item in _aggregated(context, value, option, cells=kind < 14)
    ]
    if option in {2, 3, 6, 7}:
        items = [item for item in items if not isinstance(item, ErrorValue)]
    if kind == 3:
        return float(sum(item is not None for item in items))
    numbers = [item for item in items if type(item) is float]
    if kind == 2:
        return float(len(numbers))
    failing = next((item for item in items if isinstance(item, ErrorValue)), None)
    if failing is not None:
        return failing
    if place is not None:
        return _at_place(kind, numbers, place)
    if kind in {12, 13}:
        return percentile_inclusive(numbers, 0.5) if kind == 12 else mode(numbers)
    return _STATISTICS[kind](numbers)


def _aggregated(context: Context, value: Value, option: int, *, cells: bool) -> list[Scalar]:
    """The items that an argument of AGGREGATE gives; kinds 1 to 13 take cells, not arrays.

    Raises:
        Fault: It is an error, or an array where cells are wanted.
    """
    if isinstance(value, Reference):
        hidden = option in {1, 3, 5, 7}
        return _in_view(
            context, value, skip_hidden=hidden, skip_filtered=hidden, skip_subtotals=option <= 3
        )
    if isinstance(value, Array) and not cells:
        return value.items
    raise Fault(value if isinstance(value, ErrorValue) else ErrorValue.VALUE)


def _at_place(kind: int, numbers: list[float], place: float) -> Value:
    """LARGE, SMALL, and percentiles and quartiles with their ends or without."""
    if kind in {14, 15}:
        return kth_from_an_end(numbers, place, from_top=kind == 14)
    if kind in {17, 19}:
        place = int(place) / 4
    if kind in {16, 17}:
        return percentile_inclusive(numbers, place)
    return percentile_exclusive(numbers, place)


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
