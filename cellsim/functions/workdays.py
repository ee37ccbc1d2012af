"""Workdays: weekends, holidays, counting and stepping, on days as the 1900 system numbers them."""

from __future__ import annotations

from cellsim.functions.serial_dates import LAST_SERIAL
from cellsim.values import ErrorValue, Fault, Scalar

Weekend = tuple[bool, ...]
"""Monday to Sunday: whether the day is free."""

_PAIRS = {1: (5, 6), 2: (6, 0), 3: (0, 1), 4: (1, 2), 5: (2, 3), 6: (3, 4), 7: (4, 5)}
_SINGLE = {11: 6, 12: 0, 13: 1, 14: 2, 15: 3, 16: 4, 17: 5}


def weekend_of(value: Scalar) -> Weekend:
    """The weekend that a number (1-7, 11-17) or a text of seven 0s and 1s names.

    Raises:
        Fault: It names none.
    """
    if isinstance(value, ErrorValue):
        raise Fault(value)
    if isinstance(value, str):
        if len(value) != 7 or set(value) - {"0", "1"}:
            raise Fault(ErrorValue.VALUE)
        return tuple(character == "1" for character in value)
    number = 1 if value is None else int(value)
    if number in _PAIRS:
        return tuple(day in _PAIRS[number] for day in range(7))
    if number in _SINGLE:
        return tuple(day == _SINGLE[number] for day in range(7))
    raise Fault(ErrorValue.NUM)


def _is_free(day: int, weekend: Weekend, holidays: frozenset[int]) -> bool:
    return weekend[(day - 2) % 7] or day in holidays


def count_workdays(start: int, end: int, weekend: Weekend, holidays: frozenset[int]) -> int:
    """The workdays from one day to another, both included; negative if they are in reverse."""
    if start > end:
        return -count_workdays(end, start, weekend, holidays)
    weeks, rest = divmod(end - start + 1, 7)
    count = weeks * (7 - sum(weekend))
    first_rest = start + weeks * 7
    count += sum(not weekend[(day - 2) % 7] for day in range(first_rest, first_rest + rest))
    return count - sum(start <= day <= end and not weekend[(day - 2) % 7] for day in holidays)


def move_workdays(start: int, days: int, weekend: Weekend, holidays: frozenset[int]) -> int:
    """The day some workdays later or, with a negative number, earlier.

    Raises:
        Fault: The day is out of range (#NUM!), or there are no workdays (#VALUE!).
    """
    if all(weekend):
        raise Fault(ErrorValue.VALUE)
    if abs(days) > LAST_SERIAL:  # each takes at least a day
        raise Fault(ErrorValue.NUM)
    step = 1 if days > 0 else -1
    day, left = start, abs(days)
    working = 7 - sum(weekend)
    while left > 0:
        weeks = (left - 1) // working
        if weeks > 4 and not holidays:
            day += step * 7 * weeks
            left -= weeks * working
        day += step
        if not 0 <= day <= LAST_SERIAL:
            raise Fault(ErrorValue.NUM)
        if not _is_free(day, weekend, holidays):
            left -= 1
    return day
