"""Looking up: by key in a table, by place in a range."""

from __future__ import annotations

import numpy as np

from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    FloatArray,
    Lazy,
    Logical,
    Operand,
    ScalarValue,
    Stack,
    Values,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.functions.searching import (
    find_at_least_descending,
    find_at_most,
    find_by_halves,
    find_equal,
    find_nearest,
    line_of,
)
from cellsim.values import (
    Array,
    ErrorValue,
    Fault,
    LambdaValue,
    Reference,
    Scalar,
    Value,
    encode_error,
)


def _place(key: Scalar, items: list[Scalar], kind: int) -> int:
    if key is None:
        key = 0.0
    if kind == 0:
        found = find_equal(key, items)
    elif kind > 0:
        found = find_at_most(key, items)
    else:
        found = find_at_least_descending(key, items)
    if found is None:
        raise Fault(ErrorValue.NA)
    return found


@spreadsheet_function("MATCH")
def match_place(key: ScalarValue, values: Values, kind: Whole = 1) -> float:
    """The place of a key in a row or column: 0 equal, 1 not above (ascending), -1 not below."""
    items = line_of(values)
    if items is None:
        raise Fault(ErrorValue.NA)
    return float(_place(key, items, kind) + 1)


@over_draws("MATCH")
def match_place_over_draws(
    key: FloatArray, values: Stack, kind: FloatArray | float = 1.0
) -> FloatArray | None:
    """MATCH over draws, for numbers."""
    if not isinstance(kind, float) or 1 not in (values.rows, values.columns):
        return None
    data = values.data
    keys = np.broadcast_to(key, data.shape[1:])
    if kind == 0:
        return _first(_equal(data, keys))
    if kind > 0:
        if len(data) > 1 and not (np.diff(data, axis=0) >= 0).all():
            return None  # binary search on unsorted data is taken draw by draw
        count = ((data <= keys) | _equal(data, keys)).sum(axis=0)
        return np.where(count > 0, count, encode_error(ErrorValue.NA))
    if len(data) > 1 and not (np.diff(data, axis=0) < 0).all():
        return None
    count = ((data >= keys) | _equal(data, keys)).sum(axis=0)
    return np.where(count > 0, count, encode_error(ErrorValue.NA))


def _equal(data: FloatArray, keys: FloatArray) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    return np.asarray((data == keys) | (np.abs(data - keys) <= np.abs(data) * 1e-15))


def _first(found: np.ndarray[tuple[int, ...], np.dtype[np.bool_]]) -> FloatArray:
    return np.where(found.any(axis=0), found.argmax(axis=0) + 1.0, encode_error(ErrorValue.NA))


@spreadsheet_function("XMATCH")
def match_place_by_mode(
    key: ScalarValue, values: Values, mode: Whole = 0, search: Whole = 1
) -> float:
    """The place of a key: 0 equal, -1 next smaller, 1 next larger, 2 wildcards; searched from either end."""
    items = line_of(values)
    if items is None:
        raise Fault(ErrorValue.VALUE)
    return float(_find_by_mode(key, items, mode, search) + 1)


def _find_by_mode(key: Scalar, items: list[Scalar], mode: int, search: int) -> int:
    if mode not in {0, -1, 1, 2, 3} or search not in {1, -1, 2, -2}:
        raise Fault(ErrorValue.VALUE)
    last = search == -1
    if search in {2, -2}:
        if mode not in {0, -1, 1}:
            raise Fault(ErrorValue.VALUE)
        found = find_by_halves(key, items, mode, descending=search == -2)
    elif key is None and mode in {0, 2, 3}:
        found = next((place for place, item in enumerate(items) if item is None), None)
    elif mode in {0, 2, 3}:
        found = find_equal(key, items, wildcards=mode == 2, last=last)
    else:
        found = find_nearest(key, items, larger=mode == 1, last=last)
    if found is None:
        raise Fault(ErrorValue.NA)
    return found


@spreadsheet_function("VLOOKUP")
def lookup_in_columns(
    key: ScalarValue, table: Values, column: Whole, approximate: Logical = True
) -> Scalar:
    """The value in a column of the row whose first cell matches a key."""
    if column < 1:
        return ErrorValue.VALUE
    if column > table.columns:
        return ErrorValue.REF
    row = _place(key, table.items[:: table.columns], 1 if approximate else 0)
    return table.at(row, column - 1)


