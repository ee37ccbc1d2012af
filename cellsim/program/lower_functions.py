"""Functions that have a form of their own in the instruction set.

A rule gets a call whose arguments are lowered and gives the result, or None where it does not apply
and the function's kernel over draws is to be tried.
"""

from __future__ import annotations

from collections.abc import Callable

from cellsim.functions.conversions import find_conversion
from cellsim.program.ir import Constant, Op, Operand, constant
from cellsim.program.lower_branches import is_error_flag
from cellsim.program.lower_calls import (
    Arguments,
    static_argument,
)
from cellsim.program.lower_conditional_sums import CONDITIONAL_RULES
from cellsim.program.lower_references import (
    computed_reference,
    index_rule,
    lookup_rule,
    of_references,
    table_lookup,
    transpose_rule,
    xlookup_rule,
)
from cellsim.program.lower_sums import (
    average_rule,
    count_all_rule,
    count_rule,
    extreme_rule,
    items_of,
    net_present_value_rule,
    product_rule,
    sum_of_products_rule,
    sum_rule,
)
from cellsim.program.lowered import (
    Choice,
    Flagged,
    Known,
    Lowered,
    Numeric,
    Varied,
)
from cellsim.values import ErrorValue, Reference

Rule = Callable[[Arguments], Lowered | None]


# Logic and information.


def _conjunction(op: Op) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        emitter = given.emitter
        flags: list[Operand] = []
        for position, value in enumerate(given.values):
            if not given.is_range(position):
                flags.append(emitter.flag(value))
                continue
            for item in items_of(given, position):
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
    flag = _number_flag(given, given.values[0])
    return None if flag is None else given.emitter.flag_as_lowered(flag)


def _number_flag(given: Arguments, value: Lowered) -> Operand | None:
    """In which draws a value is a number; never an error."""
    emitter = given.emitter
    if isinstance(value, Known) and not isinstance(value.value, Reference):
        return constant(float(isinstance(value.value, float)))
    if isinstance(value, Flagged):
        return constant(0.0)
    if isinstance(value, Numeric):
        return emitter.opposite(is_error_flag(given.lowering, value))
    if not isinstance(value, Choice):
        return None
    then, otherwise = _number_flag(given, value.then), _number_flag(given, value.otherwise)
    if then is None or otherwise is None:
        return None
    chosen = emitter.builder.emit(Op.SELECT_FLAG, value.flag, then, otherwise)
    failing = is_error_flag(given.lowering, value)
    return emitter.builder.emit(Op.SELECT_FLAG, failing, constant(0.0), chosen)


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


def _operation(op: Op) -> Rule:
    def rule(given: Arguments) -> Lowered | None:
        emitter = given.emitter
        operand = emitter.number(given.values[0])
        if isinstance(operand, Constant):
            return None
        return Numeric(emitter.builder.emit(op, operand))

    return rule


def _power(given: Arguments) -> Lowered:
    return given.emitter.arithmetic("^", given.values[0], given.values[1])


def _converted(given: Arguments) -> Lowered | None:
    """CONVERT between units that are the same in all draws, by the kernel's own arithmetic."""
    number = given.values[0]
    units = [static_argument(given.lowering, value) for value in given.values[1:]]
    if not isinstance(number, Numeric) or len(units) != 2:
        return None
    from_unit, to_unit = units
    if not isinstance(from_unit, str) or not isinstance(to_unit, str):
        return None
    conversion = find_conversion(from_unit, to_unit)
    if conversion is None:
        return None  # whether #N/A or an error of the number comes first, the reference says
    emitter = given.emitter
    found = emitter.number(number)
    for operator, part in (
        ("*", conversion.factor),
        ("+", conversion.shift),
        ("/", conversion.divisor),
    ):
        found = emitter.arithmetic_operands(operator, found, constant(part))
    return emitter.as_lowered(found)


RULES: dict[str, Rule] = {
    **CONDITIONAL_RULES,
    "SUM": sum_rule,
    "AVERAGE": average_rule,
    "MIN": extreme_rule(Op.MINIMUM),
    "MAX": extreme_rule(Op.MAXIMUM),
    "COUNT": count_rule,
    "COUNTA": count_all_rule,
    "SUMPRODUCT": sum_of_products_rule,
    "PRODUCT": product_rule,
    "NPV": net_present_value_rule,
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
    "SQRT": _operation(Op.SQRT),
    "EXP": _operation(Op.EXP),
    "LN": _operation(Op.LN),
    "POWER": _power,
    "CONVERT": _converted,
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
