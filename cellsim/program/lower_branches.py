"""IF and its like: branches that are never taken are never compiled.

A lazy rule gets the call itself; everything else gets lowered arguments.
"""

from __future__ import annotations

from collections.abc import Callable

from cellsim.formula.tree import Call, Node
from cellsim.program.emit import is_error
from cellsim.program.ir import Constant, Op, Operand, constant
from cellsim.program.lower_calls import (
    Lowering,
)
from cellsim.program.lowered import (
    Block,
    Choice,
    Flagged,
    Known,
    Lowered,
    Numeric,
    UnlowerableError,
)
from cellsim.values import ErrorValue, Reference, decode_error

LazyRule = Callable[[Lowering, Call, bool], Lowered]

_ZERO = constant(0.0)


def _branch(lowering: Lowering, node: Node, whole: bool) -> Lowered:
    """A branch that is taken in some draws only: cells in place of references."""
    value = lowering.lower(node, whole=whole)
    if isinstance(value, Known) and isinstance(value.value, Reference):
        areas = value.value.areas
        return lowering.dereference(value, whole=whole or areas[0].size > 1)
    return value


def _condition(lowering: Lowering, node: Node, whole: bool) -> Operand | Block:
    value = lowering.operand(node, whole=whole)
    return value if isinstance(value, Block) else lowering.emitter.flag(value)


