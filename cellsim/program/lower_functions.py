"""Functions that have a form of their own in the instruction set.

A rule gets a call whose arguments are lowered and gives the result, or None where it does not apply
and the function's kernel over draws is to be tried.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

from cellsim.program.emit import is_error
from cellsim.program.ir import Constant, Op, Operand, constant
from cellsim.program.lower_branches import is_error_flag
from cellsim.program.lower_calls import (
    Arguments,
    item_operands,
)
from cellsim.program.lower_conditions import (
    average_rule,
    count_if,
    count_ifs,
    count_numbers,
    count_numbers_among,
    extreme_rule,
    sum_rule,
    summand,
)
from cellsim.program.lower_references import (
    computed_reference,
    index_rule,
    lookup_rule,
    of_references,
    table_lookup,
    transpose_rule,
    xlookup_rule,
)
from cellsim.program.lowered import (
    Choice,
    Flagged,
    Known,
    Lowered,
    Numeric,
    Varied,
)
from cellsim.values import ErrorValue, Reference, decode_error

Rule = Callable[[Arguments], Lowered | None]

_ZERO = constant(0.0)


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
                [summand(given, item)]
                if isinstance(item, (Choice, Flagged))
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
    if _has_mixed_items(given):
        parts = [summand(given, item) for item in _all_items(given)]
        return given.emitter.as_lowered(
            given.emitter.arithmetic_operands(
                "/", add_up(given, parts), count_numbers_among(given, _all_items(given))
            )
        )
    operands = _summed(given)
    if not operands:
        return Known(ErrorValue.DIV0)
    count = constant(float(len(operands)))
    return given.emitter.as_lowered(
        given.emitter.arithmetic_operands("/", add_up(given, operands), count)
    )


def _all_items(given: Arguments) -> list[Lowered]:
    """The items of all arguments, direct ones as numbers."""
    items: list[Lowered] = []
    for position, value in enumerate(given.values):
        if given.is_range(position):
            items += _items(given, position)
        else:
            items.append(given.emitter.as_lowered(given.emitter.number(value)))
    return items


def _has_mixed_items(given: Arguments) -> bool:
    """Whether a range holds what is a number, or an error, in some draws only."""
    return any(
        isinstance(item, (Choice, Flagged))
        for position in range(len(given.values))
        for item in _range_items(given, position)
    )


def _range_items(given: Arguments, position: int) -> Iterable[Lowered]:
    return _items(given, position) if given.is_range(position) else ()


def _extreme(op: Op) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        if _has_mixed_items(given):
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
            if isinstance(item, Varied) and not given.is_range(position):
                return None  # it may be a blank, which no cell of a formula is
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
            factor = summand(given, item)
            product = (
                factor
                if product is None
                else given.emitter.arithmetic_operands("*", product, factor)
            )
        products.append(product or _ZERO)
    return given.emitter.as_lowered(add_up(given, products))


def _product(given: Arguments) -> Lowered | None:
    if _has_mixed_items(given):
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
    if isinstance(growth, Constant) and is_error(growth):
        return emitter.as_lowered(growth)
    total: Operand | None = None
    for flow in reversed(flows):
        # of several errors that of the earliest flow counts: it stands on the left
        summed = flow if total is None else emitter.arithmetic_operands("+", flow, total)
        total = emitter.arithmetic_operands("/", summed, growth)
    if total is None or isinstance(growth, Constant):
        return None if total is None else emitter.as_lowered(total)
    failing = emitter.builder.emit(Op.IS_ERROR, growth)
    return Numeric(emitter.builder.emit(Op.SELECT, failing, growth, total))


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


RULES: dict[str, Rule] = {
    "SUM": _sum,
    "AVERAGE": _average,
    "MIN": _extreme(Op.MINIMUM),
    "MAX": _extreme(Op.MAXIMUM),
    "COUNT": count_numbers,
    "COUNTA": _count_all,
    "COUNTIF": count_if,
    "COUNTIFS": count_ifs,
    "SUMIF": sum_rule(single=True),
    "SUMIFS": sum_rule(single=False),
    "AVERAGEIF": average_rule(single=True),
    "AVERAGEIFS": average_rule(single=False),
    "MAXIFS": extreme_rule(Op.MAXIMUM),
    "MINIFS": extreme_rule(Op.MINIMUM),
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
    "ROW": of_references,
    "ROWS": of_references,
    "COLUMN": of_references,
    "COLUMNS": of_references,
    "AREAS": of_references,
    "ISREF": of_references,
    "OFFSET": computed_reference,
    "INDIRECT": computed_reference,
    "INDEX": index_rule,
    "TRANSPOSE": transpose_rule,
    "VLOOKUP": table_lookup(by_column=True),
    "HLOOKUP": table_lookup(by_column=False),
    "XLOOKUP": xlookup_rule,
    "LOOKUP": lookup_rule,
}
