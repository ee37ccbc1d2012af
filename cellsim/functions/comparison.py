"""The order of values across types, as comparisons, lookups and sorting see it.

Number < text < FALSE < TRUE (ECMA-376 Part 1, MATCH); text without regard to case; a blank takes the
type of what it is compared with; numbers that agree to 15 significant digits are equal (common
practice, no source).
"""

from __future__ import annotations

from cellsim.values import Scalar

_NEARLY = 1e-14
_NUMBER, _TEXT, _LOGICAL = range(3)


def compare(left: Scalar, right: Scalar) -> int:
    """-1, 0 or 1 as `left` comes before, with or after `right`; neither is an error."""
    if type(left) is float and type(right) is float:
        return _compare_numbers(left, right)
    if left is None:
        left = _blank_like(right)
    if right is None:
        right = _blank_like(left)
    types = type_rank(left), type_rank(right)
    if types[0] != types[1]:
        return -1 if types[0] < types[1] else 1
    if types[0] == _NUMBER:
        return _compare_numbers(float(left), float(right))  # type: ignore[arg-type]
    if types[0] == _TEXT:
        a, b = str(left).casefold(), str(right).casefold()
        return (a > b) - (a < b)
    return (left is True) - (right is True)


def _compare_numbers(left: float, right: float) -> int:
    if left == right:
        return 0
    if abs(left - right) <= abs(left) * _NEARLY and f"{left:.14e}" == f"{right:.14e}":
        return 0
    return -1 if left < right else 1


def _blank_like(other: Scalar) -> Scalar:
    if isinstance(other, str):
        return ""
    return False if isinstance(other, bool) else 0.0


def type_rank(value: Scalar) -> int:
    """The place of a value's type: 0 for numbers and blanks, 1 for text, 2 for logicals."""
    if isinstance(value, bool):
        return _LOGICAL
    if isinstance(value, str):
        return _TEXT
    return _NUMBER


def same_type(left: Scalar, right: Scalar) -> bool:
    """Whether two values can be told apart by more than their type; a blank is of no type."""
    return left is not None and right is not None and type_rank(left) == type_rank(right)
