"""SUMIFS and its kin: which places meet the criteria is decided when compiling, or by flags over draws.

A criterion itself must be the same in all draws. A place whose cells do not vary is settled when compiling,
so that a summary by year over a monthly row becomes a plain sum of twelve cells.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from cellsim.cells import CellRef, RangeRef
from cellsim.functions.criteria import Criterion, parse_criterion
from cellsim.program.ir import Op, Operand, constant
from cellsim.program.lower_branches import is_error_flag
from cellsim.program.lower_calls import Arguments
from cellsim.program.lower_sums import (
    CountedItem,
    average_of,
    counted_item,
    extreme_of,
    how_many,
    sum_of,
)
from cellsim.program.lowered import Choice, Flagged, Known, Lowered, Numeric
from cellsim.values import ErrorValue, Reference, Scalar

_ZERO = constant(0.0)
_ONE = constant(1.0)

Rule = Callable[[Arguments], Lowered | None]
Finish = Callable[[Arguments, Sequence[CountedItem]], Lowered | None]


class _NoFormError(Exception):
    """A range or criterion for which flags over draws do not serve."""


def _area(given: Arguments, position: int) -> RangeRef:
    value = given.values[position]
    if not isinstance(value, Known) or not isinstance(value.value, Reference):
        raise _NoFormError
    if len(value.value.areas) != 1:
        raise _NoFormError
    return value.value.areas[0]


def _clipped(given: Arguments, area: RangeRef) -> RangeRef:
    return given.lowering.cells.graph.resolver.clip(area)


def _criterion(given: Arguments, position: int) -> Criterion:
    """A criterion that is one value, the same in all draws."""
    value = given.values[position]
    if isinstance(value, Known) and isinstance(value.value, Reference):
        area = _area(given, position)
        if area.size != 1:
            raise _NoFormError
        value = given.lowering.cells.cell(area.first)
    if not isinstance(value, Known) or isinstance(value.value, Reference):
        raise _NoFormError
    content = value.value
    if content is not None and not isinstance(content, (bool, float, str, ErrorValue)):
        raise _NoFormError
    return parse_criterion(content)


def _flags(given: Arguments, area: RangeRef, criterion: Criterion) -> list[Operand]:
    """For each cell of an area, in which draws it meets the criterion; never an error."""
    return [
        _matches(given, item, criterion) for item in given.lowering.cells.area_block(area).items
    ]


def _matches(given: Arguments, item: Lowered, criterion: Criterion) -> Operand:
    if isinstance(item, Known):
        return _tested(criterion, _scalar(item))
    chosen = _matches_if_no_error(given, item, criterion)
    if_error = _test_of_errors(criterion)
    if chosen == if_error:
        return chosen
    return given.emitter.builder.emit(
        Op.SELECT_FLAG, is_error_flag(given.lowering, item), if_error, chosen
    )


def _matches_if_no_error(given: Arguments, item: Lowered, criterion: Criterion) -> Operand:
    if isinstance(item, Known):
        return _tested(criterion, _scalar(item))
    if isinstance(item, Choice):
        then = _matches_if_no_error(given, item.then, criterion)
        otherwise = _matches_if_no_error(given, item.otherwise, criterion)
        if then == otherwise:
            return then
        return given.emitter.builder.emit(Op.SELECT_FLAG, item.flag, then, otherwise)
    if isinstance(item, Numeric):
        if isinstance(criterion.operand, float):
            compared = given.emitter.compare(criterion.operator, item, Known(criterion.operand))
            return given.emitter.flag(compared)
        return _tested(criterion, 1.0)  # all numbers alike
    if isinstance(item, Flagged) and not isinstance(criterion.operand, bool):
        return _tested(criterion, True)  # both logicals alike
    raise _NoFormError


def _scalar(item: Known) -> Scalar:
    content = item.value
    if content is None or isinstance(content, (bool, float, str, ErrorValue)):
        return content
    raise _NoFormError


def _tested(criterion: Criterion, value: Scalar) -> Operand:
    return _ONE if criterion.test(value) else _ZERO


def _test_of_errors(criterion: Criterion) -> Operand:
    if isinstance(criterion.operand, ErrorValue):
        raise _NoFormError  # which error it is decides
    return _tested(criterion, ErrorValue.NA)


def _both(given: Arguments, first: Sequence[Operand], second: Sequence[Operand]) -> list[Operand]:
    return [
        _ZERO if _ZERO in (a, b) else given.emitter.logical(Op.AND, a, b)
        for a, b in zip(first, second, strict=True)
    ]


def _all_flags(given: Arguments, start: int) -> tuple[RangeRef, list[Operand]] | None:
    """The first range and, by place, in which draws all criteria are met; None if shapes differ."""
    shape: RangeRef | None = None
    flags: list[Operand] = []
    for position in range(start, len(given.values), 2):
        area = _clipped(given, _area(given, position))
        found = _flags(given, area, _criterion(given, position + 1))
        if shape is None:
            shape, flags = area, found
        elif (area.rows, area.columns) != (shape.rows, shape.columns):
            return None
        else:
            flags = _both(given, flags, found)
    return None if shape is None else (shape, flags)


def _items(given: Arguments, area: RangeRef, flags: Sequence[Operand]) -> list[CountedItem]:
    """The numbers of an area at the places whose flags may be set; no other cell is read."""
    emit = given.emitter.builder.emit
    items: list[CountedItem] = []
    for cell, flag in zip(area.cells(), flags, strict=True):
        if flag == _ZERO:
            continue
        item = counted_item(given, given.lowering.cells.cell(cell))
        if item.counts == _ZERO:
            continue
        if flag != _ONE:
            counts = flag
            if item.counts != _ONE:
                counts = emit(Op.SELECT_FLAG, flag, item.counts, _ZERO)
            item = CountedItem(counts, emit(Op.SELECT, flag, item.value, _ZERO))
        items.append(item)
    return items


def _guarded(rule: Rule) -> Rule:
    def guarded(given: Arguments) -> Lowered | None:
        try:
            return rule(given)
        except _NoFormError:
            return None

    return guarded


def one_criterion(finish: Finish) -> Rule:
    """SUMIF or AVERAGEIF: the range of values has the shape of the range tested."""

    def rule(given: Arguments) -> Lowered | None:
        tested = _area(given, 0)
        clipped = _clipped(given, tested)
        flags = _flags(given, clipped, _criterion(given, 1))
        values = clipped
        if len(given.values) > 2:
            first = _area(given, 2)
            values = _moved(clipped, first.first, clipped.first_row - tested.first_row)
        return finish(given, _items(given, values, flags))

    return _guarded(rule)


def _moved(like: RangeRef, first: CellRef, rows_down: int) -> RangeRef:
    row = first.row + rows_down
    return RangeRef(
        first.sheet, row, first.column, row + like.rows - 1, first.column + like.columns - 1
    )


def all_criteria(finish: Finish) -> Rule:
    """SUMIFS, AVERAGEIFS, MINIFS or MAXIFS."""

    def rule(given: Arguments) -> Lowered | None:
        found = _all_flags(given, 1)
        if found is None:
            return Known(ErrorValue.VALUE)
        shape, flags = found
        values = _clipped(given, _area(given, 0))
        if (values.rows, values.columns) != (shape.rows, shape.columns):
            return Known(ErrorValue.VALUE)
        return finish(given, _items(given, values, flags))

    return _guarded(rule)


def _count_one(given: Arguments) -> Lowered | None:
    area = _area(given, 0)
    criterion = _criterion(given, 1)
    clipped = _clipped(given, area)
    beyond = area.size - clipped.size  # blank cells outside the used range
    flags = _flags(given, clipped, criterion)
    count = given.emitter.as_lowered(how_many(given, flags))
    if not beyond or not criterion.test(None):
        return count
    return given.emitter.arithmetic("+", count, Known(float(beyond)))


def _count_all(given: Arguments) -> Lowered | None:
    found = _all_flags(given, 0)
    if found is None:
        return Known(ErrorValue.VALUE)
    shape, flags = found
    count = given.emitter.as_lowered(how_many(given, flags))
    beyond = _area(given, 0).size - shape.size
    places = range(1, len(given.values), 2)
    if not beyond or not all(_criterion(given, place).test(None) for place in places):
        return count
    return given.emitter.arithmetic("+", count, Known(float(beyond)))


def _least(given: Arguments, items: Sequence[CountedItem]) -> Lowered | None:
    return extreme_of(Op.MINIMUM, given, items)


def _greatest(given: Arguments, items: Sequence[CountedItem]) -> Lowered | None:
    return extreme_of(Op.MAXIMUM, given, items)


CONDITIONAL_RULES: dict[str, Rule] = {
    "SUMIF": one_criterion(sum_of),
    "SUMIFS": all_criteria(sum_of),
    "AVERAGEIF": one_criterion(average_of),
    "AVERAGEIFS": all_criteria(average_of),
    "MINIFS": all_criteria(_least),
    "MAXIFS": all_criteria(_greatest),
    "COUNTIF": _guarded(_count_one),
    "COUNTIFS": _guarded(_count_all),
}
