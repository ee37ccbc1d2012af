"""Functions that have a form of their own in the instruction set.

A rule gets a call whose arguments are lowered and gives the result, or None where it does not apply
and the function's kernel over draws is to be tried. Lazy rules get the call itself, so that a branch
that is never taken is never compiled.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

from cellsim.formula.tree import Call, Node
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import find_function
from cellsim.program.emit import is_error
from cellsim.program.ir import Constant, Op, Operand, constant
from cellsim.program.lower_calls import (
    Arguments,
    Lowering,
    as_lowered,
    item_operands,
    static_argument,
)
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
from cellsim.values import ErrorValue, Reference, decode_error

Rule = Callable[[Arguments], Lowered | None]
LazyRule = Callable[[Lowering, Call, bool], Lowered]

_ZERO = constant(0.0)


# Branches: IF and its like.


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
            flag, a, b = (_item(part, row, column) for part in parts)
            items.append(emitter.select(emitter.flag(flag), a, b))
    return Block(rows, columns, tuple(items))


def _item(block: Block, row: int, column: int) -> Lowered:
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
    operand = emitter.exact_number(index)
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
    subject = lowering.operand(arguments[0], whole=whole)
    pairs = (len(arguments) - 1) // 2
    last: Lowered = Known(ErrorValue.NA)
    if len(arguments) % 2 == 0:
        last = _branch(lowering, arguments[-1], whole)
    emitter = lowering.emitter
    for pair in range(pairs - 1, -1, -1):
        wanted = lowering.operand(arguments[1 + 2 * pair], whole=whole)
        if isinstance(subject, Block) or isinstance(wanted, Block):
            raise UnlowerableError("SWITCH over arrays")
        same = emitter.flag(emitter.compare("=", subject, wanted))
        if isinstance(same, Constant) and not is_error(same) and not same.value:
            continue
        last = emitter.select(same, _branch(lowering, arguments[2 + 2 * pair], whole), last)
    return last


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
                lowering, _item(value, row, column), _item(stands, row, column), only_na=only_na
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


# Sums and other functions of the numbers in ranges.


def _summed(emitter_arguments: Arguments) -> list[Operand]:
    """The numbers that SUM adds, in order; what is a number in some draws only counts as 0 elsewhere."""
    given = emitter_arguments
    operands: list[Operand] = []
    for position, value in enumerate(given.values):
        if not given.is_range(position):
            operands.append(given.emitter.number(value))
            continue
        for item in _items(given, position):
            operands += (
                [_summand(given, item)]
                if isinstance(item, Choice)
                else item_operands(given.emitter, item)
            )
    return operands


def _items(given: Arguments, position: int) -> Iterable[Lowered]:
    """The items of an argument; those of a union area by area."""
    value = given.values[position]
    if isinstance(value, Known) and isinstance(value.value, Reference):
        for area in value.value.areas:
            yield from given.lowering.cells.area_block(area).items
        return
    yield from given.block(position).items


def _summand(given: Arguments, item: Lowered) -> Operand:
    """What an item of a range adds to a sum."""
    if isinstance(item, Choice):
        then, otherwise = _summand(given, item.then), _summand(given, item.otherwise)
        return given.emitter.builder.emit(Op.SELECT, item.flag, then, otherwise)
    operands = item_operands(given.emitter, item)
    return operands[0] if operands else _ZERO


def add_up(given: Arguments, operands: Iterable[Operand]) -> Operand:
    """The sum of operands, from left to right."""
    total: Operand = _ZERO
    for operand in operands:
        if isinstance(total, Constant) and total.value == 0:
            total = operand
        else:
            total = given.emitter.arithmetic_operands("+", total, operand)
    return total


def _sum(given: Arguments) -> Lowered:
    return given.emitter.as_lowered(add_up(given, _summed(given)))


def _average(given: Arguments) -> Lowered | None:
    if any(
        isinstance(item, Choice)
        for p in range(len(given.values))
        for item in _range_items(given, p)
    ):
        return None
    operands = _summed(given)
    if not operands:
        return Known(ErrorValue.DIV0)
    count = constant(float(len(operands)))
    return given.emitter.as_lowered(
        given.emitter.arithmetic_operands("/", add_up(given, operands), count)
    )


def _range_items(given: Arguments, position: int) -> Iterable[Lowered]:
    return _items(given, position) if given.is_range(position) else ()


def _extreme(op: Op) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        if any(
            isinstance(item, Choice)
            for p in range(len(given.values))
            for item in _range_items(given, p)
        ):
            return None
        operands = _summed(given)
        if not operands:
            return Known(0.0)
        fixed = [operand for operand in operands if isinstance(operand, Constant)]
        varying = [operand for operand in operands if not isinstance(operand, Constant)]
        failing = [operand for operand in fixed if is_error(operand)]
        if failing:
            return Known(decode_error(failing[0].value)) if not varying else None
        pick = min if op is Op.MINIMUM else max
        result: Operand | None = (
            constant(pick(operand.value for operand in fixed)) if fixed else None
        )
        for operand in varying:
            result = operand if result is None else given.emitter.builder.emit(op, result, operand)
        return given.emitter.as_lowered(result or _ZERO)

    return rule


def _count_all(given: Arguments) -> Lowered | None:
    count = 0
    for position in range(len(given.values)):
        for item in _items(given, position):
            if isinstance(item, Varied):
                return None
            count += not (isinstance(item, Known) and item.value is None)
    return Known(float(count))


def _sum_of_products(given: Arguments) -> Lowered | None:
    blocks = [given.block(position) for position in range(len(given.values))]
    if len({(block.rows, block.columns) for block in blocks}) != 1:
        return Known(ErrorValue.VALUE)
    products: list[Operand] = []
    for items in zip(*(block.items for block in blocks), strict=True):
        product: Operand | None = None
        for item in items:
            factor = _summand(given, item)
            product = (
                factor
                if product is None
                else given.emitter.arithmetic_operands("*", product, factor)
            )
        products.append(product or _ZERO)
    return given.emitter.as_lowered(add_up(given, products))


def _product(given: Arguments) -> Lowered | None:
    if any(
        isinstance(item, Choice)
        for p in range(len(given.values))
        for item in _range_items(given, p)
    ):
        return None
    result: Operand | None = None
    for operand in _summed(given):
        result = (
            operand if result is None else given.emitter.arithmetic_operands("*", result, operand)
        )
    return given.emitter.as_lowered(result or _ZERO)


def _net_present_value(given: Arguments) -> Lowered | None:
    """NPV by Horner's rule from the last flow back."""
    emitter = given.emitter
    flows: list[Operand] = []
    for position, value in enumerate(given.values[1:], start=1):
        if not given.is_range(position):
            flows.append(emitter.number(value))
            continue
        for item in _items(given, position):
            flows += item_operands(emitter, item)
    growth = emitter.arithmetic_operands("+", emitter.number(given.values[0]), constant(1.0))
    total: Operand | None = None
    for flow in reversed(flows):
        summed = flow if total is None else emitter.arithmetic_operands("+", total, flow)
        total = emitter.arithmetic_operands("/", summed, growth)
    return None if total is None else emitter.as_lowered(total)


