"""Functions that take a function: item by item, row by row, step by step."""

from __future__ import annotations

from collections.abc import Sequence
from typing import cast

from cellsim.functions.array_limits import TextBudget, bounded_shape
from cellsim.functions.dispatch import common_shape, item_at, values_of
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    Function,
    Operand,
    Whole,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value


def _called(context: Context, function: LambdaValue, arguments: Sequence[Value]) -> Scalar:
    """One call; its result must be a single value.

    Raises:
        Fault: A wrong number of arguments (#VALUE!), an array as result (#CALC!).
    """
    value = _result(function, arguments)
    if isinstance(value, LambdaValue):
        return cast("Scalar", value)  # an array on its way to another helper may hold functions
    found = values_of(value, context)
    if found.rows * found.columns != 1:
        raise Fault(ErrorValue.CALC)
    item = found.items[0]
    return 0.0 if item is None else item


def _result(function: LambdaValue, arguments: Sequence[Value]) -> Value:
    if not function.least <= len(arguments) <= function.most:
        raise Fault(ErrorValue.VALUE)
    try:
        return function.call(arguments)
    except Fault as fault:
        return fault.error


@spreadsheet_function("MAP", least=2)
def map_items(context: Context, *arguments: Operand) -> Array:
    """A function of the corresponding items of arrays."""
    function = arguments[-1]
    if not isinstance(function, LambdaValue):
        raise Fault(function if isinstance(function, ErrorValue) else ErrorValue.VALUE)
    arrays = [values_of(argument, context) for argument in arguments[:-1]]
    ranges = [isinstance(argument, Reference) for argument in arguments[:-1]]
    rows, columns = common_shape(arrays)
    text = TextBudget()
    items = []
    for row in range(rows):
        for column in range(columns):
            single = [item_at(array, row, column) for array in arrays]
            given: list[Value] = [  # a cell of a range stays one: MAX passes over its text
                Array(1, 1, [item]) if in_range else item
                for item, in_range in zip(single, ranges, strict=True)
            ]
            items.append(text.take(_called(context, function, given)))
    return Array(rows, columns, items)


@spreadsheet_function("REDUCE")
def reduce_items(
    context: Context, start: Operand, values: ArrayValues, function: Function
) -> Value:
    """A function of what came before and each item, the last result."""
    total: Value = start
    for item in values.items:
        total = _result(function, [total, item])
    del context
    return total


@spreadsheet_function("SCAN")
def scan_items(context: Context, start: Operand, values: ArrayValues, function: Function) -> Array:
    """A function of what came before and each item, every result."""
    total: Value = start if start is None else values_of(start, context).items[0]
    text = TextBudget()
    items: list[Scalar] = []
    for item in values.items:
        arguments = [item if total is None and not items else total, item]
        total = item if total is None and not items else _called(context, function, arguments)
        items.append(text.take(0.0 if total is None else cast("Scalar", total)))
    return Array(values.rows, values.columns, items)


@spreadsheet_function("MAKEARRAY")
def make_array(
    context: Context, rows: Whole, columns: Whole, function: Function
) -> Array | ErrorValue:
    """A function of each row and column number."""
    if rows < 1 or columns < 1:
        return ErrorValue.VALUE
    bounded_shape(rows, columns)
    text = TextBudget()
    items = [
        text.take(_called(context, function, [float(row), float(column)]))
        for row in range(1, rows + 1)
        for column in range(1, columns + 1)
    ]
    return Array(rows, columns, items)


@spreadsheet_function("BYROW")
def by_row(context: Context, values: ArrayValues, function: Function) -> Array:
    """A function of each row."""
    text = TextBudget()
    items = [
        text.take(_called(context, function, [Array(1, values.columns, row)]))
        for row in values.to_rows()
    ]
    return Array(values.rows, 1, items)


@spreadsheet_function("BYCOL")
def by_column(context: Context, values: ArrayValues, function: Function) -> Array:
    """A function of each column."""
    text = TextBudget()
    items = [
        text.take(
            _called(
                context, function, [Array(values.rows, 1, values.items[column :: values.columns])]
            )
        )
        for column in range(values.columns)
    ]
    return Array(1, values.columns, items)