@spreadsheet_function("HLOOKUP")
def lookup_in_rows(
    key: ScalarValue, table: Values, row: Whole, approximate: Logical = True
) -> Scalar:
    """The value in a row of the column whose first cell matches a key."""
    if row < 1:
        return ErrorValue.VALUE
    if row > table.rows:
        return ErrorValue.REF
    column = _place(key, table.items[: table.columns], 1 if approximate else 0)
    return table.at(row - 1, column)


@over_draws("VLOOKUP")
def lookup_in_columns_over_draws(
    key: FloatArray, table: Stack, column: FloatArray | float, approximate: FloatArray | float = 1.0
) -> FloatArray | None:
    """VLOOKUP over draws, for number tables."""
    keys = Stack(table.rows, 1, table.data[:: table.columns])
    if not isinstance(approximate, float):
        return None
    places = match_place_over_draws(key, keys, 1.0 if approximate else 0.0)
    return None if places is None else _gather(table, places, column)


@over_draws("HLOOKUP")
def lookup_in_rows_over_draws(
    key: FloatArray, table: Stack, row: FloatArray | float, approximate: FloatArray | float = 1.0
) -> FloatArray | None:
    """HLOOKUP over draws, for number tables."""
    keys = Stack(1, table.columns, table.data[: table.columns])
    if not isinstance(approximate, float):
        return None
    places = match_place_over_draws(key, keys, 1.0 if approximate else 0.0)
    return None if places is None else _gather(table, row, places, place_of_column=True)


def _gather(
    table: Stack,
    rows: FloatArray | float,
    columns: FloatArray | float,
    *,
    place_of_column: bool = False,
) -> FloatArray:
    """Items of a table by row and column from 1, which may differ by draw."""
    draws = table.data.shape[1]
    r, c = (np.broadcast_to(np.trunc(x), (draws,)) for x in (rows, columns))
    found = r if not place_of_column else c
    asked = c if not place_of_column else r
    limit = table.columns if not place_of_column else table.rows
    good = np.isfinite(found) & (asked >= 1) & (asked <= limit)
    index = np.where(good, (r - 1) * table.columns + c - 1, 0.0).astype(np.intp)
    result = np.take_along_axis(table.data, index[None], axis=0)[0]
    result = np.where(asked < 1, encode_error(ErrorValue.VALUE), result)
    result = np.where(asked > limit, encode_error(ErrorValue.REF), result)
    return np.where(np.isnan(found), found, result)


@spreadsheet_function("LOOKUP")
def lookup_in_vector(key: ScalarValue, values: Values, results: Operand | None = None) -> Value:
    """The value beside the last item not above a key."""
    by_column = values.rows >= values.columns
    if 1 in (values.rows, values.columns):
        items = values.items
    else:
        items = values.items[:: values.columns] if by_column else values.items[: values.columns]
    place = _place(key, items, 1)
    if isinstance(results, Reference):
        area = results.areas[0]
        along_rows = area.rows >= area.columns
        row = area.first_row + (place if along_rows else 0)
        column = area.first_column + (0 if along_rows else place)
        return Reference(
            (area._replace(first_row=row, first_column=column, last_row=row, last_column=column),)
        )
    if isinstance(results, Array):
        return results.items[place] if place < len(results.items) else ErrorValue.NA
    if results is not None:
        return results if place == 0 else ErrorValue.NA
    if 1 in (values.rows, values.columns):
        return values.items[place]
    return values.at(place, values.columns - 1) if by_column else values.at(values.rows - 1, place)


@spreadsheet_function("XLOOKUP", gives_reference=True)
def lookup_by_mode(
    context: Context,
    key: AnyScalar,
    values: Values,
    results: Operand,
    missing: Lazy | None = None,
    mode: Whole = 0,
    search: Whole = 1,
) -> Value:
    """What stands beside the item that matches a key; several columns or rows may come back."""
    if isinstance(key, ErrorValue):
        return key
    items = line_of(values)
    if items is None:
        return ErrorValue.VALUE
    try:
        place = _find_by_mode(key, items, mode, search)
    except Fault as fault:
        if fault.error is ErrorValue.NA and missing is not None:
            return missing()
        return fault.error
    return _line(results, place, context, along_rows=values.columns == 1, count=len(items))


