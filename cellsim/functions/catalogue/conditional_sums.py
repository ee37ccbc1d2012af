"""Counting and summing what meets criteria."""

from __future__ import annotations

from cellsim.cells import RangeRef
from cellsim.functions.criteria import parse_criterion
from cellsim.functions.moments import average, total
from cellsim.functions.number_text import number_from_text
from cellsim.functions.registry import (
    AnyScalar,
    ArgumentKind,
    CellArea,
    Context,
    Operand,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value


def _area_of(value: Value) -> RangeRef:
    if isinstance(value, ErrorValue):
        raise Fault(value)
    if not isinstance(value, Reference) or len(value.areas) != 1:
        raise Fault(ErrorValue.VALUE)
    return value.areas[0]


_PAIR = (ArgumentKind.OPERAND, ArgumentKind.ANY_SCALAR)
"""A range and its criterion; an array of criteria gives an array of results."""


def matching_places(context: Context, pairs: tuple[Value, ...]) -> tuple[Array, list[int], int]:
    """The places at which every criterion is met.

    Returns:
        The values of the first range, the places in it row by row, and how many blank cells beyond the
        used part of the sheet meet every criterion too.

    Raises:
        Fault: The ranges differ in shape or are no ranges (#VALUE!).
    """
    if len(pairs) % 2 or not pairs:
        raise Fault(ErrorValue.VALUE)
    first: Array | None = None
    places: list[int] | None = None
    beyond = 0
    for position in range(0, len(pairs), 2):
        area = _area_of(pairs[position])
        values = context.area_values(area)
        test = parse_criterion(_scalar(pairs[position + 1])).test
        if first is None:
            first, beyond = values, area.size - len(values.items)
        elif (values.rows, values.columns) != (first.rows, first.columns):
            raise Fault(ErrorValue.VALUE)
        items = values.items
        if places is None:
            places = [place for place, item in enumerate(items) if test(item)]
        else:
            places = [place for place in places if test(items[place])]
        beyond = beyond if beyond and test(None) else 0
    return first or Array(1, 1, [None]), places or [], beyond


def _scalar(value: Value) -> Scalar:
    """A criterion, which has been made a single value before."""
    if isinstance(value, (Array, Reference, LambdaValue)):
        raise Fault(ErrorValue.VALUE)
    return value


def _moved(context: Context, values: CellArea, like: RangeRef) -> Array:
    """The range of the same shape as another, from the first cell of a reference on."""
    area = values.areas[0]
    moved = RangeRef(
        area.sheet,
        area.first_row,
        area.first_column,
        area.first_row + like.rows - 1,
        area.first_column + like.columns - 1,
    )
    return context.area_values(moved)


def _numbers_at(values: Array, places: list[int]) -> list[float]:
    numbers: list[float] = []
    size = len(values.items)
    for place in places:
        item = values.items[place] if place < size else None
        if type(item) is float:
            numbers.append(item)
        elif isinstance(item, ErrorValue):
            raise Fault(item)
    return numbers


def _numbers_if(
    context: Context, where: CellArea, criterion: Scalar, values: CellArea | None
) -> list[float]:
    area = _area_of(where)
    tested = context.area_values(area)
    test = parse_criterion(criterion).test
    places = [place for place, item in enumerate(tested.items) if test(item)]
    return _numbers_at(tested if values is None else _moved(context, values, area), places)


@spreadsheet_function("SUMIF")
def sum_if(
    context: Context, where: CellArea, criterion: AnyScalar, values: CellArea | None = None
) -> float:
    """The sum of the numbers whose place meets a criterion."""
    return total(_numbers_if(context, where, criterion, values))


@spreadsheet_function("AVERAGEIF")
def average_if(
    context: Context, where: CellArea, criterion: AnyScalar, values: CellArea | None = None
) -> float | ErrorValue:
    """The mean of the numbers whose place meets a criterion."""
    return average(_numbers_if(context, where, criterion, values))


@spreadsheet_function("COUNTIF")
def count_if(context: Context, where: CellArea, criterion: AnyScalar) -> float:
    """How many cells meet a criterion."""
    area = _area_of(where)
    parsed = parse_criterion(criterion)
    values = context.area_values(area)
    found = sum(1 for item in values.items if parsed.test(item))
    beyond = area.size - len(values.items)
    return float(found + (beyond if beyond and parsed.test(None) else 0))


@spreadsheet_function("COUNTIFS", group=_PAIR, least=2)
def count_ifs(context: Context, *pairs: Operand) -> float:
    """How many places meet all criteria."""
    _, places, beyond = matching_places(context, pairs)
    return float(len(places) + beyond)


def _numbers_ifs(context: Context, values: CellArea, pairs: tuple[Value, ...]) -> list[float]:
    first, places, _ = matching_places(context, pairs)
    taken = context.area_values(_area_of(values))
    if (taken.rows, taken.columns) != (first.rows, first.columns):
        raise Fault(ErrorValue.VALUE)
    return _numbers_at(taken, places)


@spreadsheet_function("SUMIFS", group=_PAIR, least=3)
def sum_ifs(context: Context, values: CellArea, *pairs: Operand) -> float:
    """The sum of the numbers whose places meet all criteria."""
    return total(_numbers_ifs(context, values, pairs))


@spreadsheet_function("AVERAGEIFS", group=_PAIR, least=3)
def average_ifs(context: Context, values: CellArea, *pairs: Operand) -> float | ErrorValue:
    """The mean of the numbers whose places meet all criteria."""
    return average(_numbers_ifs(context, values, pairs))


@spreadsheet_function("MAXIFS", group=_PAIR, least=3)
def maximum_ifs(context: Context, values: CellArea, *pairs: Operand) -> float:
    """The largest of the numbers whose places meet all criteria; 0 if there is none."""
    return max(_numbers_ifs(context, values, pairs), default=0.0)


@spreadsheet_function("MINIFS", group=_PAIR, least=3)
def minimum_ifs(context: Context, values: CellArea, *pairs: Operand) -> float:
    """The smallest of the numbers whose places meet all criteria; 0 if there is none."""
    return min(_numbers_ifs(context, values, pairs), default=0.0)


def _items(context: Context, arguments: tuple[Value, ...]) -> list[tuple[Scalar, bool]]:
    """Every item of arguments, and whether it comes from a range or array."""
    found: list[tuple[Scalar, bool]] = []
    for argument in arguments:
        if isinstance(argument, Reference):
            for area in argument.areas:
                found += [(item, True) for item in context.area_values(area).items]
        elif isinstance(argument, Array):
            found += [(item, True) for item in argument.items]
        elif not isinstance(argument, LambdaValue):
            found.append((argument, False))
    return found


@spreadsheet_function("COUNT", least=1)
def count_numbers(context: Context, *values: Operand) -> float:
    """How many numbers there are; direct arguments that can be read as numbers count too."""
    count = 0
    for item, in_range in _items(context, values):
        if in_range:
            count += type(item) is float
        elif not isinstance(item, ErrorValue):
            count += not isinstance(item, str) or _reads_as_number(item)
    return float(count)


def _reads_as_number(text: str) -> bool:
    return number_from_text(text) is not None


@spreadsheet_function("COUNTA", least=1)
def count_values(context: Context, *values: Operand) -> float:
    """How many values of any kind there are, errors and empty texts included."""
    return float(
        sum(not in_range or item is not None for item, in_range in _items(context, values))
    )


@spreadsheet_function("COUNTBLANK")
def count_blanks(context: Context, where: CellArea) -> float:
    """How many cells are blank or hold an empty text."""
    blank = 0
    for area in where.areas:
        items = context.area_values(area).items
        blank += area.size - len(items) + sum(item is None or item == "" for item in items)
    return float(blank)
