"""Numbers as text and text as numbers."""

from __future__ import annotations

import re

from cellsim.functions.coercion import to_number, to_text
from cellsim.functions.dispatch import values_of
from cellsim.functions.format_digits import rounded, shown_digits
from cellsim.functions.number_format import format_value
from cellsim.functions.number_text import number_from_text
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Logical,
    Number,
    Operand,
    ScalarValue,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.functions.text_limits import bounded
from cellsim.values import ErrorValue, Fault, Scalar

_MOST_DECIMALS = 127
_NUMBER = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?\Z")


@spreadsheet_function("VALUE")
def number_of_text(context: Context, text: ScalarValue) -> float | ErrorValue:
    """The number that a text stands for."""
    if isinstance(text, bool):
        return ErrorValue.VALUE
    return to_number(text, date_1904=context.date_1904)


@spreadsheet_function("NUMBERVALUE")
def number_of_text_with_separators(
    text: Text, decimal: Text = ".", group: Text | None = None
) -> float | ErrorValue:
    """The number that a text stands for, with separators of one's own."""
    if group is None:
        group = "." if decimal[:1] == "," else ","
    if not decimal or not group or decimal[0] == group[0]:
        return ErrorValue.VALUE
    body, percents = _without_percents("".join(text.split()))
    whole, point, fraction = body.partition(decimal[0])
    if group[0] in fraction or decimal[0] in fraction:
        return ErrorValue.VALUE
    body = whole.replace(group[0], "") + ("." if point else "") + fraction
    in_brackets = body.startswith("(") and body.endswith(")")
    if in_brackets:
        body, inner = _without_percents(body[1:-1])
        percents += inner
    if not body:
        return 0.0
    if _NUMBER.match(body) is None or (in_brackets and body[0] in "+-"):
        return ErrorValue.VALUE
    return (-1 if in_brackets else 1) * float(body) / 100.0**percents


def _without_percents(text: str) -> tuple[str, int]:
    """A text without percent signs at its end, and how many there were."""
    body = text.rstrip("%")
    return body, len(text) - len(body)


@spreadsheet_function("TEXT")
def formatted(context: Context, value: ScalarValue, number_format: Text) -> str | ErrorValue:
    """A value as a number format shows it."""
    shown = value
    if isinstance(value, str):
        number = number_from_text(value, date_1904=context.date_1904)
        shown = value if number is None else number
    text = format_value(shown, number_format, date_1904=context.date_1904)
    return bounded(text) if isinstance(text, str) else text


def _fixed(number: float, decimals: int, *, commas: bool) -> str:
    """The size of a number with a fixed number of decimals, from its 15 shown digits.

    Raises:
        Fault: Too many decimals (#VALUE!).
    """
    if decimals > _MOST_DECIMALS:
        raise Fault(ErrorValue.VALUE)
    value = rounded(shown_digits(number), max(decimals, -400))
    return f"{value:{',' if commas else ''}.{max(decimals, 0)}f}"


def _is_nothing(text: str) -> bool:
    return not text.strip("0.,")


@spreadsheet_function("FIXED")
def fixed_decimals(number: Number, decimals: Whole = 2, no_commas: Logical = False) -> str:
    """A number as text with a fixed number of decimals."""
    text = _fixed(number, decimals, commas=not no_commas)
    return f"-{text}" if number < 0 and not _is_nothing(text) else text


@spreadsheet_function("DOLLAR", "USDOLLAR")
def as_amount(number: Number, decimals: Whole = 2) -> str:
    """A number as an amount of dollars, in brackets below zero."""
    text = _fixed(number, decimals, commas=True)
    return f"(${text})" if number < 0 and not _is_nothing(text) else f"${text}"


def _is_strict(form: int) -> bool:
    """Whether values are written as they would be typed.

    Raises:
        Fault: The form is neither 0 nor 1 (#VALUE!).
    """
    if form not in (0, 1):
        raise Fault(ErrorValue.VALUE)
    return form == 1


def _as_written(value: Scalar, *, strict: bool) -> str:
    if isinstance(value, ErrorValue):
        return str(value)
    if strict and isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    return to_text(value)


@spreadsheet_function("VALUETOTEXT")
def value_as_text(value: AnyScalar, form: Whole = 0) -> str:
    """Any value as text; in form 1, as it would be typed."""
    return bounded(_as_written(value, strict=_is_strict(form)))


@spreadsheet_function("ARRAYTOTEXT")
def array_as_text(context: Context, values: Operand, form: Whole = 0) -> str | ErrorValue:
    """An array as text; in form 1, as it would be typed."""
    strict = _is_strict(form)
    array = values_of(values, context)
    if strict and array.items == [None]:  # stored values show this for a single blank cell
        return ErrorValue.VALUE
    rows = [[_as_written(item, strict=strict) for item in row] for row in array.to_rows()]
    if strict:
        return bounded("{" + ";".join(",".join(row) for row in rows) + "}")
    return bounded(", ".join(item for row in rows for item in row))