def _line(results: Value, place: int, context: Context, *, along_rows: bool, count: int) -> Value:
    if isinstance(results, Reference):
        area = results.areas[0]
        if (
            area.rows if along_rows else area.columns
        ) < count:  # whole columns are longer than their values
            return ErrorValue.VALUE
        if along_rows:
            return Reference(
                (area._replace(first_row=area.first_row + place, last_row=area.first_row + place),)
            )
        column = area.first_column + place
        return Reference((area._replace(first_column=column, last_column=column),))
    array = values_of(results, context)
    if (array.rows if along_rows else array.columns) != count:
        return ErrorValue.VALUE
    if along_rows:
        return Array(
            1, array.columns, array.items[place * array.columns : (place + 1) * array.columns]
        )
    return Array(array.rows, 1, array.items[place :: array.columns])


@spreadsheet_function("INDEX", gives_reference=True)
def item_at_place(
    context: Context,
    where: Operand,
    row: AnyScalar = None,
    column: AnyScalar = None,
    area: Whole = 1,
) -> Value:
    """The cell or item at a row and column from 1; 0 or nothing means all of them."""
    if isinstance(where, ErrorValue):
        return where
    if isinstance(where, LambdaValue):
        return ErrorValue.VALUE
    if isinstance(where, Reference) and not 1 <= area <= len(where.areas):
        return ErrorValue.REF
    given = column is not None
    r, c = int(to_number(row)), int(to_number(column))
    if isinstance(where, Reference):
        return _cell_at(where, area - 1, r, c, column_given=given)
    values = values_of(where, context)
    if not given and values.rows == 1:
        r, c = (1 if r else 0), r
    if r < 0 or c < 0 or r > values.rows or c > values.columns:
        return ErrorValue.REF if r >= 0 and c >= 0 else ErrorValue.VALUE
    if r and c:
        return values.at(r - 1, c - 1)
    rows = range(values.rows) if r == 0 else range(r - 1, r)
    columns = range(values.columns) if c == 0 else range(c - 1, c)
    return Array(len(rows), len(columns), [values.at(i, j) for i in rows for j in columns])


def _cell_at(
    where: Reference, place: int, row: int, column: int, *, column_given: bool
) -> Reference | ErrorValue:
    area = where.areas[place]
    if not column_given and area.rows == 1 and area.columns > 1:
        row, column = (1 if row else 0), row
    if row < 0 or column < 0:
        return ErrorValue.VALUE
    if row > area.rows or column > area.columns:
        return ErrorValue.REF
    first_row, last_row = area.first_row, area.last_row
    if row:
        first_row = last_row = area.first_row + row - 1
    first_column, last_column = area.first_column, area.last_column
    if column:
        first_column = last_column = area.first_column + column - 1
    return Reference(
        (
            area._replace(
                first_row=first_row,
                last_row=last_row,
                first_column=first_column,
                last_column=last_column,
            ),
        )
    )


@over_draws("INDEX")
def item_at_place_over_draws(
    where: Stack, row: FloatArray | float = 0.0, column: FloatArray | float | None = None
) -> FloatArray | None:
    """INDEX over draws, for number ranges and one item."""
    draws = where.data.shape[1]
    if column is None:
        r: FloatArray | float = row if where.rows > 1 or where.columns == 1 else 1.0
        c: FloatArray | float = 1.0 if where.rows > 1 or where.columns == 1 else row
        if where.rows > 1 and where.columns > 1:
            return None
    else:
        r, c = row, column
    rows, columns = (np.broadcast_to(np.trunc(x), (draws,)) for x in (r, c))
    if where.rows == 1:
        rows = np.where(rows == 0, 1.0, rows)
    if where.columns == 1:
        columns = np.where(columns == 0, 1.0, columns)
    if (rows == 0).any() or (columns == 0).any():
        return None
    inside = (rows >= 1) & (rows <= where.rows) & (columns >= 1) & (columns <= where.columns)
    index = np.where(inside, (rows - 1) * where.columns + columns - 1, 0.0).astype(np.intp)
    result = np.take_along_axis(where.data, index[None], axis=0)[0]
    result = np.where(inside, result, encode_error(ErrorValue.REF))
    return np.where((rows < 0) | (columns < 0), encode_error(ErrorValue.VALUE), result)
