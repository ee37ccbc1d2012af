"""Logic: branches, conjunctions, and what stands in for an error."""

from __future__ import annotations

from collections.abc import Callable

from cellsim.functions.coercion import to_logical
from cellsim.functions.comparison import compare
from cellsim.functions.dispatch import single_value
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Lazy,
    Logical,
    Number,
    Operand,
    ScalarValue,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Value


@spreadsheet_function("IF")
def choose_branch(condition: Logical, then: Lazy, otherwise: Lazy | None = None) -> Value:
    """The second argument where the condition is true, else the third (FALSE if there is none)."""
    if condition:
        return then()
    return otherwise() if otherwise is not None else False


@spreadsheet_function("IFS", least=2)
def first_true_branch(context: Context, *branches: Lazy) -> Value:
    """The value after the first condition that is true; #N/A if none is."""
    if len(branches) % 2:
        return ErrorValue.NA
    for position in range(0, len(branches), 2):
        if to_logical(single_value(branches[position](), context)):
            return branches[position + 1]()
    return ErrorValue.NA


@spreadsheet_function("IFERROR")
def replace_error(value: AnyScalar, instead: Lazy) -> Value:
    """The first argument unless it is an error, then the second."""
    return instead() if isinstance(value, ErrorValue) else 0.0 if value is None else value


@spreadsheet_function("IFNA")
def replace_not_available(value: AnyScalar, instead: Lazy) -> Value:
    """The first argument unless it is #N/A, then the second."""
    return instead() if value is ErrorValue.NA else 0.0 if value is None else value


@spreadsheet_function("SWITCH", least=3)
def matching_branch(context: Context, subject: ScalarValue, *branches: Lazy) -> Value:
    """The value after the first case that equals the first argument, else the default, else #N/A."""
    for position in range(0, len(branches) - 1, 2):
        case = single_value(branches[position](), context)
        if isinstance(case, ErrorValue):
            return case
        # a blank is 0 here: it is neither FALSE nor an empty text
        if compare(0.0 if subject is None else subject, 0.0 if case is None else case) == 0:
            return branches[position + 1]()
    return branches[-1]() if len(branches) % 2 else ErrorValue.NA


@spreadsheet_function("CHOOSE")
def choose_by_index(index: Number, first: Lazy, *more: Lazy) -> Value:
    """The argument at a place counted from 1."""
    branches: tuple[Callable[[], Value], ...] = (first, *more)
    place = int(index)
    return branches[place - 1]() if 1 <= place <= len(branches) else ErrorValue.VALUE


def _logicals(context: Context, arguments: tuple[Value, ...]) -> list[bool]:
    """The logicals in arguments: in ranges, text and blanks are passed over.

    Raises:
        Fault: An error, text that is no logical in a direct argument, or no logical at all (#VALUE!).
    """
    found: list[bool] = []
    for argument in arguments:
        if isinstance(argument, Reference):
            for area in argument.areas:
                found += _from_items(context.area_values(area))
        elif isinstance(argument, Array):
            found += _from_items(argument)
        elif isinstance(argument, LambdaValue):
            raise Fault(ErrorValue.VALUE)
        else:
            found.append(to_logical(argument))
    if not found:
        raise Fault(ErrorValue.VALUE)
    return found


def _from_items(values: Array) -> list[bool]:
    found: list[bool] = []
    for item in values.items:
        if isinstance(item, ErrorValue):
            raise Fault(item)
        if isinstance(item, (bool, float)):
            found.append(bool(item))
    return found


@spreadsheet_function("AND", least=1)
def all_true(context: Context, *conditions: Operand) -> bool:
    """Whether all conditions are true."""
    return all(_logicals(context, conditions))


@spreadsheet_function("OR", least=1)
def any_true(context: Context, *conditions: Operand) -> bool:
    """Whether any condition is true."""
    return any(_logicals(context, conditions))


@spreadsheet_function("XOR", least=1)
def odd_number_true(context: Context, *conditions: Operand) -> bool:
    """Whether an odd number of conditions is true."""
    return sum(_logicals(context, conditions)) % 2 == 1


@spreadsheet_function("NOT")
def opposite(condition: Logical) -> bool:
    """FALSE for true and TRUE for false."""
    return not condition


@spreadsheet_function("TRUE")
def true_value() -> bool:
    """TRUE."""
    return True


@spreadsheet_function("FALSE")
def false_value() -> bool:
    """FALSE."""
    return False
