"""Values as number format codes show them (ECMA-376 Part 1, 18.8.31, in English)."""

from __future__ import annotations

from collections.abc import Callable

from cellsim.functions.coercion import general_text
from cellsim.functions.format_codes import Kind, Section, parse_format
from cellsim.functions.format_dates import format_date
from cellsim.functions.format_digits import (
    format_fraction,
    format_plain,
    format_scientific,
    fraction_layout,
    general_text_of_width,
)
from cellsim.values import ErrorValue, Fault, Scalar

_GENERAL = parse_format("General")[0]
_DOES_NOT_FIT = "#" * 8


def format_value(value: Scalar, code: str, *, date_1904: bool = False) -> str | ErrorValue:
    """A value as a number format shows it; colours and fills are left out.

    Args:
        value: What is shown; logicals as words, blanks as 0.
        code: The format code, in English.
        date_1904: The date system.

    Returns:
        The text, or #VALUE! for a code that makes no sense or a date out of range.
    """
    if isinstance(value, ErrorValue):
        return value
    try:
        sections = parse_format(code)
        if isinstance(value, bool):
            return _format_text("TRUE" if value else "FALSE", sections)
        if isinstance(value, str):
            return _format_text(value, sections)
        return _format_number(0.0 if value is None else value, sections, date_1904=date_1904)
    except Fault as fault:
        return fault.error


def _format_text(text: str, sections: tuple[Section, ...]) -> str:
    section = next((section for section in sections if section.is_text), None)
    if section is None and len(sections) >= 4:
        section = sections[3]
    if section is None:
        return text
    return "".join(text if token.kind is Kind.TEXT else token.text for token in section.tokens)


def _format_number(number: float, sections: tuple[Section, ...], *, date_1904: bool) -> str:
    section, shown = _choose(sections, number)
    if section is None:
        return _DOES_NOT_FIT
    tokens = section.tokens
    if section.is_date:
        return format_date(shown, tokens, date_1904=date_1904)
    if section.is_text:
        return "".join(
            general_text(number) if token.kind is Kind.TEXT else token.text for token in tokens
        )
    sign = "-" if shown < 0 else ""
    if section.has(Kind.GENERAL):
        size = general_text_of_width(abs(shown))
        return sign + "".join(
            size if token.kind is Kind.GENERAL else token.text for token in tokens
        )
    if not section.has(Kind.DIGIT):
        return sign + "".join(token.text for token in tokens)
    if section.has(Kind.EXPONENT):
        return format_scientific(shown, tokens)
    layout = fraction_layout(tokens)
    if layout is not None:
        return format_fraction(shown, tokens, layout)
    return format_plain(shown, tokens)


_HOLDS: dict[str, Callable[[float, float], bool]] = {
    "<": lambda a, b: a < b,
    "<=": lambda a, b: a <= b,
    ">": lambda a, b: a > b,
    ">=": lambda a, b: a >= b,
    "=": lambda a, b: a == b,
    "<>": lambda a, b: a != b,
}


def _choose(sections: tuple[Section, ...], number: float) -> tuple[Section | None, float]:
    """The section for a number, and the number as it is to be shown: without sign where the section says it."""
    numeric = sections[:3]
    if len(sections) > 1 and numeric[-1].is_text:
        numeric = numeric[:-1]
    if any(section.condition for section in numeric):
        return _choose_by_condition(numeric, number)
    if len(numeric) == 1 or number > 0 or (number == 0 and len(numeric) < 3):
        return numeric[0], number
    if number < 0:
        return numeric[1], abs(number)
    return numeric[2], number


def _choose_by_condition(
    sections: tuple[Section, ...], number: float
) -> tuple[Section | None, float]:
    for place, section in enumerate(sections):
        if section.condition is None:
            if place == 0 and number < 0 < len(sections) - 1:
                continue  # the first is for numbers from 0 up where others follow
            return section, abs(number) if place else number
        operator, bound = section.condition
        if _HOLDS[operator](number, bound):
            only_negative = operator in {"<", "<="} and bound <= 0
            return section, abs(number) if only_negative else number
    return (_GENERAL, number) if len(sections) == 1 else (None, number)
