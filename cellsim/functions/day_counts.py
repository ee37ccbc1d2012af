"""Day counts and calendar steps on serial numbers.

Sources: ISDA 2006 definitions section 4.16 for 30/360 and actual/actual in name; the details of the US
30/360 rule and of actual/actual as spreadsheet programs compute YEARFRAC follow their documentation and
the check values in the tests.
"""

from __future__ import annotations

import calendar
import math

from cellsim.functions.serial_dates import (
    LAST_SERIAL,
    OFFSET_1904,
    date_from_serial,
    serial_from_date,
)
from cellsim.values import ErrorValue, Fault

Date = tuple[int, int, int]


def to_date(serial: float, *, date_1904: bool = False) -> Date:
    """Year, month and day of a serial number.

    Raises:
        Fault: It is out of range (#NUM!).
    """
    date = date_from_serial(serial, date_1904=date_1904)
    if date is None:
        raise Fault(ErrorValue.NUM)
    return date


def to_serial(year: int, month: int, day: int, *, date_1904: bool = False) -> float:
    """The serial number of a date of the calendar.

    Raises:
        Fault: There is no such day in the calendar's range (#NUM!).
    """
    serial = serial_from_date(year, month, day, date_1904=date_1904)
    if serial is None:
        raise Fault(ErrorValue.NUM)
    return serial


def days_in_month(year: int, month: int) -> int:
    """The days of a month; February 1900 has 29, as spreadsheets count."""
    if (year, month) == (1900, 2):
        return 29
    return calendar.monthrange(year, month)[1]


def add_months(date: Date, months: int) -> tuple[int, int, int]:
    """The same day some months later, cut to the month's last day.

    Raises:
        Fault: The result is out of the calendar (#NUM!).
    """
    total = date[0] * 12 + date[1] - 1 + months
    year, month = divmod(total, 12)
    if not 1900 <= year <= 9999:
        raise Fault(ErrorValue.NUM)
    month += 1
    return year, month, min(date[2], days_in_month(year, month))


def is_leap(year: int) -> bool:
    """Whether a year has 366 days."""
    return calendar.isleap(year)


def days_360(start: Date, end: Date, *, european: bool = False, month_end_rule: bool = True) -> int:
    """Days between two dates in months of 30 days.

    Args:
        start: The first date.
        end: The second date.
        european: 30E/360: a 31st counts as the 30th.
        month_end_rule: In the US method, whether the last day of February counts as the 30th.
    """
    (y1, m1, d1), (y2, m2, d2) = start, end
    if european:
        d1, d2 = min(d1, 30), min(d2, 30)
    else:
        if month_end_rule and m1 == 2 and d1 == days_in_month(y1, m1):
            if m2 == 2 and d2 == days_in_month(y2, m2):
                d2 = 30
            d1 = 30
        if d2 == 31 and d1 >= 30:
            d2 = 30
        if d1 == 31:
            d1 = 30
    return (y2 - y1) * 360 + (m2 - m1) * 30 + d2 - d1


def year_fraction(start: float, end: float, basis: int, *, date_1904: bool = False) -> float:
    """The share of a year between two serial numbers.

    Args:
        start: One date.
        end: The other; the order does not matter.
        basis: 0 US 30/360, 1 actual/actual, 2 actual/360, 3 actual/365, 4 European 30/360.
        date_1904: The date system.

    Raises:
        Fault: An unknown basis or a date out of range (#NUM!).
    """
    if not 0 <= basis <= 4:
        raise Fault(ErrorValue.NUM)
    first, last = sorted((float(int(start)), float(int(end))))
    a, b = to_date(first, date_1904=date_1904), to_date(last, date_1904=date_1904)
    if basis == 0:
        return days_360(a, b) / 360
    if basis == 4:
        return days_360(a, b, european=True) / 360
    if basis == 2:
        return (last - first) / 360
    if basis == 3:
        return (last - first) / 365
    return (last - first) / _average_year(a, b)


def _average_year(a: Date, b: Date) -> float:
    """The mean length of the years that two dates span; within a year, 366 if a 29 February lies between."""
    if a[0] == b[0]:
        return 366.0 if is_leap(a[0]) else 365.0
    within_a_year = b[0] == a[0] + 1 and (b[1], b[2]) <= (a[1], a[2])
    if within_a_year:
        leap_day_passed = (is_leap(a[0]) and (a[1], a[2]) <= (2, 29)) or (
            is_leap(b[0]) and (b[1], b[2]) >= (2, 29)
        )
        return 366.0 if leap_day_passed else 365.0
    years = b[0] - a[0] + 1
    leaps = sum(is_leap(year) for year in range(a[0], b[0] + 1))
    return 365 + leaps / years


def numbered_day(serial: float, *, date_1904: bool = False) -> int:
    """The day of a serial number as the 1900 system numbers it, by which weekdays are counted.

    Raises:
        Fault: It is out of range (#NUM!).
    """
    day = math.floor(serial) + (OFFSET_1904 if date_1904 else 0)
    if serial < 0 or day > LAST_SERIAL:
        raise Fault(ErrorValue.NUM)
    return day
