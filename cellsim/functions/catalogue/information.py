"""Information: what kind of value there is, and where."""

from __future__ import annotations

from cellsim.functions.coercion import to_number
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Number,
    Operand,
    ScalarValue,
    Text,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, LambdaValue, Reference, Scalar

_ERROR_NUMBERS = {
    ErrorValue.NULL: 1,
    ErrorValue.DIV0: 2,
    ErrorValue.VALUE: 3,
    ErrorValue.REF: 4,
    ErrorValue.NAME: 5,
    ErrorValue.NUM: 6,
    ErrorValue.NA: 7,
    ErrorValue.GETTING_DATA: 8,
    ErrorValue.SPILL: 9,
    ErrorValue.CONNECT: 10,
    ErrorValue.BLOCKED: 11,
    ErrorValue.UNKNOWN: 12,
    ErrorValue.FIELD: 13,
    ErrorValue.CALC: 14,
}


@spreadsheet_function("ISBLANK")
def is_blank(value: AnyScalar) -> bool:
    """Whether a cell holds nothing."""
    return value is None


@spreadsheet_function("ISERROR")
def is_error(value: AnyScalar) -> bool:
    """Whether a value is any error."""
    return isinstance(value, ErrorValue)


@spreadsheet_function("ISERR")
def is_error_but_not_available(value: AnyScalar) -> bool:
    """Whether a value is an error other than #N/A."""
    return isinstance(value, ErrorValue) and value is not ErrorValue.NA


@spreadsheet_function("ISNA")
def is_not_available(value: AnyScalar) -> bool:
    """Whether a value is #N/A."""
    return value is ErrorValue.NA


@spreadsheet_function("ISNUMBER")
def is_number(value: AnyScalar) -> bool:
    """Whether a value is a number."""
    return isinstance(value, float)


@spreadsheet_function("ISTEXT")
def is_text(value: AnyScalar) -> bool:
    """Whether a value is text."""
    return isinstance(value, str)


@spreadsheet_function("ISNONTEXT")
def is_not_text(value: AnyScalar) -> bool:
    """Whether a value is anything but text."""
    return not isinstance(value, str)


@spreadsheet_function("ISLOGICAL")
def is_logical(value: AnyScalar) -> bool:
    """Whether a value is TRUE or FALSE."""
    return isinstance(value, bool)


@spreadsheet_function("ISREF")
def is_reference(value: Operand) -> bool:
    """Whether a value is a reference."""
    return isinstance(value, Reference)


@spreadsheet_function("ISFORMULA")
def is_formula(context: Context, cell: Operand) -> bool | ErrorValue:
    """Whether a cell holds a formula."""
    if not isinstance(cell, Reference):
        return ErrorValue.VALUE
    area = cell.areas[0]
    return context.formula_text(area.sheet, area.first_row, area.first_column) is not None


@spreadsheet_function("ISEVEN", strict=True)
def is_even(number: Number) -> bool:
    """Whether a number, cut to a whole one, is even."""
    return int(number) % 2 == 0


@spreadsheet_function("ISODD", strict=True)
def is_odd(number: Number) -> bool:
    """Whether a number, cut to a whole one, is odd."""
    return int(number) % 2 == 1


@spreadsheet_function("NA")
def not_available() -> ErrorValue:
    """The error #N/A."""
    return ErrorValue.NA


@spreadsheet_function("N")
def number_of_value(value: ScalarValue) -> float:
    """A number as it is, TRUE as 1, anything else as 0."""
    return to_number(value) if isinstance(value, (float, bool)) else 0.0


@spreadsheet_function("TYPE")
def type_number(context: Context, value: Operand) -> float:
    """1 for a number, 2 text, 4 logical, 16 error, 64 array, 128 function."""
    if isinstance(value, Reference):
        area = value.areas[0]
        if area.size > 1:
            return 64.0
        return _type_of(context.cell_value(area.sheet, area.first_row, area.first_column))
    if isinstance(value, Array):
        return 64.0
    if isinstance(value, LambdaValue):
        return 128.0
    return _type_of(value)


def _type_of(value: Scalar) -> float:
    if isinstance(value, bool):
        return 4.0
    if isinstance(value, str):
        return 2.0
    return 16.0 if isinstance(value, ErrorValue) else 1.0


@spreadsheet_function("ERROR.TYPE")
def error_number(value: AnyScalar) -> float | ErrorValue:
    """The number of an error, #N/A if the value is none."""
    if isinstance(value, ErrorValue):
        return float(_ERROR_NUMBERS.get(value, 8))
    return ErrorValue.NA


@spreadsheet_function("SHEETS")
def number_of_sheets(context: Context, where: Operand | None = None) -> float:
    """How many sheets the workbook, or a reference, has."""
    if isinstance(where, Reference):
        return float(len({area.sheet for area in where.areas}))
    return float(len(context.sheet_titles()))


@spreadsheet_function("SHEET")
def sheet_number(context: Context, where: Operand | None = None) -> float | ErrorValue:
    """The place of a sheet among all, from 1."""
    titles = [title.casefold() for title in context.sheet_titles()]
    title = context.cell.sheet
    if isinstance(where, Reference):
        title = where.areas[0].sheet
    elif isinstance(where, str):
        title = where
    folded = title.casefold()
    return float(titles.index(folded) + 1) if folded in titles else ErrorValue.NA


@spreadsheet_function("CELL", volatile=True)
def cell_information(context: Context, kind: Text, where: Operand | None = None) -> Scalar:
    """A fact about a cell: address, row, col, contents, type, sheet's file name is left empty."""
    area = where.areas[0] if isinstance(where, Reference) else None
    cell = context.cell if area is None else area.first
    value = context.cell_value(*cell) if area is not None else None
    facts: dict[str, Scalar] = {
        "address": f"${cell.address.rstrip('0123456789')}${cell.row}",
        "row": float(cell.row),
        "col": float(cell.column),
        "contents": 0.0 if value is None else value,
        "type": "b" if value is None else "l" if isinstance(value, str) else "v",
        "filename": f"[]{cell.sheet}",
        "format": _format_code(context.number_format(*cell)),
        "color": 0.0,
        "parentheses": 0.0,
        "prefix": "'" if isinstance(value, str) else "",
        "protect": 1.0,
    }
    return facts.get(kind.lower(), ErrorValue.VALUE)


def _format_code(number_format: str) -> str:
    code = number_format.split(";", maxsplit=1)[0]
    if code == "General":
        return "G"
    decimals = (
        len(code.partition(".")[2].rstrip("%E+ )_").replace("#", "0").split("0")) - 1
        if "." in code
        else 0
    )
    letter = (
        "P"
        if "%" in code
        else "S"
        if "E" in code
        else "C"
        if "$" in code
        else ","
        if "," in code
        else "F"
    )
    return f"{letter}{decimals}"


@spreadsheet_function("INFO", volatile=True)
def environment_information(context: Context, kind: Text) -> Scalar:
    """A fact about the program: only those that do not name one."""
    facts: dict[str, Scalar] = {
        "recalc": "Automatic",
        "numfile": float(len(context.sheet_titles())),
        "origin": "$A:$A$1",
    }
    return facts.get(kind.lower(), ErrorValue.NA)
