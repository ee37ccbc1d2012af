"""Arrays made, cut and put together."""

from __future__ import annotations

from cellsim.functions.array_limits import bounded_growth, bounded_shape
from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import values_of
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


def _table(rows: list[list[Scalar]]) -> Array:
    """An array of rows; blanks stay blank. Without any item it is #CALC!."""
    if not rows or not rows[0]:
        raise Fault(ErrorValue.CALC)
    return Array.from_rows(rows)


@spreadsheet_function("SEQUENCE")
def sequence(
    rows: AnyScalar,
    columns: AnyScalar = None,
    first: AnyScalar = None,
    step: AnyScalar = None,
) -> Array | ErrorValue:
    """Numbers in even steps, row by row; what is left out between commas is 1."""
    tall, wide, start, by = (
        1.0 if x is None else to_number(x) for x in (rows, columns, first, step)
    )
    height, width = int(tall), int(wide)
    if height < 1 or width < 1:
        return ErrorValue.CALC if height == 0 or width == 0 else ErrorValue.VALUE
    bounded_shape(height, width)
    return Array(height, width, [start + by * k for k in range(height * width)])


def _part(count: int, wanted: Scalar, *, drop: bool) -> slice:
    """The rows or columns that TAKE or DROP leaves; nothing asked means all of them."""
    if wanted is None:
        return slice(0, count)
    number = int(to_number(wanted))
    size = min(abs(number), count)
    if drop:
        return slice(size, count) if number >= 0 else slice(0, count - size)
    return slice(0, size) if number >= 0 else slice(count - size, count)


@spreadsheet_function("TAKE")
def take(values: ArrayValues, rows: AnyScalar, columns: AnyScalar = None) -> Array:
    """The first rows and columns, or the last with negative numbers."""
    return _cut(values, rows, columns, drop=False)


@spreadsheet_function("DROP")
def drop(values: ArrayValues, rows: AnyScalar, columns: AnyScalar = None) -> Array:
    """All but the first rows and columns, or but the last with negative numbers."""
    return _cut(values, rows, columns, drop=True)


def _cut(values: Array, rows: Scalar, columns: Scalar, *, drop: bool) -> Array:
    down = _part(values.rows, rows, drop=drop)
    across = _part(values.columns, columns, drop=drop)
    return _table([row[across] for row in values.to_rows()[down]])


def _places(context: Context, asked: tuple[Value, ...], count: int) -> list[int]:
    """Rows or columns by number, counted from 0.

    Raises:
        Fault: There is no such one, or numbers stand in several rows and columns (#VALUE!).
    """
    places: list[int] = []
    for value in asked:
        numbers = values_of(value, context)
        if numbers.rows > 1 and numbers.columns > 1:
            raise Fault(ErrorValue.VALUE)
        for item in numbers.items:
            number = int(to_number(item, date_1904=context.date_1904))
            if number == 0 or abs(number) > count:
                raise Fault(ErrorValue.VALUE)
            places.append(number - 1 if number > 0 else count + number)
    return places


@spreadsheet_function("CHOOSECOLS", least=2)
def choose_columns(context: Context, values: ArrayValues, *columns: Operand) -> Array:
    """Columns by number, from the end with negative ones."""
    places = _places(context, columns, values.columns)
    bounded_growth(values.rows, len(places), [values])
    return _table([[row[place] for place in places] for row in values.to_rows()])


@spreadsheet_function("CHOOSEROWS", least=2)
def choose_rows(context: Context, values: ArrayValues, *rows: Operand) -> Array:
    """Rows by number, from the end with negative ones."""
    places = _places(context, rows, values.rows)
    bounded_growth(len(places), values.columns, [values])
    table = values.to_rows()
    return _table([table[place] for place in places])


@spreadsheet_function("HSTACK", least=1)
def side_by_side(*arrays: ArrayValues) -> Array:
    """Arrays side by side; #N/A fills shorter ones."""
    height = max(array.rows for array in arrays)
    bounded_growth(height, sum(array.columns for array in arrays), arrays)
    rows: list[list[Scalar]] = [[] for _ in range(height)]
    for array in arrays:
        table = array.to_rows()
        for place, row in enumerate(rows):
            row.extend(table[place] if place < array.rows else [ErrorValue.NA] * array.columns)
    return _table(rows)