# Logic and information.


def _conjunction(op: Op) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        emitter = given.emitter
        flags: list[Operand] = []
        for position, value in enumerate(given.values):
            if not given.is_range(position):
                flags.append(emitter.flag(value))
                continue
            for item in _items(given, position):
                if isinstance(item, (Choice, Varied)):
                    return None
                if isinstance(item, Known) and not isinstance(
                    item.value, (bool, float, ErrorValue)
                ):
                    continue
                flags.append(emitter.flag(item))
        if not flags:
            return Known(ErrorValue.VALUE)
        result = flags[0]
        for flag in flags[1:]:
            result = emitter.logical(op, result, flag)
        return emitter.flag_as_lowered(result)

    return rule


def _not(given: Arguments) -> Lowered:
    return given.emitter.flag_as_lowered(
        given.emitter.opposite(given.emitter.flag(given.values[0]))
    )


def _is_error(given: Arguments) -> Lowered:
    return given.emitter.flag_as_lowered(is_error_flag(given.lowering, given.values[0]))


def _is_number(given: Arguments) -> Lowered | None:
    value = given.values[0]
    if isinstance(value, Numeric):
        failing = is_error_flag(given.lowering, value)
        return given.emitter.flag_as_lowered(given.emitter.opposite(failing))
    return Known(False) if isinstance(value, Flagged) else None


