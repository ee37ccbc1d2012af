"""Functions that move, find or count cells: resolved when compiling where their arguments allow it."""

from __future__ import annotations

from collections.abc import Callable

from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import find_function
from cellsim.program.emit import is_error
from cellsim.program.ir import Builder, Constant, KernelCall, Op, Operand, StackOperand
from cellsim.program.lower_branches import block_item
from cellsim.program.lower_calls import (
    Arguments,
    as_lowered,
    static_argument,
)
from cellsim.program.lowered import (
    Block,
    Known,
    Lowered,
    Numeric,
    UnlowerableError,
)
from cellsim.values import ErrorValue, Reference

Rule = Callable[[Arguments], Lowered | None]


def of_references(given: Arguments) -> Lowered | None:
    """A function that looks at references and not at what their cells hold."""
    arguments = []
    for value in given.values:
        if isinstance(value, Known) and isinstance(value.value, Reference):
            arguments.append(value.value)
            continue
        static = static_argument(given.lowering, value)
        if static is None:
            return None
        arguments.append(None if static == () else static)  # type: ignore[arg-type]
    frame = given.lowering.cells.frame(given.lowering.cell)
    return as_lowered(call_function(given.function, arguments, frame, whole_arrays=given.whole))


def computed_reference(given: Arguments) -> Lowered:
    """A reference whose arguments do not vary; else only the reference evaluator can follow it."""
    result = of_references(given)
    if result is None:
        raise UnlowerableError(f"{given.function.name} with uncertain arguments may read any cell")
    return result


def index_rule(given: Arguments) -> Lowered | None:
    """INDEX at a place that does not vary: the cell itself."""
    places = given.values[1:]
    first = given.values[0]
    if isinstance(first, Known) and isinstance(first.value, Reference):
        return of_references(given) or _index_in_cells(given, first.value)
    if not isinstance(first, Block) or not all(isinstance(place, Known) for place in places):
        return None
    numbers = [int(given.emitter.number(place).value) for place in places]  # type: ignore[union-attr]
    if len(numbers) == 1:
        numbers = [1, numbers[0]] if first.rows == 1 else [numbers[0], 1]
    row, column = numbers[0], numbers[1]
    if not (1 <= row <= first.rows and 1 <= column <= first.columns):
        return None
    return first.items[(row - 1) * first.columns + column - 1]


def _index_in_cells(given: Arguments, cells: Reference) -> Lowered | None:
    """INDEX at a place that varies, if it never asks for a whole row or column by a place of 0."""
    if len(cells.areas) != 1 or not 2 <= len(given.values) <= 3:
        return None
    area = cells.areas[0]
    if len(given.values) == 2 and area.rows > 1 and area.columns > 1:
        return None
    places = [given.emitter.number(value) for value in given.values[1:]]
    if not all(_is_at_least_one(given.emitter.builder, place) for place in places):
        return None
    operands: list[Operand] = []
    for item in given.lowering.cells.area_block(area).items:
        if not isinstance(item, Numeric) and not (
            isinstance(item, Known) and isinstance(item.value, (float, ErrorValue))
        ):
            return None
        operands.append(given.emitter.number(item))
    stack = StackOperand(area.rows, area.columns, tuple(operands), plain=False)
    return Numeric(given.emitter.builder.emit_call(KernelCall("INDEX", (stack, *places))))


_COUNTING_FUNCTIONS = frozenset({"MATCH", "XMATCH", "MONTH", "WEEKNUM"})
_DEEPEST_BOUND = 12


def _is_at_least_one(builder: Builder, operand: Operand, depth: int = 0) -> bool:
    """Whether a number is 1 or more in all draws in which it is no error."""
    if isinstance(operand, Constant):
        return operand.value >= 1
    instruction = builder.writer(operand)
    if instruction is None or depth > _DEEPEST_BOUND:
        return False
    bounds = (_is_at_least_one(builder, part, depth + 1) for part in instruction.operands)
    op = instruction.op
    if op is Op.CALL:
        return instruction.detail.function in _COUNTING_FUNCTIONS
    if op is Op.MAXIMUM:
        return any(bounds)
    if op in {Op.MINIMUM, Op.MULTIPLY, Op.IF_ERROR, Op.IF_NA, Op.ADD, Op.ADD_LAST}:
        return all(bounds)
    if op is Op.SELECT:
        return all(list(bounds)[1:])
    return False


