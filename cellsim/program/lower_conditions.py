"""Counting and summing what meets criteria, over draws: one flag for each cell and criterion.

An error in a tested cell only means that it meets no criterion but "not equal" and the same error; no
flag here ever stands for an error itself.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from cellsim.formula.tree import Binary, TextLiteral
from cellsim.functions.criteria import parse_criterion
from cellsim.functions.number_text import number_from_text
from cellsim.program.emit import COMPARISON_OPS
from cellsim.program.ir import Op, Operand, constant
from cellsim.program.lower_calls import Arguments
from cellsim.program.lowered import (
    Block,
    Choice,
    Flagged,
    Known,
    Lowered,
    Numeric,
    UnlowerableError,
    Varied,
)
from cellsim.values import ErrorValue, Reference, Scalar, encode_error

_TRUE, _FALSE, _ZERO = constant(1.0), constant(0.0), constant(0.0)
_LOWEST = -1.7976931348623157e308


@dataclass(frozen=True, slots=True)
class _Varying:
    """A criterion with a number that varies: `A1`, or `">"&A1`.

    That `&` cuts the number to 15 digits makes no difference: comparisons do the same.
    """

    operator: str
    number: Operand


_Condition = _Varying | Known


class _Matcher:
    """Emits whether items meet a criterion."""

    def __init__(self, given: Arguments) -> None:
        self._emitter = given.emitter
        self._emit = given.emitter.builder.emit

    def flag(self, item: Lowered, condition: _Condition) -> Operand:
        """The flag of an item, true where it meets the condition, never an error.

        Raises:
            UnlowerableError: The item is text that varies, or reads as a number.
        """
        if isinstance(condition, _Varying):
            return self._against_number(item, condition)
        if isinstance(condition.value, Reference):
            raise UnlowerableError("a criterion that is a reference")
        return self._against_fixed(item, condition.value)  # type: ignore[arg-type]

    def _guarded(self, operand: Operand, fails: Operand, otherwise: Operand) -> Operand:
        """A flag that is another one where an operand is an error."""
        return self._emit(Op.SELECT_FLAG, self._emit(Op.IS_ERROR, operand), fails, otherwise)

    def _against_fixed(self, item: Lowered, criterion: Scalar) -> Operand:
        parsed = parse_criterion(criterion)
        if isinstance(item, Known):
            return _flag(parsed.test(item.value))  # type: ignore[arg-type]
        if isinstance(item, (Block, Varied)):
            raise UnlowerableError("a criterion for text that varies")
        if isinstance(item, Numeric):
            operand = self._emitter.settled(item)
            number = _flag(parsed.test(1.0))
            if isinstance(parsed.operand, float):
                op = COMPARISON_OPS[parsed.operator]
                number = self._emit(op, operand, constant(parsed.operand))
            return self._guarded(operand, self._of_error(operand, criterion), number)
        flag = item.operand if isinstance(item, Flagged) else item.flag
        operand = self._emitter.number(self._emitter.flag_as_lowered(flag))
        if isinstance(item, Flagged):
            sides = _flag(parsed.test(True)), _flag(parsed.test(False))
        else:
            sides = (
                self._against_fixed(item.then, criterion),
                self._against_fixed(item.otherwise, criterion),
            )
        chosen = self._emit(Op.SELECT_FLAG, flag, *sides)
        return self._guarded(operand, self._of_error(operand, criterion), chosen)

    def _of_error(self, operand: Operand, criterion: Scalar) -> Operand:
        """Whether an error meets a criterion that is the same in all draws."""
        parsed = parse_criterion(criterion)
        if not isinstance(parsed.operand, ErrorValue):
            return _flag(parsed.test(ErrorValue.DIV0))
        same = self._emit(Op.SAME_ERROR, operand, constant(encode_error(parsed.operand)))
        if parsed.operator not in {"=", "<>"}:
            return _FALSE
        return same if parsed.operator == "=" else self._emitter.opposite(same)

    def _against_number(self, item: Lowered, condition: _Varying) -> Operand:
        number, operator = condition.number, condition.operator
        others = _flag(operator == "<>")  # what is no number only meets "not equal"
        if isinstance(item, Known):
            return self._known_against_number(item, condition)
        if isinstance(item, (Block, Varied)):
            raise UnlowerableError("a criterion for text that varies")
        if isinstance(item, Numeric):
            operand = self._emitter.settled(item)
            compared: Operand = self._emit(COMPARISON_OPS[operator], operand, number)
        else:
            flag = item.operand if isinstance(item, Flagged) else item.flag
            operand = self._emitter.number(self._emitter.flag_as_lowered(flag))
            compared = others
            if isinstance(item, Choice):
                sides = (self._against_number(s, condition) for s in (item.then, item.otherwise))
                compared = self._emit(Op.SELECT_FLAG, flag, *sides)
        compared = self._guarded(operand, others, compared)
        return self._guarded(number, self._emit(Op.SAME_ERROR, operand, number), compared)

    def _known_against_number(self, item: Known, condition: _Varying) -> Operand:
        number, operator = condition.number, condition.operator
        if isinstance(item.value, float):
            compared: Operand = self._emit(COMPARISON_OPS[operator], constant(item.value), number)
            return self._guarded(number, _FALSE, compared)
        if isinstance(item.value, str) and number_from_text(item.value) is not None:
            raise UnlowerableError("a criterion for numbers in text")
        fails: Operand = _FALSE
        if isinstance(item.value, ErrorValue):
            fails = self._emit(Op.SAME_ERROR, constant(encode_error(item.value)), number)
        return self._guarded(number, fails, _flag(operator == "<>"))


def _flag(holds: bool) -> Operand:
    return _TRUE if holds else _FALSE


def _condition(given: Arguments, position: int) -> _Condition:
    """The criterion at a place of a call.

    Raises:
        UnlowerableError: It is text that varies in other ways than by a number after an operator.
    """
    node = given.node.arguments[position]
    if isinstance(node, Binary) and node.operator == "&" and isinstance(node.left, TextLiteral):
        number = given.lowering.operand(node.right, whole=given.whole)
        if isinstance(number, Numeric) and node.left.value in COMPARISON_OPS:
            return _Varying(node.left.value, given.emitter.settled(number))
    value = given.lowering.dereference(given.values[position], whole=given.whole)
    if isinstance(value, Numeric):
        return _Varying("=", given.emitter.settled(value))
    if isinstance(value, Known):
        return value
    raise UnlowerableError("a criterion that is text or a logical in some draws")


def _area(given: Arguments, position: int) -> Block:
    """A range of a call whose cells are all within what the workbook holds."""
    value = given.values[position]
    if not (isinstance(value, Known) and isinstance(value.value, Reference)):
        raise UnlowerableError("a range that is none")
    areas = value.value.areas
    block = given.lowering.cells.area_block(areas[0])
    if len(areas) != 1 or len(block.items) != areas[0].size:
        raise UnlowerableError("a range that goes beyond the cells in use")
    return block


def _matches(given: Arguments, pairs: list[tuple[int, int]]) -> list[Operand]:
    """For each place, a flag: whether it meets all criteria."""
    matcher = _Matcher(given)
    flags: list[Operand] = []
    shape: tuple[int, int] | None = None
    for area, criterion in pairs:
        block = _area(given, area)
        if shape is not None and shape != (block.rows, block.columns):
            raise UnlowerableError("ranges of different shapes")
        shape = (block.rows, block.columns)
        condition = _condition(given, criterion)
        found = [matcher.flag(item, condition) for item in block.items]
        flags = (
            [given.emitter.logical(Op.AND, a, b) for a, b in zip(flags, found, strict=True)]
            if flags
            else found
        )
    return flags


def _counted(given: Arguments, flags: list[Operand]) -> Operand:
    emitter = given.emitter
    total: Operand = _ZERO
    for flag in flags:
        total = emitter.arithmetic_operands(
            "+", total, emitter.number(emitter.flag_as_lowered(flag))
        )
    return total


def summand(given: Arguments, item: Lowered) -> Operand:
    """What an item of a range adds to a sum: 0 unless it is a number or an error."""
    emit = given.emitter.builder.emit
    if isinstance(item, Numeric):
        return item.operand
    if isinstance(item, Known):
        return given.emitter.number(item) if isinstance(item.value, (float, ErrorValue)) else _ZERO
    if isinstance(item, Choice):
        sides = summand(given, item.then), summand(given, item.otherwise)
        return emit(Op.SELECT, item.flag, *sides)
    if isinstance(item, Flagged):
        operand = given.emitter.number(item)
        return emit(Op.SELECT, emit(Op.IS_ERROR, operand), operand, _ZERO)
    raise UnlowerableError("a range with cells that are numbers in some draws only")


def _is_number(given: Arguments, item: Lowered) -> Operand:
    """A flag: whether an item is a number; false for errors."""
    emit = given.emitter.builder.emit
    if isinstance(item, Known):
        return _flag(isinstance(item.value, float))
    if isinstance(item, Numeric):
        return given.emitter.opposite(emit(Op.IS_ERROR, item.operand))
    if isinstance(item, Flagged):
        return _FALSE
    if isinstance(item, Choice):
        operand = given.emitter.number(given.emitter.flag_as_lowered(item.flag))
        sides = _is_number(given, item.then), _is_number(given, item.otherwise)
        chosen = emit(Op.SELECT_FLAG, item.flag, *sides)
        return emit(Op.SELECT_FLAG, emit(Op.IS_ERROR, operand), _FALSE, chosen)
    raise UnlowerableError("a range with cells that are numbers in some draws only")


def _select(given: Arguments, flag: Operand, then: Operand, otherwise: Operand) -> Operand:
    return given.emitter.number(
        given.emitter.select(
            flag, given.emitter.as_lowered(then), given.emitter.as_lowered(otherwise)
        )
    )


def _pairs(given: Arguments, start: int) -> list[tuple[int, int]]:
    count = len(given.values)
    if (count - start) % 2 or count == start:
        raise UnlowerableError("a range without a criterion")
    return [(position, position + 1) for position in range(start, count, 2)]


def _taken(given: Arguments, single: bool) -> tuple[list[Operand], list[Lowered]]:
    """The flags of a call of SUMIF (single) or SUMIFS and their like, and the items that count."""
    if not single:
        flags, block = _matches(given, _pairs(given, 1)), _area(given, 0)
    else:
        flags = _matches(given, [(0, 1)])
        block = _area(given, 2 if len(given.values) > 2 else 0)
        tested = _area(given, 0)
        if (block.rows, block.columns) != (tested.rows, tested.columns):
            raise UnlowerableError("ranges of different shapes")
    if len(block.items) != len(flags):
        raise UnlowerableError("ranges of different shapes")
    return flags, list(block.items)


def _sum_of(given: Arguments, flags: list[Operand], items: list[Lowered]) -> Operand:
    total: Operand = _ZERO
    for flag, item in zip(flags, items, strict=True):
        part = _select(given, flag, summand(given, item), _ZERO)
        total = given.emitter.arithmetic_operands("+", total, part)
    return total


def _numbers(given: Arguments, flags: list[Operand], items: list[Lowered]) -> Operand:
    emitter = given.emitter
    counted = []
    for flag, item in zip(flags, items, strict=True):
        is_number = emitter.flag_as_lowered(_is_number(given, item))
        both = emitter.select(flag, is_number, Known(False))
        counted.append(emitter.flag(both))
    return _counted(given, counted)


def count_if(given: Arguments) -> Lowered:
    """COUNTIF."""
    return given.emitter.as_lowered(_counted(given, _matches(given, [(0, 1)])))


def count_ifs(given: Arguments) -> Lowered:
    """COUNTIFS."""
    return given.emitter.as_lowered(_counted(given, _matches(given, _pairs(given, 0))))


def sum_rule(*, single: bool) -> Callable[[Arguments], Lowered]:
    """SUMIF (single) or SUMIFS."""

    def rule(given: Arguments) -> Lowered:
        return given.emitter.as_lowered(_sum_of(given, *_taken(given, single)))

    return rule


def average_rule(*, single: bool) -> Callable[[Arguments], Lowered]:
    """AVERAGEIF (single) or AVERAGEIFS."""

    def rule(given: Arguments) -> Lowered:
        flags, items = _taken(given, single)
        total, count = _sum_of(given, flags, items), _numbers(given, flags, items)
        return given.emitter.as_lowered(given.emitter.arithmetic_operands("/", total, count))

    return rule


def extreme_rule(op: Op) -> Callable[[Arguments], Lowered]:
    """MAXIFS or MINIFS: 0 where no number meets the criteria."""
    beyond = constant(_LOWEST if op is Op.MAXIMUM else -_LOWEST)

    def rule(given: Arguments) -> Lowered:
        flags, items = _taken(given, single=False)
        emit = given.emitter.builder.emit
        best: Operand = beyond
        for flag, item in zip(flags, items, strict=True):
            number = summand(given, item)
            is_text = given.emitter.opposite(_is_number(given, item))
            left_out = given.emitter.logical(
                Op.AND, is_text, given.emitter.opposite(emit(Op.IS_ERROR, number))
            )
            number = _select(given, left_out, beyond, number)
            best = emit(op, best, _select(given, flag, number, beyond))
        none = emit(Op.EQUAL, _numbers(given, flags, items), _ZERO)
        return Numeric(
            emit(Op.SELECT, emit(Op.IS_ERROR, best), best, emit(Op.SELECT, none, _ZERO, best))
        )

    return rule


def count_numbers_among(given: Arguments, items: Iterable[Lowered]) -> Operand:
    """How many of some items are numbers."""
    return _counted(given, [_is_number(given, item) for item in items])


def count_numbers(given: Arguments) -> Lowered | None:
    """COUNT of ranges and of numbers."""
    flags: list[Operand] = []
    for position, value in enumerate(given.values):
        if given.is_range(position):
            flags += [_is_number(given, item) for item in given.block(position).items]
        elif isinstance(value, Numeric):
            flags.append(_is_number(given, value))
        else:
            return None
    return given.emitter.as_lowered(_counted(given, flags))
