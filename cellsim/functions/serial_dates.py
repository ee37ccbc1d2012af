"""Dates as serial numbers, in the 1900 and the 1904 system.

Source: ECMA-376 1st edition Part 4 section 3.17.4.1. In the 1900 system day 60 is 29 February 1900,
a day that did not exist, and serial 0 shows as 0 January 1900.
"""

from __future__ import annotations

import datetime as dt

_BASE = dt.date(1899, 12, 30).toordinal()
OFFSET_1904 = 1462
"""How many days later the 1904 system begins."""
_PHANTOM_LEAP_DAY = 60
LAST_SERIAL = 2_958_465
"""31 December 9999 in the 1900 system."""


def serial_from_date(year: int, month: int, day: int, *, date_1904: bool = False) -> float | None:
    """The serial number of a calendar date; None for a day that is not in the calendar."""
    if (year, month, day) == (1900, 2, 29) and not date_1904:
        return float(_PHANTOM_LEAP_DAY)
    try:
        ordinal = dt.date(year, month, day).toordinal()
    except ValueError:
        return None
    serial = ordinal - _BASE
    if date_1904:
        serial -= OFFSET_1904
        return float(serial) if serial >= 0 else None
    if serial <= _PHANTOM_LEAP_DAY:
        serial -= 1
    return float(serial) if serial >= 0 else None


def date_from_serial(serial: float, *, date_1904: bool = False) -> tuple[int, int, int] | None:
    """Year, month and day of a serial number (fractions dropped); None if it is out of range.

    Serial 0 of the 1900 system is (1900, 1, 0), and 60 is (1900, 2, 29).
    """
    day = int(serial // 1)
    if date_1904:
        day += OFFSET_1904
    if day < 0 or day > LAST_SERIAL:
        return None
    if not date_1904:
        if day == 0:
            return 1900, 1, 0
        if day == _PHANTOM_LEAP_DAY:
            return 1900, 2, 29
        if day < _PHANTOM_LEAP_DAY:
            day += 1
    date = dt.date.fromordinal(_BASE + day)
    return date.year, date.month, date.day
