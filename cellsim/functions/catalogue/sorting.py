"""Rows and columns put in order."""

from __future__ import annotations

from collections.abc import Sequence

from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    Logical,
    Operand,
    spreadsheet_function,
)
from cellsim.functions.value_order import ValueKey, sorted_places, value_key
from cellsim.values import Array, ErrorValue, Fault, Scalar, Value


def _numbers(context: Context, asked: Value) -> list[float]:
    """The numbers of a single row or column; what is left out between commas is 1.

    Raises:
        Fault: It is an area of several rows and columns, or an item is no number (#VALUE!).
    """
    if asked is None:
        return [1.0]
    values = values_of(asked, context)
    if values.rows > 1 and values.columns > 1:
        raise Fault(ErrorValue.VALUE)
    return [to_number(item, date_1904=context.date_1904) for item in values.items]


def _descends(number: float) -> bool:
    """Whether an order is -1.

    Raises:
        Fault: It is neither 1 nor -1 (#VALUE!).
    """
    if int(number) not in (1, -1):
        raise Fault(ErrorValue.VALUE)
    return int(number) == -1


def _in_order(
    values: Array, keys: Sequence[tuple[Sequence[ValueKey], bool]], *, by_column: bool
) -> Array:
    rows = values.to_rows()
    if by_column:
        places = sorted_places(values.columns, keys)
        return Array.from_rows([[row[place] for place in places] for row in rows])
    return Array.from_rows([rows[place] for place in sorted_places(values.rows, keys)])


def _keys(items: Sequence[Scalar]) -> list[ValueKey]:
    return [value_key(item) for item in items]


@spreadsheet_function("SORT")
def sort(
    context: Context,
    values: ArrayValues,
    index: Operand | None = None,
    order: Operand | None = None,
    by_column: Logical = False,
) -> Array:
    """Rows in the order of one or more columns, or columns in that of rows; -1 descends.

    Numbers come before text, logicals and errors, blanks last; equal ones keep their order.
    """
    indices = _numbers(context, index)
    orders = [_descends(number) for number in _numbers(context, order)]
    if len(orders) not in (1, len(indices)):
        raise Fault(ErrorValue.VALUE)
    if len(orders) == 1:
        orders *= len(indices)
    lines = values.rows if by_column else values.columns
    keys: list[tuple[Sequence[ValueKey], bool]] = []
    for number, descending in zip(indices, orders, strict=True):
        place = int(number) - 1
        if not 0 <= place < lines:
            raise Fault(ErrorValue.VALUE)
        width = values.columns
        line = (
            values.items[place * width : (place + 1) * width]
            if by_column
            else values.items[place::width]
        )
        keys.append((_keys(line), descending))
    return _in_order(values, keys, by_column=by_column)


@spreadsheet_function("SORTBY", least=2)
def sort_by(context: Context, values: ArrayValues, *keys: ArrayValues) -> Array:
    """Rows or columns in the order of others beside them, each ascending or, with -1, descending.

    All keys must be columns as long as the array is high, or all rows as long as it is wide.
    """
    lines = keys[::2]
    orders = [_descends(_order(context, asked)) for asked in keys[1::2]]
    orders += [False] * (len(lines) - len(orders))
    by_row = all((line.rows, line.columns) == (values.rows, 1) for line in lines)
    by_column = all((line.rows, line.columns) == (1, values.columns) for line in lines)
    if not by_row and not by_column:
        raise Fault(ErrorValue.VALUE)
    ordered = [
        (_keys(line.items), descending) for line, descending in zip(lines, orders, strict=True)
    ]
    return _in_order(values, ordered, by_column=not by_row)


def _order(context: Context, asked: Array) -> float:
    if asked.rows * asked.columns != 1:
        raise Fault(ErrorValue.VALUE)
    return _numbers(context, asked.items[0])[0]
