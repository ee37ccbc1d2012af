"""Rows and columns chosen, sorted and told apart: FILTER, SORT, SORTBY, UNIQUE; and arrays given a shape."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from functools import cmp_to_key

from cellsim.functions.coercion import to_logical
from cellsim.functions.comparison import compare
from cellsim.functions.dispatch import LARGEST_ARRAY, single_value
from cellsim.functions.registry import (
    AnyScalar,
    ArrayValues,
    Context,
    Logical,
    Operand,
    Whole,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Scalar, Value

Line = tuple[Scalar, ...]


def _rows(array: Array, *, by_column: bool) -> list[Line]:
    """The rows of an array, or its columns."""
    rows = array.to_rows()
    return list(zip(*rows, strict=True)) if by_column else [tuple(row) for row in rows]


def _array(lines: Sequence[Line], *, by_column: bool) -> Array:
    """An array of rows, or of columns; a blank becomes 0."""
    shown = [[0.0 if item is None else item for item in line] for line in lines]
    return Array.from_rows([list(row) for row in zip(*shown, strict=True)] if by_column else shown)


@spreadsheet_function("FILTER")
def filtered(values: ArrayValues, include: ArrayValues, if_empty: AnyScalar = None) -> Value:
    """The rows for which a column of logicals is true, or the columns for which a row of them is."""
    by_column = include.rows == 1 and include.columns == values.columns
    if not by_column and not (include.columns == 1 and include.rows == values.rows):
        return ErrorValue.VALUE
    if include.rows == 1 == values.rows and include.columns == 1 == values.columns:
        by_column = False
    wanted: list[bool] = []
    for item in include.items:
        if isinstance(item, ErrorValue):
            return item
        wanted.append(to_logical(item))
    lines = _rows(values, by_column=by_column)
    kept = [line for line, keep in zip(lines, wanted, strict=True) if keep]
    if kept:
        return _array(kept, by_column=by_column)
    return ErrorValue.CALC if if_empty is None else if_empty


def _place(left: Scalar, right: Scalar) -> int:
    """The order of a sort: numbers, text, logicals, errors; blanks come last in either direction."""
    ranks = [_rank(left), _rank(right)]
    if ranks[0] != ranks[1]:
        return -1 if ranks[0] < ranks[1] else 1
    return 0 if ranks[0] == _ERRORS else compare(left, right)


_ERRORS = 3


def _rank(value: Scalar) -> int:
    if isinstance(value, ErrorValue):
        return _ERRORS
    if isinstance(value, bool):
        return 2
    return 1 if isinstance(value, str) else 0


def _order(keys: Sequence[tuple[Line, int]], count: int) -> list[int]:
    """The places of lines in order of their keys; equal ones stay as they were."""

    def before(a: int, b: int) -> int:
        for items, direction in keys:
            left, right = items[a], items[b]
            if left is None or right is None:
                if (left is None) != (right is None):
                    return 1 if left is None else -1
                continue
            order = _place(left, right) * direction
            if order:
                return order
        return 0

    return sorted(range(count), key=cmp_to_key(before))


def _direction(value: Scalar) -> int:
    if isinstance(value, ErrorValue):
        raise Fault(value)
    direction = 1.0 if value is None else value
    if direction not in (1.0, -1.0) or isinstance(direction, bool):
        raise Fault(ErrorValue.VALUE)
    return int(direction)


@spreadsheet_function("SORT")
def sorted_by_index(
    context: Context,
    values: ArrayValues,
    index: Operand | None = None,
    order: Operand | None = None,
    by_column: Logical = False,
) -> Value:
    """Rows in the order of one or more of their columns, or columns in that of rows."""
    lines = _rows(values, by_column=by_column)
    places = _scalars(index, context) or [1.0]
    directions = _scalars(order, context) or [1.0]
    if len(directions) not in {1, len(places)}:
        return ErrorValue.VALUE
    keys: list[tuple[Line, int]] = []
    for number, place in enumerate(places):
        if isinstance(place, ErrorValue):
            return place
        at = 1.0 if place is None else place
        if not isinstance(at, float) or not 1 <= int(at) <= len(lines[0]):
            return ErrorValue.VALUE
        direction = _direction(directions[min(number, len(directions) - 1)])
        keys.append((tuple(line[int(at) - 1] for line in lines), direction))
    return _array([lines[k] for k in _order(keys, len(lines))], by_column=by_column)


@spreadsheet_function("SORTBY", least=2)
def sorted_by_keys(context: Context, values: ArrayValues, *keys: Operand) -> Value:
    """Rows in the order of other columns, or columns in that of other rows; 1 ascending, -1 descending."""
    found: list[tuple[Line, int]] = []
    by_column: bool | None = None
    for position in range(0, len(keys), 2):
        key = _whole(keys[position], context)
        if key.columns == 1 and key.rows == values.rows and by_column is not True:
            by_column = False
        elif key.rows == 1 and key.columns == values.columns and by_column is not False:
            by_column = True
        else:
            return ErrorValue.VALUE
        direction = single_value(keys[position + 1], context) if position + 1 < len(keys) else None
        found.append((tuple(key.items), _direction(direction)))
    lines = _rows(values, by_column=bool(by_column))
    return _array([lines[k] for k in _order(found, len(lines))], by_column=bool(by_column))


def _whole(value: Value, context: Context) -> Array:
    items = _scalars(value, context)
    array = value if isinstance(value, Array) else None
    if array is None:
        area = getattr(value, "areas", (None,))[0]
        array = context.area_values(area) if area is not None else Array(1, 1, items)
    return array


def _scalars(value: Value, context: Context) -> list[Scalar]:
    """The items of an argument that may be an array or a range; none if it was left out."""
    if value is None:
        return []
    if isinstance(value, Array):
        return list(value.items)
    areas = getattr(value, "areas", None)
    if areas is not None:
        return [item for area in areas for item in context.area_values(area).items]
    return [single_value(value, context)]


@spreadsheet_function("UNIQUE")
def without_repetition(
    values: ArrayValues, by_column: Logical = False, once: Logical = False
) -> Value:
    """Each different row, or column, once; or only those that occur once."""
    lines = _rows(values, by_column=by_column)
    keys = [tuple(_same(item) for item in line) for line in lines]
    counts = Counter(keys)
    seen: set[tuple[object, ...]] = set()
    kept: list[Line] = []
    for line, key in zip(lines, keys, strict=True):
        if key not in seen and (not once or counts[key] == 1):
            kept.append(line)
        seen.add(key)
    return _array(kept, by_column=by_column) if kept else ErrorValue.CALC


def _same(item: Scalar) -> object:
    """What makes two items the same: type and value, text without regard to case."""
    if isinstance(item, str):
        return ("text", item.casefold())
    return (type(item).__name__, item)


@spreadsheet_function("EXPAND")
def expanded(
    values: ArrayValues,
    rows: AnyScalar,
    columns: AnyScalar = None,
    padding: AnyScalar = ErrorValue.NA,
) -> Value:
    """An array made larger, filled up with #N/A or something else."""
    height = values.rows if rows is None else _size(rows)
    width = values.columns if columns is None else _size(columns)
    if height < values.rows or width < values.columns:
        return ErrorValue.VALUE
    if height * width > LARGEST_ARRAY:
        return ErrorValue.NUM
    filling: Scalar = 0.0 if padding is None else padding
    table: list[list[Scalar]] = []
    for row in values.to_rows():
        shown: list[Scalar] = [0.0 if item is None else item for item in row]
        table.append(shown + [filling] * (width - values.columns))
    table += [[filling] * width for _ in range(height - values.rows)]
    return Array.from_rows(table)