def _if(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    if not 2 <= len(node.arguments) <= 3:
        return Known(ErrorValue.VALUE)
    condition = _condition(lowering, node.arguments[0], whole)
    if isinstance(condition, Constant):
        if is_error(condition):
            return Known(decode_error(condition.value))
        if condition.value:
            return lowering.lower(node.arguments[1], whole=whole)
        return (
            lowering.lower(node.arguments[2], whole=whole)
            if len(node.arguments) > 2
            else Known(False)
        )
    then = _branch(lowering, node.arguments[1], whole)
    otherwise = (
        _branch(lowering, node.arguments[2], whole) if len(node.arguments) > 2 else Known(False)
    )
    if isinstance(condition, Block):
        return _if_by_item(lowering, condition, then, otherwise)
    return lowering.emitter.select(condition, then, otherwise)


def _if_by_item(lowering: Lowering, condition: Block, then: Lowered, otherwise: Lowered) -> Block:
    emitter = lowering.emitter
    parts = [
        condition,
        *(v if isinstance(v, Block) else Block(1, 1, (v,)) for v in (then, otherwise)),
    ]
    rows, columns = max(p.rows for p in parts), max(p.columns for p in parts)
    items: list[Lowered] = []
    for row in range(rows):
        for column in range(columns):
            flag, a, b = (block_item(part, row, column) for part in parts)
            items.append(emitter.select(emitter.flag(flag), a, b))
    return Block(rows, columns, tuple(items))


def block_item(block: Block, row: int, column: int) -> Lowered:
    """The item at a place of a larger shape: repeated along a single row or column, else #N/A."""
    row = 0 if block.rows == 1 else row
    column = 0 if block.columns == 1 else column
    if row >= block.rows or column >= block.columns:
        return Known(ErrorValue.NA)
    return block.items[row * block.columns + column]


def _ifs(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    arguments = node.arguments
    if not arguments or len(arguments) % 2:
        return Known(ErrorValue.NA)
    pairs: list[tuple[Operand, Lowered]] = []
    last: Lowered = Known(ErrorValue.NA)
    for position in range(0, len(arguments), 2):
        condition = _condition(lowering, arguments[position], whole)
        if isinstance(condition, Block):
            raise UnlowerableError("IFS over arrays")
        if isinstance(condition, Constant) and not is_error(condition) and not condition.value:
            continue
        value = _branch(lowering, arguments[position + 1], whole)
        if isinstance(condition, Constant):
            last = Known(decode_error(condition.value)) if is_error(condition) else value
            break
        pairs.append((condition, value))
    for condition, value in reversed(pairs):
        last = lowering.emitter.select(condition, value, last)
    return last


def _choose(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    branches = node.arguments[1:]
    index = lowering.operand(node.arguments[0], whole=whole)
    if isinstance(index, Block):
        raise UnlowerableError("CHOOSE over arrays")
    emitter = lowering.emitter
    operand = emitter.number(index)
    if isinstance(operand, Constant):
        if is_error(operand):
            return Known(decode_error(operand.value))
        place = int(operand.value)
        if not 1 <= place <= len(branches):
            return Known(ErrorValue.VALUE)
        return lowering.lower(branches[place - 1], whole=whole)
    result: Lowered = Known(ErrorValue.VALUE)
    values = [_branch(lowering, branch, whole) for branch in branches]
    first = values[0]
    if isinstance(first, Block):
        result = Block(first.rows, first.columns, (result,) * len(first.items))
    outside = result
    for place in range(len(values), 0, -1):
        below = emitter.builder.emit(Op.LESS, operand, constant(place + 1.0))
        result = emitter.select(below, values[place - 1], result)
    too_low = emitter.builder.emit(Op.LESS, operand, constant(1.0))
    return emitter.select(too_low, outside, result)


def _switch(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    arguments = node.arguments
    if len(arguments) < 3:
        return Known(ErrorValue.VALUE)
    subject = _blank_as_zero(lowering.operand(arguments[0], whole=whole))
    pairs = (len(arguments) - 1) // 2
    last: Lowered = Known(ErrorValue.NA)
    if len(arguments) % 2 == 0:
        last = _branch(lowering, arguments[-1], whole)
    emitter = lowering.emitter
    for pair in range(pairs - 1, -1, -1):
        wanted = _blank_as_zero(lowering.operand(arguments[1 + 2 * pair], whole=whole))
        if isinstance(subject, Block) or isinstance(wanted, Block):
            raise UnlowerableError("SWITCH over arrays")
        same = emitter.flag(emitter.compare("=", subject, wanted))
        if isinstance(same, Constant) and not is_error(same) and not same.value:
            continue
        last = emitter.select(same, _branch(lowering, arguments[2 + 2 * pair], whole), last)
    return last


def _blank_as_zero(value: Lowered) -> Lowered:
    return Known(0.0) if isinstance(value, Known) and value.value is None else value


def is_error_flag(lowering: Lowering, value: Lowered) -> Operand:
    """A flag: whether a value is an error.

    Raises:
        UnlowerableError: It is an array, or text in some draws.
    """
    emitter = lowering.emitter
    if isinstance(value, Known):
        return constant(float(isinstance(value.value, ErrorValue)))
    if isinstance(value, Numeric):
        return emitter.builder.emit(Op.IS_ERROR, value.operand)
    if isinstance(value, Flagged):
        return emitter.builder.emit(Op.IS_ERROR, emitter.number(value))
    if isinstance(value, Choice):
        flag_fails = (
            _ZERO
            if isinstance(value.flag, Constant)
            else is_error_flag(lowering, Flagged(value.flag))
        )
        then, otherwise = (
            is_error_flag(lowering, value.then),
            is_error_flag(lowering, value.otherwise),
        )
        chosen = emitter.builder.emit(Op.SELECT_FLAG, value.flag, then, otherwise)
        return emitter.builder.emit(Op.SELECT_FLAG, flag_fails, constant(1.0), chosen)
    raise UnlowerableError("a test for errors on text or an array that varies")


def _if_error(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    return _if_failing(lowering, node, whole, only_na=False)


def _if_na(lowering: Lowering, node: Call, whole: bool) -> Lowered:
    return _if_failing(lowering, node, whole, only_na=True)


def _if_failing(lowering: Lowering, node: Call, whole: bool, *, only_na: bool) -> Lowered:
    if len(node.arguments) != 2:
        return Known(ErrorValue.VALUE)
    value = lowering.operand(node.arguments[0], whole=whole)
    if isinstance(value, Known):
        fails = value.value is ErrorValue.NA if only_na else isinstance(value.value, ErrorValue)
        return lowering.lower(node.arguments[1], whole=whole) if fails else value
    instead = _branch(lowering, node.arguments[1], whole)
    if isinstance(value, Block):
        stands = instead if isinstance(instead, Block) else Block(1, 1, (instead,))
        items = [
            _instead(
                lowering,
                block_item(value, row, column),
                block_item(stands, row, column),
                only_na=only_na,
            )
            for row in range(value.rows)
            for column in range(value.columns)
        ]
        return Block(value.rows, value.columns, tuple(items))
    return _instead(lowering, value, instead, only_na=only_na)


def _instead(lowering: Lowering, value: Lowered, instead: Lowered, *, only_na: bool) -> Lowered:
    emitter = lowering.emitter
    if isinstance(value, Known):
        fails = value.value is ErrorValue.NA if only_na else isinstance(value.value, ErrorValue)
        return instead if fails else value
    if isinstance(value, Numeric):
        if isinstance(instead, Numeric) or (
            isinstance(instead, Known) and isinstance(instead.value, (float, ErrorValue))
        ):
            op = Op.IF_NA if only_na else Op.IF_ERROR
            return Numeric(emitter.builder.emit(op, value.operand, emitter.number(instead)))
        flag = emitter.builder.emit(Op.IS_NA if only_na else Op.IS_ERROR, value.operand)
        return emitter.select(flag, instead, value)
    if only_na:
        raise UnlowerableError("IFNA on a value of varying type")
    return emitter.select(is_error_flag(lowering, value), instead, value)


LAZY_RULES: dict[str, LazyRule] = {
    "IF": _if,
    "IFS": _ifs,
    "CHOOSE": _choose,
    "SWITCH": _switch,
    "IFERROR": _if_error,
    "IFNA": _if_na,
}
