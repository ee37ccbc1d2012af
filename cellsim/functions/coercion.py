"""How values become numbers, text and logicals, by the place in which they stand.

Sources: ECMA-376 Part 1 section 18.17.2 leaves the conversion of text open; the behaviour here is
common practice of spreadsheet programs, checked against values that they stored.
"""

from __future__ import annotations

import math

from cellsim.functions.number_text import number_from_text
from cellsim.values import Array, ErrorValue, Fault, Scalar

_MOST_DECIMALS = 19
"""Numbers that need more decimals are written with an exponent: stored complex numbers show 19, never 20."""


def to_number(value: Scalar, *, date_1904: bool = False) -> float:
    """A scalar in an arithmetic place: blank is 0, logicals are 1 and 0, numeric text is parsed.

    Raises:
        Fault: The value is an error, or text that is no number (#VALUE!).
    """
    if isinstance(value, float):
        return value
    if value is None:
        return 0.0
    if isinstance(value, bool):
        return 1.0 if value else 0.0
    if isinstance(value, str):
        number = number_from_text(value, date_1904=date_1904)
        if number is None:
            raise Fault(ErrorValue.VALUE)
        return number
    raise Fault(value)


def to_text(value: Scalar) -> str:
    """A scalar in a text place: numbers as in a cell of General format, blank is empty.

    Raises:
        Fault: The value is an error.
    """
    if isinstance(value, str):
        return value
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, ErrorValue):
        raise Fault(value)
    return general_text(value)


def to_logical(value: Scalar) -> bool:
    """A scalar in a logical place: numbers are true unless 0, blank is false, "TRUE" is parsed.

    Raises:
        Fault: The value is an error, or text other than TRUE and FALSE (#VALUE!).
    """
    if isinstance(value, bool):
        return value
    if value is None:
        return False
    if isinstance(value, str):
        word = value.upper()
        if word in {"TRUE", "FALSE"}:
            return word == "TRUE"
        raise Fault(ErrorValue.VALUE)
    if isinstance(value, ErrorValue):
        raise Fault(value)
    return value != 0


def general_text(number: float) -> str:
    """A number as text the way `&` and TEXT(x, "General") write it: up to 15 significant digits."""
    if number == 0:
        return "0"
    exponent = math.floor(math.log10(abs(number)))
    if -10 < exponent < 20:
        text = f"{number:.15g}"
        if "e" not in text:
            return text
        decimals = max(0, 14 - exponent)
        plain = f"{float(text):.{min(decimals, 300)}f}"
        plain = plain.rstrip("0").rstrip(".") if "." in plain else plain
        if len(plain.partition(".")[2]) <= _MOST_DECIMALS:
            return plain
    mantissa, _, power = f"{number:.14e}".partition("e")
    mantissa = mantissa.rstrip("0").rstrip(".")
    sign = "-" if power[0] == "-" else "+"
    return f"{mantissa}E{sign}{abs(int(power)):02d}"


def numbers_in(values: Array) -> list[float]:
    """The numbers in an array or range, passing over text, logicals and blanks.

    Raises:
        Fault: An item is an error.
    """
    items = values.items
    numbers = [item for item in items if type(item) is float]
    if len(numbers) != len(items):
        for item in items:
            if isinstance(item, ErrorValue):
                raise Fault(item)
    return numbers


def first_error(values: Array) -> ErrorValue | None:
    """The first error in an array, row by row, or None."""
    for item in values.items:
        if isinstance(item, ErrorValue):
            return item
    return None