def _size(value: Scalar) -> int:
    if isinstance(value, ErrorValue):
        raise Fault(value)
    if not isinstance(value, (float, bool)):
        raise Fault(ErrorValue.VALUE)
    return int(value)


def _wrapped(values: Array, count: int, padding: Scalar) -> list[Line]:
    if 1 not in (values.rows, values.columns):
        raise Fault(ErrorValue.VALUE)
    if count < 1:
        raise Fault(ErrorValue.NUM)
    items = list(values.items)
    width = min(count, len(items))  # a count beyond the items leaves them in one line
    filling: Scalar = 0.0 if padding is None else padding
    items += [filling] * (-len(items) % width)
    return [tuple(items[k : k + width]) for k in range(0, len(items), width)]


@spreadsheet_function("WRAPROWS")
def wrapped_in_rows(values: ArrayValues, count: Whole, padding: AnyScalar = ErrorValue.NA) -> Value:
    """A row or column broken into rows of some items."""
    return _array(_wrapped(values, count, padding), by_column=False)


@spreadsheet_function("WRAPCOLS")
def wrapped_in_columns(
    values: ArrayValues, count: Whole, padding: AnyScalar = ErrorValue.NA
) -> Value:
    """A row or column broken into columns of some items."""
    return _array(_wrapped(values, count, padding), by_column=True)


@spreadsheet_function("RANDARRAY", volatile=True)
def random_array(
    context: Context,
    rows: AnyScalar = 1.0,
    columns: AnyScalar = 1.0,
    low: AnyScalar = 0.0,
    high: AnyScalar = 1.0,
    whole: Logical = False,
) -> Value:
    """Random numbers of the cell's own fixed stream, row by row."""
    height, width = (1 if size is None else _size(size) for size in (rows, columns))
    if height < 1 or width < 1:
        return ErrorValue.CALC if 0 in (height, width) else ErrorValue.VALUE
    if height * width > LARGEST_ARRAY:
        return ErrorValue.NUM
    least, most = (0.0 if low is None else low), (1.0 if high is None else high)
    for limit in (least, most):
        if isinstance(limit, ErrorValue):
            return limit
    if not isinstance(least, float) or not isinstance(most, float) or least > most:
        return ErrorValue.VALUE
    if whole and (least != int(least) or most != int(most)):
        return ErrorValue.VALUE
    count = height * width
    if whole:
        span = most - least + 1
        items: list[Scalar] = [least + int(context.random() * span) for _ in range(count)]
    else:
        items = [least + context.random() * (most - least) for _ in range(count)]
    return Array(height, width, items)
