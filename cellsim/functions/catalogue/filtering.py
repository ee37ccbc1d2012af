"""Parts of arrays chosen by what they hold."""

from __future__ import annotations

from collections.abc import Sequence

from cellsim.cells import RangeRef
from cellsim.functions.coercion import to_logical, to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    Logical,
    Operand,
    spreadsheet_function,
)
from cellsim.functions.value_order import ValueKey, value_key
from cellsim.values import Array, ErrorValue, Fault, Reference, Scalar, Value


@spreadsheet_function("FILTER")
def filtered(
    context: Context,
    values: ArrayValues,
    wanted: ArrayValues,
    if_empty: Operand = ErrorValue.CALC,
) -> Array:
    """The rows, or the columns, for which a column, or a row, of logicals is true.

    Where none is, it is the third argument, or without one #CALC!.
    """
    by_row = (wanted.rows, wanted.columns) == (values.rows, 1)
    if not by_row and (wanted.rows, wanted.columns) != (1, values.columns):
        raise Fault(ErrorValue.VALUE)
    chosen = [place for place, item in enumerate(wanted.items) if to_logical(item)]
    if not chosen:
        return values_of(if_empty, context)
    rows = values.to_rows()
    if by_row:
        return Array.from_rows([rows[place] for place in chosen])
    return Array.from_rows([[row[place] for place in chosen] for row in rows])


@spreadsheet_function("UNIQUE")
def distinct(
    values: ArrayValues, by_column: Logical = False, exactly_once: Logical = False
) -> Array:
    """Each different row or column once, or only those that come exactly once.

    Text is compared without regard to case, the first spelling is kept; a blank differs from zero and
    from empty text.
    """
    rows = values.to_rows()
    lines: Sequence[Sequence[Scalar]] = rows
    if by_column:
        lines = list(zip(*rows, strict=True))
    places: dict[tuple[ValueKey, ...], list[int]] = {}
    for place, line in enumerate(lines):
        places.setdefault(tuple(value_key(item) for item in line), []).append(place)
    chosen = [found[0] for found in places.values() if not exactly_once or len(found) == 1]
    if not chosen:
        raise Fault(ErrorValue.CALC)
    if by_column:
        return Array.from_rows([[row[place] for place in chosen] for row in rows])
    return Array.from_rows([rows[place] for place in chosen])


_NEITHER, _LEADING, _TRAILING, _BOTH = range(4)


@spreadsheet_function("TRIMRANGE", gives_reference=True)
def trimmed_range(
    context: Context, where: Operand, rows: Operand | None = None, columns: Operand | None = None
) -> Value:
    """A range without the blank rows and columns at its edges.

    0 keeps them, 1 trims those before its cells, 2 those after, 3 (if left out) both.
    """
    return _trimmed(context, where, _edges(context, rows), _edges(context, columns))


@spreadsheet_function("_TRO_ALL", gives_reference=True)
def trimmed_everywhere(context: Context, where: Operand) -> Value:
    """The trim operator `A1.:.B9`: a range without the blank rows and columns at its edges."""
    return _trimmed(context, where, _BOTH, _BOTH)


@spreadsheet_function("_TRO_LEADING", gives_reference=True)
def trimmed_before(context: Context, where: Operand) -> Value:
    """The trim operator `A1.:B9`: a range without the blank rows and columns before its cells."""
    return _trimmed(context, where, _LEADING, _LEADING)


@spreadsheet_function("_TRO_TRAILING", gives_reference=True)
def trimmed_after(context: Context, where: Operand) -> Value:
    """The trim operator `A1:.B9`: a range without the blank rows and columns after its cells."""
    return _trimmed(context, where, _TRAILING, _TRAILING)


def _edges(context: Context, asked: Value) -> int:
    """Which edges are trimmed.

    Raises:
        Fault: It is no single one of the four choices (#VALUE!).
    """
    if asked is None:
        return _BOTH
    values = values_of(asked, context)
    number = to_number(values.items[0]) if values.rows * values.columns == 1 else None
    if number not in (_NEITHER, _LEADING, _TRAILING, _BOTH):
        raise Fault(ErrorValue.VALUE)
    return int(number)


def _trimmed(context: Context, where: Value, rows: int, columns: int) -> Value:
    if isinstance(where, ErrorValue):
        return where
    values = values_of(where, context)  # beyond the workbook's last cell all is blank
    filled = [place for place, item in enumerate(values.items) if item is not None]
    if not filled:
        return ErrorValue.REF
    across = [place % values.columns for place in filled]
    top = filled[0] // values.columns if rows & _LEADING else 0
    left = min(across) if columns & _LEADING else 0
    bottom = filled[-1] // values.columns if rows & _TRAILING else None
    right = max(across) if columns & _TRAILING else None
    if isinstance(where, Reference):
        area = where.areas[0]
        return Reference(
            (
                RangeRef(
                    area.sheet,
                    area.first_row + top,
                    area.first_column + left,
                    area.last_row if bottom is None else area.first_row + bottom,
                    area.last_column if right is None else area.first_column + right,
                ),
            )
        )
    table = values.to_rows()[top : None if bottom is None else bottom + 1]
    return Array.from_rows([row[left : None if right is None else right + 1] for row in table])
