"""References as values: moved, read from text, counted."""

from __future__ import annotations

import re

from cellsim.cells import LAST_COLUMN, LAST_ROW, RangeRef, column_letters, quote_title
from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import single_value
from cellsim.functions.registry import (
    CellArea,
    Context,
    Lazy,
    Logical,
    Operand,
    Text,
    Values,
    Whole,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value

_R1C1 = re.compile(
    r"(?:(?P<sheet>'(?:[^']|'')+'|[^'!]+)!)?"
    r"(?:R(?P<row>\d+|\[-?\d+\])?)?(?:C(?P<column>\d+|\[-?\d+\])?)?"
    r"(?::(?:R(?P<row2>\d+|\[-?\d+\])?)?(?:C(?P<column2>\d+|\[-?\d+\])?)?)?\Z",
    re.IGNORECASE,
)


@spreadsheet_function("OFFSET", volatile=True, gives_reference=True)
def moved_reference(
    context: Context,
    start: CellArea,
    rows: Whole,
    columns: Whole,
    height: Operand | None = None,
    width: Operand | None = None,
) -> Reference | ErrorValue:
    """A reference moved by rows and columns, with another size if given."""
    area = start.areas[0]
    tall = area.rows if height is None else _size(single_value(height, context))
    wide = area.columns if width is None else _size(single_value(width, context))
    if tall == 0 or wide == 0:
        return ErrorValue.REF
    first_row, first_column = area.first_row + rows, area.first_column + columns
    last_row, last_column = first_row + tall - 1, first_column + wide - 1
    if tall < 0:
        first_row, last_row = first_row + tall + 1, first_row
    if wide < 0:
        first_column, last_column = first_column + wide + 1, first_column
    if first_row < 1 or first_column < 1 or last_row > LAST_ROW or last_column > LAST_COLUMN:
        return ErrorValue.REF
    return Reference((RangeRef(area.sheet, first_row, first_column, last_row, last_column),))


def _size(value: Scalar) -> int:
    return int(to_number(value))  # that of a blank cell is 0, not one left out


@spreadsheet_function("INDIRECT", volatile=True, gives_reference=True)
def reference_from_text(context: Context, text: Text, a1: Logical = True) -> Value:
    """The reference that a text names, in A1 or R1C1 notation."""
    if a1:
        return context.parse_reference(text.strip())
    return _from_r1c1(context, text.strip())


def _from_r1c1(context: Context, text: str) -> Value:
    match = _R1C1.match(text)
    if match is None or not text:
        return ErrorValue.REF
    sheet = context.cell.sheet
    if match["sheet"]:
        wanted = match["sheet"].strip("'").replace("''", "'").casefold()
        found = next(
            (title for title in context.sheet_titles() if title.casefold() == wanted), None
        )
        if found is None:
            return ErrorValue.REF
        sheet = found
    rows = [_axis(match[name], context.cell.row) for name in ("row", "row2")]
    columns = [_axis(match[name], context.cell.column) for name in ("column", "column2")]
    if ":" not in text.rpartition("!")[2]:
        rows[1], columns[1] = rows[0], columns[0]
    area = RangeRef(sheet, min(rows), min(columns), max(rows), max(columns))
    if (
        area.first_row < 1
        or area.first_column < 1
        or area.last_row > LAST_ROW
        or area.last_column > LAST_COLUMN
    ):
        return ErrorValue.REF
    return Reference((area,))


def _axis(part: str | None, own: int) -> int:
    if part is None:
        return own
    return own + int(part[1:-1]) if part.startswith("[") else int(part)


def _bounds(context: Context, where: Operand | None) -> RangeRef:
    if where is None:
        cell = context.cell
        return RangeRef(cell.sheet, cell.row, cell.column, cell.row, cell.column)
    if isinstance(where, ErrorValue):
        raise Fault(where)
    if not isinstance(where, Reference):
        raise Fault(ErrorValue.VALUE)
    return where.areas[0]


@spreadsheet_function("ROW")
def row_number(context: Context, where: Operand | None = None) -> float | Array:
    """The row of a reference, or of the formula."""
    area = _bounds(context, where)
    if area.rows == 1:
        return float(area.first_row)
    last = min(area.last_row, area.first_row + LAST_ROW - 1)
    return Array(
        last - area.first_row + 1, 1, [float(row) for row in range(area.first_row, last + 1)]
    )


@spreadsheet_function("COLUMN")
def column_number_of(context: Context, where: Operand | None = None) -> float | Array:
    """The column of a reference, or of the formula, from 1."""
    area = _bounds(context, where)
    if area.columns == 1:
        return float(area.first_column)
    return Array(
        1, area.columns, [float(c) for c in range(area.first_column, area.last_column + 1)]
    )


def _shape(value: Operand) -> tuple[int, int]:
    if isinstance(value, ErrorValue):
        raise Fault(value)
    if isinstance(value, Reference):
        return value.areas[0].rows, value.areas[0].columns
    if isinstance(value, Array):
        return value.rows, value.columns
    if isinstance(value, LambdaValue):
        raise Fault(ErrorValue.VALUE)
    return 1, 1


@spreadsheet_function("ROWS")
def count_rows(where: Operand) -> float:
    """How many rows a range or array has."""
    return float(_shape(where)[0])


@spreadsheet_function("COLUMNS")
def count_columns(where: Operand) -> float:
    """How many columns a range or array has."""
    return float(_shape(where)[1])


@spreadsheet_function("AREAS")
def count_areas(where: CellArea) -> float:
    """How many areas a reference has."""
    return float(len(where.areas))


@spreadsheet_function("TRANSPOSE")
def transpose(values: Values) -> Array:
    """Rows as columns; blanks become 0."""
    items: list[Scalar] = []
    for column in range(values.columns):
        for row in range(values.rows):
            item = values.at(row, column)
            items.append(0.0 if item is None else item)
    return Array(values.columns, values.rows, items)


@spreadsheet_function("ADDRESS")
def address_text(
    row: Whole, column: Whole, kind: Whole = 1, a1: Logical = True, sheet: Text = ""
) -> str | ErrorValue:
    """The text of an address: 1 absolute, 2 row absolute, 3 column absolute, 4 relative."""
    if not (1 <= row <= LAST_ROW and 1 <= column <= LAST_COLUMN and 1 <= kind <= 4):
        return ErrorValue.VALUE
    row_fixed, column_fixed = kind in {1, 2}, kind in {1, 3}
    if a1:
        text = (
            f"{'$' if column_fixed else ''}{column_letters(column)}{'$' if row_fixed else ''}{row}"
        )
    else:
        text = f"R{row if row_fixed else f'[{row}]'}C{column if column_fixed else f'[{column}]'}"
    return f"{quote_title(sheet)}!{text}" if sheet else text


@spreadsheet_function("FORMULATEXT")
def formula_text(context: Context, where: CellArea) -> str | ErrorValue:
    """The formula of a cell as text."""
    area = where.areas[0]
    text = context.formula_text(area.sheet, area.first_row, area.first_column)
    return text if text is not None else ErrorValue.NA


@spreadsheet_function("HYPERLINK")
def link(target: Text, shown: Lazy | None = None) -> Value:
    """The text of a link; the link itself is not followed."""
    return shown() if shown is not None else target
