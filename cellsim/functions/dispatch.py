"""Calling a function: arguments coerced by the kinds its kernel declares, arrays taken item by item."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import Any, TypeAlias

import numpy as np

from cellsim.functions.array_limits import TextBudget, bounded_growth
from cellsim.functions.coercion import numbers_in, to_logical, to_number, to_text
from cellsim.functions.registry import (
    LIFTED,
    ArgumentKind,
    Context,
    FunctionRecord,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value

Argument: TypeAlias = Value | Callable[[], Value]
"""An evaluated argument, or for a `Lazy` parameter the function that evaluates it."""


def call_function(
    function: FunctionRecord,
    arguments: Sequence[Argument],
    context: Context,
    *,
    whole_arrays: bool = False,
) -> Value:
    """Call a function with evaluated arguments.

    Args:
        function: What to call.
        arguments: The values in order; None for an argument left out between commas.
        context: The surroundings of the formula.
        whole_arrays: Whether ranges in scalar places are taken item by item (array formulas) and
            not by implicit intersection.

    Returns:
        The result; errors are values. A wrong number of arguments gives #VALUE!.
    """
    if not function.least <= len(arguments) <= function.most:
        return ErrorValue.VALUE
    try:
        prepared: list[Any] = []
        lifted: list[int] = []
        for position, raw in enumerate(arguments):
            parameter = function.parameter(position)
            argument = raw
            if parameter.kind in LIFTED:
                single = _strictly_single if function.strict else _single
                argument = single(raw, context, whole_arrays=whole_arrays)
                if isinstance(argument, Array):
                    lifted.append(position)
                    prepared.append(argument)
                    continue
            prepared.append(_COERCIONS[parameter.kind](argument, context))
        if lifted:
            return _call_by_item(function, prepared, lifted, context)
        return _call(function, prepared, context)
    except Fault as fault:
        return fault.error


def _call(function: FunctionRecord, arguments: Sequence[Any], context: Context) -> Value:
    try:
        if function.takes_context:
            return _finish(function.kernel(context, *arguments))
        return _finish(function.kernel(*arguments))
    except Fault as fault:
        return fault.error
    except (OverflowError, ZeroDivisionError):
        return ErrorValue.NUM


def _finish(result: Any) -> Value:
    if isinstance(result, bool):
        return result
    if isinstance(result, (float, int, np.floating, np.integer)):
        number = float(result)
        return number if math.isfinite(number) else ErrorValue.NUM
    if isinstance(result, np.bool_):
        return bool(result)
    return result  # type: ignore[no-any-return]


def _single(argument: Argument, context: Context, *, whole_arrays: bool) -> Scalar | Array:
    """A scalar, or an array that is to be taken item by item."""
    if isinstance(argument, Reference):
        if len(argument.areas) != 1:
            return ErrorValue.VALUE
        area = argument.areas[0]
        if area.size == 1:
            return context.cell_value(area.sheet, area.first_row, area.first_column)
        return context.area_values(area) if whole_arrays else context.intersect(argument)
    if isinstance(argument, Array):
        return argument.items[0] if argument.rows == argument.columns == 1 else argument
    if isinstance(argument, LambdaValue):
        return ErrorValue.CALC
    return argument  # type: ignore[return-value]


def _strictly_single(argument: Argument, context: Context, *, whole_arrays: bool) -> Scalar | Array:
    """A single value for a strict function.

    Raises:
        Fault: It is a logical or a range of several cells (#VALUE!).
    """
    if isinstance(argument, Reference) and (len(argument.areas) != 1 or argument.areas[0].size > 1):
        raise Fault(ErrorValue.VALUE)
    value = _single(argument, context, whole_arrays=whole_arrays)
    if isinstance(value, bool):
        raise Fault(ErrorValue.VALUE)
    return value


def _whole_number(value: Scalar, context: Context) -> int:
    return int(to_number(value, date_1904=context.date_1904))


def _not_an_error(value: Scalar, _context: Context) -> Scalar:
    if isinstance(value, ErrorValue):
        raise Fault(value)
    return value


def _number_items(argument: Value, context: Context) -> list[float]:
    if isinstance(argument, Reference):
        numbers: list[float] = []
        for area in argument.areas:
            numbers += numbers_in(context.area_values(area))
        return numbers
    if isinstance(argument, Array):
        return numbers_in(argument)
    if isinstance(argument, LambdaValue):
        raise Fault(ErrorValue.CALC)
    return [to_number(argument, date_1904=context.date_1904)]


def values_of(argument: Value, context: Context) -> Array:
    """The values of an argument as an array.

    Raises:
        Fault: It is a union of several areas (#VALUE!) or a function (#CALC!).
    """
    if isinstance(argument, Reference):
        if len(argument.areas) != 1:
            raise Fault(ErrorValue.VALUE)
        return context.area_values(argument.areas[0])
    if isinstance(argument, Array):
        return argument
    if isinstance(argument, LambdaValue):
        raise Fault(ErrorValue.CALC)
    return Array(1, 1, [argument])


def _values(argument: Value, context: Context) -> Array:
    if isinstance(argument, ErrorValue):
        raise Fault(argument)
    return values_of(argument, context)


def _matrix(argument: Value, context: Context) -> np.ndarray[Any, np.dtype[np.float64]]:
    values = _values(argument, context)
    for item in values.items:
        if isinstance(item, ErrorValue):
            raise Fault(item)
        if type(item) is not float:
            raise Fault(ErrorValue.VALUE)
    return np.array(values.items, dtype=np.float64).reshape(values.rows, values.columns)


def _cell_area(argument: Value, _context: Context) -> Reference:
    if isinstance(argument, ErrorValue):
        raise Fault(argument)
    if not isinstance(argument, Reference):
        raise Fault(ErrorValue.VALUE)
    return argument


def _function(argument: Value, _context: Context) -> LambdaValue:
    if isinstance(argument, ErrorValue):
        raise Fault(argument)
    if not isinstance(argument, LambdaValue):
        raise Fault(ErrorValue.VALUE)
    return argument


_COERCIONS: dict[ArgumentKind, Callable[[Any, Context], Any]] = {
    ArgumentKind.NUMBER: lambda value, context: to_number(value, date_1904=context.date_1904),
    ArgumentKind.WHOLE: _whole_number,
    ArgumentKind.TEXT: lambda value, _context: to_text(value),
    ArgumentKind.LOGICAL: lambda value, _context: to_logical(value),
    ArgumentKind.SCALAR: _not_an_error,
    ArgumentKind.ANY_SCALAR: lambda value, _context: value,
    ArgumentKind.NUMBER_ITEMS: _number_items,
    ArgumentKind.VALUES: _values,
    ArgumentKind.ARRAY_VALUES: _values,
    ArgumentKind.MATRIX: _matrix,
    ArgumentKind.OPERAND: lambda value, _context: value,
    ArgumentKind.CELL_AREA: _cell_area,
    ArgumentKind.LAZY: lambda value, _context: value,
    ArgumentKind.FUNCTION: _function,
}


def _call_by_item(
    function: FunctionRecord, arguments: list[Any], lifted: list[int], context: Context
) -> Value:
    """Call once for each item of the arrays, smaller ones repeated where they have one row or column.

    What a `Lazy` argument gives is then taken item by item too: IF over arrays.
    """
    arrays = [
        (position, arguments[position], _COERCIONS[function.parameter(position).kind])
        for position in lifted
    ]
    for position in range(len(arguments)):
        if function.parameter(position).kind is ArgumentKind.LAZY:
            values = values_of(arguments[position](), context)
            arrays.append((position, values, _constant))
    rows, columns = common_shape([array for _, array, _ in arrays])
    text = TextBudget()
    results: list[Scalar] = []
    for row in range(rows):
        for column in range(columns):
            try:
                for position, array, coerce in arrays:
                    arguments[position] = coerce(item_at(array, row, column), context)
            except Fault as fault:
                results.append(fault.error)
                continue
            results.append(text.take(_first_item(_call(function, arguments, context), context)))
    return Array(rows, columns, results)


def _constant(value: Scalar, _context: Context) -> Callable[[], Scalar]:
    return lambda: value


def common_shape(arrays: Sequence[Array]) -> tuple[int, int]:
    """The rows and columns of what comes of arrays combined item by item.

    Raises:
        Fault: It would be larger than an array may be (#NUM!).
    """
    rows = max(array.rows for array in arrays)
    columns = max(array.columns for array in arrays)
    return bounded_growth(rows, columns, arrays)


def item_at(array: Array, row: int, column: int) -> Scalar:
    """The item at a place of a larger shape: repeated along a single row or column, else #N/A."""
    if array.rows == 1:
        row = 0
    if array.columns == 1:
        column = 0
    if row >= array.rows or column >= array.columns:
        return ErrorValue.NA
    return array.items[row * array.columns + column]


def _first_item(value: Value, context: Context) -> Scalar:
    if isinstance(value, Reference):
        area = value.areas[0]
        return context.cell_value(area.sheet, area.first_row, area.first_column)
    if isinstance(value, Array):
        return value.items[0]
    if isinstance(value, LambdaValue):
        return ErrorValue.CALC
    return value
