"""Criteria such as `">=5"`, `"a*"` or `3`: what SUMIF, COUNTIFS and database functions match.

Microsoft's reference for COUNTIF describes operators and wildcards; that `"=5"` matches the text "5"
as well as the number, and that an empty criterion matches nothing but zero, is common practice, no source.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

from cellsim.functions.comparison import compare, same_type
from cellsim.functions.number_text import number_from_text
from cellsim.functions.wildcards import has_wildcards, wildcard_regex
from cellsim.values import ERROR_BY_SPELLING, ErrorValue, Scalar

Test = Callable[[Scalar], bool]

_OPERATOR = re.compile(r"(<>|<=|>=|=|<|>)?(.*)\Z", re.DOTALL)


@dataclass(frozen=True, slots=True)
class Criterion:
    """A criterion taken apart.

    Attributes:
        operator: `=`, `<>`, `<`, `<=`, `>` or `>=`.
        operand: What is compared with: a number, text, logical or error; None for "nothing".
        test: Whether a value matches.
    """

    operator: str
    operand: Scalar
    test: Test


def parse_criterion(criterion: Scalar) -> Criterion:
    """Take a criterion apart; a criterion in a blank cell is taken as 0."""
    if isinstance(criterion, str):
        return _from_text(criterion)
    if criterion is None:
        criterion = 0.0
    return Criterion("=", criterion, _equality(criterion))


@lru_cache(maxsize=8192)
def _from_text(text: str) -> Criterion:
    match = _OPERATOR.match(text)
    written = match[1] if match is not None else None
    rest = match[2] if match is not None else text
    operator = written or "="
    operand: Scalar = _operand(rest)
    if operand == "":
        if operator == "=":
            test = _is_blank if written else _is_empty
            return Criterion(operator, None, test)
        if operator == "<>":
            return Criterion(operator, None, lambda value: not _is_blank(value))
        return Criterion(operator, "", _ordering(operator, ""))
    if operator == "=":
        return Criterion(operator, operand, _equality(operand))
    if operator == "<>":
        equal = _equality(operand)
        return Criterion(operator, operand, lambda value: not equal(value))
    return Criterion(operator, operand, _ordering(operator, operand))


def _operand(text: str) -> Scalar:
    upper = text.upper()
    if upper in {"TRUE", "FALSE"}:
        return upper == "TRUE"
    if upper in ERROR_BY_SPELLING:
        return ERROR_BY_SPELLING[upper]
    number = number_from_text(text)
    return text if number is None else number


def _is_blank(value: Scalar) -> bool:
    return value is None


def _is_empty(value: Scalar) -> bool:
    return value is None or value == ""


def _equality(operand: Scalar) -> Test:
    if isinstance(operand, (bool, ErrorValue)):
        return lambda value: value is operand
    if isinstance(operand, float):
        number = operand

        def equals_number(value: Scalar) -> bool:
            if type(value) is float:
                return value == number or compare(value, number) == 0
            if isinstance(value, str):
                return number_from_text(value) == number
            return False

        return equals_number
    text = str(operand)
    if has_wildcards(text):
        matches = wildcard_regex(text).match
        return lambda value: isinstance(value, str) and matches(value) is not None
    folded = text.casefold()
    return lambda value: isinstance(value, str) and value.casefold() == folded


def _ordering(operator: str, operand: Scalar) -> Test:
    if isinstance(operand, float):
        number = operand
        simple: dict[str, Test] = {
            "<": lambda value: type(value) is float and compare(value, number) < 0,
            "<=": lambda value: type(value) is float and compare(value, number) <= 0,
            ">": lambda value: type(value) is float and compare(value, number) > 0,
            ">=": lambda value: type(value) is float and compare(value, number) >= 0,
        }
        return simple[operator]
    holds: dict[str, Callable[[int], bool]] = {
        "<": lambda order: order < 0,
        "<=": lambda order: order <= 0,
        ">": lambda order: order > 0,
        ">=": lambda order: order >= 0,
    }
    accept = holds[operator]
    return lambda value: (
        not isinstance(value, ErrorValue)
        and same_type(value, operand)
        and accept(compare(value, operand))
    )