def _is_na(given: Arguments) -> Lowered | None:
    value = given.values[0]
    if isinstance(value, Numeric):
        return Flagged(given.emitter.builder.emit(Op.IS_NA, value.operand))
    return None


def _never_for_numbers(given: Arguments) -> Lowered | None:
    return Known(False) if isinstance(given.values[0], (Numeric, Flagged)) else None


def _as_number(given: Arguments) -> Lowered | None:
    value = given.values[0]
    return value if isinstance(value, Numeric) else None


def _operation(op: Op, exact: bool = False) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        emitter = given.emitter
        operand = (
            emitter.exact_number(given.values[0]) if exact else emitter.number(given.values[0])
        )
        if isinstance(operand, Constant):
            return None
        return Numeric(emitter.builder.emit(op, operand))

    return rule


def _power(given: Arguments) -> Lowered:
    return given.emitter.arithmetic("^", given.values[0], given.values[1])


# References.


def _of_references(given: Arguments) -> Lowered | None:
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


def _computed_reference(given: Arguments) -> Lowered:
    result = _of_references(given)
    if result is None:
        raise UnlowerableError(f"{given.function.name} with uncertain arguments may read any cell")
    return result


def _index(given: Arguments) -> Lowered | None:
    places = given.values[1:]
    first = given.values[0]
    if isinstance(first, Known) and isinstance(first.value, Reference):
        return _of_references(given)
    if not isinstance(first, Block) or not all(isinstance(place, Known) for place in places):
        return None
    numbers = [int(given.emitter.number(place).value) for place in places]  # type: ignore[union-attr]
    if len(numbers) == 1:
        numbers = [1, numbers[0]] if first.rows == 1 else [numbers[0], 1]
    row, column = numbers[0], numbers[1]
    if not (1 <= row <= first.rows and 1 <= column <= first.columns):
        return None
    return first.items[(row - 1) * first.columns + column - 1]


def _transpose(given: Arguments) -> Lowered:
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


def _table_lookup(*, by_column: bool) -> Rule:
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
        return _item(table, found, offset) if by_column else _item(table, offset, found)

    return rule


def _column(block: Block, column: int) -> Block:
    return Block(block.rows, 1, block.items[column :: block.columns])


def _row(block: Block, row: int) -> Block:
    return Block(1, block.columns, block.items[row * block.columns : (row + 1) * block.columns])


def _xlookup(given: Arguments) -> Lowered | None:
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


def _lookup(given: Arguments) -> Lowered | None:
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


RULES: dict[str, Rule] = {
    "SUM": _sum,
    "AVERAGE": _average,
    "MIN": _extreme(Op.MINIMUM),
    "MAX": _extreme(Op.MAXIMUM),
    "COUNTA": _count_all,
    "SUMPRODUCT": _sum_of_products,
    "PRODUCT": _product,
    "NPV": _net_present_value,
    "AND": _conjunction(Op.AND),
    "OR": _conjunction(Op.OR),
    "NOT": _not,
    "ISERROR": _is_error,
    "ISNUMBER": _is_number,
    "ISNA": _is_na,
    "ISTEXT": _never_for_numbers,
    "ISBLANK": _never_for_numbers,
    "N": _as_number,
    "ABS": _operation(Op.ABSOLUTE),
    "SQRT": _operation(Op.SQRT, exact=True),
    "EXP": _operation(Op.EXP),
    "LN": _operation(Op.LN, exact=True),
    "POWER": _power,
    "ROW": _of_references,
    "ROWS": _of_references,
    "COLUMN": _of_references,
    "COLUMNS": _of_references,
    "AREAS": _of_references,
    "ISREF": _of_references,
    "OFFSET": _computed_reference,
    "INDIRECT": _computed_reference,
    "INDEX": _index,
    "TRANSPOSE": _transpose,
    "VLOOKUP": _table_lookup(by_column=True),
    "HLOOKUP": _table_lookup(by_column=False),
    "XLOOKUP": _xlookup,
    "LOOKUP": _lookup,
}