def transpose_rule(given: Arguments) -> Lowered:
    """TRANSPOSE: the items in another order."""
    block = given.block(0)
    items = tuple(
        block.items[row * block.columns + column]
        for column in range(block.columns)
        for row in range(block.rows)
    )
    return Block(block.columns, block.rows, items)


def _match_place(given: Arguments, key: Lowered, keys: Block, kind: float) -> int | Known | None:
    """Where a static key is found among static keys, from 0; an error; None if either varies."""
    wanted = static_argument(given.lowering, key)
    where = static_argument(given.lowering, keys)
    match = find_function("MATCH")
    if wanted is None or where is None or match is None:
        return None
    frame = given.lowering.cells.frame(given.lowering.cell)
    arguments = [None if wanted == () else wanted, where, kind]
    found = call_function(match, arguments, frame)  # type: ignore[arg-type]
    return int(found) - 1 if isinstance(found, float) else Known(found)  # type: ignore[arg-type]


def table_lookup(*, by_column: bool) -> Rule:
    """VLOOKUP and HLOOKUP whose key and key column do not vary: the cell itself."""

    def rule(given: Arguments) -> Lowered | None:
        table = given.block(1)
        place = given.values[2]
        approximate: Lowered = given.values[3] if len(given.values) > 3 else Known(True)
        if (
            not isinstance(place, Known)
            or not isinstance(approximate, Known)
            or table.rows * table.columns == 0
        ):
            return None
        line = given.emitter.number(place)
        mode = given.emitter.flag(approximate)
        if (
            not isinstance(line, Constant)
            or not isinstance(mode, Constant)
            or is_error(line)
            or is_error(mode)
        ):
            return None
        keys = _column(table, 0) if by_column else _row(table, 0)
        found = _match_place(given, given.values[0], keys, 1.0 if mode.value else 0.0)
        if not isinstance(found, int):
            return found
        offset = int(line.value) - 1
        if not 0 <= offset < (table.columns if by_column else table.rows):
            return Known(ErrorValue.VALUE if offset < 0 else ErrorValue.REF)
        return block_item(table, found, offset) if by_column else block_item(table, offset, found)

    return rule


def _column(block: Block, column: int) -> Block:
    return Block(block.rows, 1, block.items[column :: block.columns])


def _row(block: Block, row: int) -> Block:
    return Block(1, block.columns, block.items[row * block.columns : (row + 1) * block.columns])


def xlookup_rule(given: Arguments) -> Lowered | None:
    """XLOOKUP whose key and keys do not vary: the cell itself."""
    xmatch = find_function("XMATCH")
    keys, results = given.block(1), given.block(2)
    static = [
        static_argument(given.lowering, value)
        for value in (given.values[0], keys, *given.values[4:])
    ]
    if (
        xmatch is None
        or any(value is None for value in static)
        or len(results.items) != len(keys.items)
    ):
        return None
    frame = given.lowering.cells.frame(given.lowering.cell)
    found = call_function(xmatch, [None if value == () else value for value in static], frame)  # type: ignore[misc]
    if isinstance(found, float):
        return results.items[int(found) - 1]
    if found is ErrorValue.NA and len(given.values) > 3:
        missing = given.values[3]
        if not (isinstance(missing, Known) and missing.value is None):
            return missing
    return Known(found) if isinstance(found, ErrorValue) else None


def lookup_rule(given: Arguments) -> Lowered | None:
    """LOOKUP with static keys and a result vector."""
    if len(given.values) != 3:
        return None
    keys, results = given.block(1), given.block(2)
    if 1 not in (keys.rows, keys.columns) or 1 not in (results.rows, results.columns):
        return None
    found = _match_place(given, given.values[0], keys, 1.0)
    if not isinstance(found, int):
        return found
    return results.items[found] if found < len(results.items) else None
