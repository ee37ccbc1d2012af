"""The operators of the formula language on single values and, item by item, on arrays."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable

from cellsim.functions.array_limits import TextBudget
from cellsim.functions.coercion import to_number, to_text
from cellsim.functions.comparison import compare
from cellsim.functions.dispatch import common_shape, item_at
from cellsim.values import Array, ErrorValue, Fault, Scalar

_LONGEST_TEXT = 32_767


def binary(
    operator: str, left: Scalar | Array, right: Scalar | Array, *, date_1904: bool = False
) -> Scalar | Array:
    """The result of an infix operator other than the reference operators.

    Arrays are combined item by item; the error of the left operand wins over that of the right.
    """
    if isinstance(left, Array) or isinstance(right, Array):
        try:
            return _by_item(operator, _as_array(left), _as_array(right), date_1904=date_1904)
        except Fault as fault:
            return fault.error
    return binary_scalar(operator, left, right, date_1904=date_1904)


def binary_scalar(operator: str, left: Scalar, right: Scalar, *, date_1904: bool = False) -> Scalar:
    """The result of an infix operator on two single values."""
    try:
        arithmetic = _ARITHMETIC.get(operator)
        if arithmetic is not None:
            if type(left) is not float:
                left = to_number(left, date_1904=date_1904)
            if type(right) is not float:
                right = to_number(right, date_1904=date_1904)
            result = arithmetic(left, right)
            return result if math.isfinite(result) else ErrorValue.NUM
        if operator == "&":
            text = to_text(left) + to_text(right)
            return text if len(text) <= _LONGEST_TEXT else ErrorValue.VALUE
        if isinstance(left, ErrorValue):
            return left
        if isinstance(right, ErrorValue):
            return right
        return _COMPARISONS[operator](compare(left, right))
    except Fault as fault:
        return fault.error


def negate(value: Scalar | Array, *, date_1904: bool = False) -> Scalar | Array:
    """Unary minus."""
    return _each(value, lambda number: -number if number else 0.0, date_1904=date_1904)


def percent(value: Scalar | Array, *, date_1904: bool = False) -> Scalar | Array:
    """The postfix `%`."""
    return _each(value, lambda number: number / 100, date_1904=date_1904)


def power(base: float, exponent: float) -> float:
    """`^` on numbers: 0^0 and a fractional power of a negative number are #NUM!, 0^-1 is #DIV/0!.

    Raises:
        Fault: The result is a spreadsheet error.
    """
    if base == 0:
        if exponent == 0:
            raise Fault(ErrorValue.NUM)
        if exponent < 0:
            raise Fault(ErrorValue.DIV0)
    try:
        return math.pow(base, exponent)
    except (ValueError, OverflowError):
        raise Fault(ErrorValue.NUM) from None


def cancels(result: float, left: float) -> bool:
    """Whether a sum or difference is so small beside its operand that it counts as zero.

    Spreadsheet programs set the result of a formula's last addition or subtraction to zero when the
    operands agree to about 15 significant digits. Common practice, no source; the bound of 2^-48 relative was
    taken from what stored values show.
    """
    return abs(result) <= abs(left) * CANCELLATION


CANCELLATION = 2.0**-48


def _divide(left: float, right: float) -> float:
    if right == 0:
        raise Fault(ErrorValue.DIV0)
    return left / right


_ARITHMETIC: dict[str, Callable[[float, float], float]] = {
    "+": lambda left, right: left + right,
    "-": lambda left, right: left - right,
    "*": lambda left, right: left * right,
    "/": _divide,
    "^": power,
}

_COMPARISONS: dict[str, Callable[[int], bool]] = {
    "=": lambda order: order == 0,
    "<>": lambda order: order != 0,
    "<": lambda order: order < 0,
    "<=": lambda order: order <= 0,
    ">": lambda order: order > 0,
    ">=": lambda order: order >= 0,
}


def _as_array(value: Scalar | Array) -> Array:
    return value if isinstance(value, Array) else Array(1, 1, [value])


def _by_item(operator: str, left: Array, right: Array, *, date_1904: bool) -> Array:
    rows, columns = common_shape((left, right))
    pairs: Iterable[tuple[Scalar, Scalar]]
    if (left.rows, left.columns) == (right.rows, right.columns):
        pairs = zip(left.items, right.items, strict=True)
    else:
        pairs = (
            (item_at(left, row, column), item_at(right, row, column))
            for row in range(rows)
            for column in range(columns)
        )
    text = TextBudget()
    results = (binary_scalar(operator, a, b, date_1904=date_1904) for a, b in pairs)
    items = [text.take(item) for item in results] if operator == "&" else list(results)
    return Array(rows, columns, items)


def _each(
    value: Scalar | Array, apply: Callable[[float], float], *, date_1904: bool
) -> Scalar | Array:
    if isinstance(value, Array):
        items = [_each_scalar(item, apply, date_1904=date_1904) for item in value.items]
        return Array(value.rows, value.columns, items)
    return _each_scalar(value, apply, date_1904=date_1904)


def _each_scalar(value: Scalar, apply: Callable[[float], float], *, date_1904: bool) -> Scalar:
    try:
        return apply(to_number(value, date_1904=date_1904))
    except Fault as fault:
        return fault.error