@spreadsheet_function("VSTACK", least=1)
def one_below_the_other(*arrays: ArrayValues) -> Array:
    """Arrays one below the other; #N/A fills narrower ones."""
    width = max(array.columns for array in arrays)
    bounded_growth(sum(array.rows for array in arrays), width, arrays)
    rows: list[list[Scalar]] = []
    for array in arrays:
        rows += [[*row, *[ErrorValue.NA] * (width - array.columns)] for row in array.to_rows()]
    return _table(rows)


def _line(values: Array, ignore: int, *, by_column: bool) -> list[Scalar]:
    if not 0 <= ignore <= 3:
        raise Fault(ErrorValue.VALUE)
    rows = values.to_rows()
    if by_column:
        rows = [list(column) for column in zip(*rows, strict=True)]
    items = [item for row in rows for item in row]
    if ignore & 1:
        items = [item for item in items if item is not None]
    if ignore & 2:
        items = [item for item in items if not isinstance(item, ErrorValue)]
    return items


@spreadsheet_function("TOCOL")
def to_column(values: ArrayValues, ignore: Whole = 0, by_column: Logical = False) -> Array:
    """All items down a column; 1 leaves blanks out, 2 errors, 3 both."""
    return _table([[item] for item in _line(values, ignore, by_column=by_column)])


@spreadsheet_function("TOROW")
def to_row(values: ArrayValues, ignore: Whole = 0, by_column: Logical = False) -> Array:
    """All items along a row; 1 leaves blanks out, 2 errors, 3 both."""
    return _table([_line(values, ignore, by_column=by_column)])


def _size(context: Context, asked: Value, least: int) -> int:
    """How high or wide an array is to become; left out it stays as it is.

    Raises:
        Fault: It would become smaller (#VALUE!).
    """
    if asked is None:
        return least
    size = int(to_number(values_of(asked, context).items[0], date_1904=context.date_1904))
    if size < least:
        raise Fault(ErrorValue.VALUE)
    return size


@spreadsheet_function("EXPAND")
def expanded(
    context: Context,
    values: ArrayValues,
    rows: Operand,
    columns: Operand | None = None,
    padding: AnyScalar = ErrorValue.NA,
) -> Array:
    """An array made higher and wider; #N/A or what is given fills it up."""
    height = _size(context, rows, values.rows)
    width = _size(context, columns, values.columns)
    bounded_shape(height, width)
    table = [[*row, *[padding] * (width - values.columns)] for row in values.to_rows()]
    table += [[padding] * width for _ in range(height - values.rows)]
    return _table(table)


def _pieces(values: Array, count: int, padding: Scalar) -> list[list[Scalar]]:
    """A single row or column cut into pieces of equal length, the last filled up.

    Raises:
        Fault: It is an area of several rows and columns (#VALUE!), or a piece would be empty (#NUM!).
    """
    if values.rows > 1 and values.columns > 1:
        raise Fault(ErrorValue.VALUE)
    if count < 1:
        raise Fault(ErrorValue.NUM)
    items = values.items
    if count > len(items):
        bounded_shape(count, 1)
    pieces = [items[start : start + count] for start in range(0, len(items), count)]
    pieces[-1] = [*pieces[-1], *[padding] * (count - len(pieces[-1]))]
    return pieces


@spreadsheet_function("WRAPROWS")
def wrapped_into_rows(
    values: ArrayValues, count: Whole, padding: AnyScalar = ErrorValue.NA
) -> Array:
    """A row or column cut into rows of so many items; #N/A or what is given fills the last."""
    return _table(_pieces(values, count, padding))


@spreadsheet_function("WRAPCOLS")
def wrapped_into_columns(
    values: ArrayValues, count: Whole, padding: AnyScalar = ErrorValue.NA
) -> Array:
    """A row or column cut into columns of so many items; #N/A or what is given fills the last."""
    pieces = _pieces(values, count, padding)
    return _table([list(row) for row in zip(*pieces, strict=True)])
