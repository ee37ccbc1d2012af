"""Dates over draws: the rules of `serial_dates` and `day_counts` on arrays of serial numbers.

Whole days are NumPy dates in between; what is out of the calendar is marked and becomes #NUM!.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.functions.serial_dates import LAST_SERIAL, OFFSET_1904
from cellsim.values import ErrorValue, encode_error

FloatArray = npt.NDArray[np.float64]
WholeArray = npt.NDArray[np.int64]
Numbers = FloatArray | float

_EPOCH_DAYS = -int(np.datetime64("1899-12-30").astype(np.int64))
"""Days from serial 0 to 1 January 1970."""
_PHANTOM_LEAP_DAY = 60
_FIRST_MONTH, _LAST_MONTH = 1900 * 12, 9999 * 12 + 11
_NUM = encode_error(ErrorValue.NUM)


@dataclass(frozen=True, slots=True)
class Calendar:
    """Dates of the calendar.

    Attributes:
        month: Months since the year 0, January counted as 0.
        day: Day of the month.
        outside: Where the serial number is in no calendar; month and day are then those of serial 0.
    """

    month: WholeArray
    day: WholeArray
    outside: npt.NDArray[np.bool_]

    @property
    def year(self) -> WholeArray:
        """The years."""
        return self.month // 12


def calendar_of(serials: Numbers, *, date_1904: bool) -> Calendar:
    """The dates of serial numbers; fractions of a day are dropped."""
    days = np.floor(np.asarray(serials, dtype=np.float64)) + (OFFSET_1904 if date_1904 else 0)
    outside = ~((days >= 0) & (days <= LAST_SERIAL))
    whole = np.where(outside, 0, days).astype(np.int64)
    shifted = whole if date_1904 else whole + (whole < _PHANTOM_LEAP_DAY)
    dates = (shifted - _EPOCH_DAYS).astype("datetime64[D]")
    months = dates.astype("datetime64[M]")
    month = months.astype(np.int64) + 1970 * 12
    day = (dates - months.astype("datetime64[D]")).astype(np.int64) + 1
    if not date_1904:
        phantom, zero = whole == _PHANTOM_LEAP_DAY, whole == 0
        month = np.where(phantom, _FIRST_MONTH + 1, np.where(zero, _FIRST_MONTH, month))
        day = np.where(phantom, 29, np.where(zero, 0, day))
    return Calendar(month, day, outside)


def first_of(month: WholeArray, *, date_1904: bool) -> WholeArray:
    """The serial numbers of the first days of months, counted as in `Calendar`; they may be negative."""
    firsts = (month - 1970 * 12).astype("datetime64[M]").astype("datetime64[D]")
    serials = firsts.astype(np.int64) + _EPOCH_DAYS
    if date_1904:
        return serials - OFFSET_1904
    return serials - (serials <= _PHANTOM_LEAP_DAY)


def days_in(month: WholeArray) -> WholeArray:
    """The days of months; February 1900 has 29."""
    firsts = (month - 1970 * 12).astype("datetime64[M]")
    days = (firsts + 1).astype("datetime64[D]") - firsts.astype("datetime64[D]")
    length: WholeArray = days.astype(np.int64) + (month == _FIRST_MONTH + 1)
    return length


def part(values: WholeArray, dates: Calendar) -> FloatArray:
    """A part of dates as numbers, #NUM! where there is no date."""
    return np.where(dates.outside, _NUM, values.astype(np.float64))


def date_of_parts(year: Numbers, month: Numbers, day: Numbers, *, date_1904: bool) -> FloatArray:
    """DATE over draws."""
    parts = [np.trunc(np.asarray(number, dtype=np.float64)) for number in (year, month, day)]
    bad = ~np.all([np.abs(number) < 1e9 for number in np.broadcast_arrays(*parts)], axis=0)
    y, m, d = (np.where(bad, 1900, number).astype(np.int64) for number in parts)
    bad = bad | (y < 0)
    total = np.where(y < 1900, y + 1900, y) * 12 + m - 1
    bad = bad | (total < _FIRST_MONTH) | (total > _LAST_MONTH)
    firsts = first_of(np.where(bad, _FIRST_MONTH + 120, total), date_1904=date_1904)
    last = LAST_SERIAL - (OFFSET_1904 if date_1904 else 0)
    serials = firsts + d - 1
    bad = bad | (firsts < 0) | (serials < 0) | (serials > last)
    return np.where(bad, _NUM, serials.astype(np.float64))


def moved_by_months(
    serials: Numbers, months: Numbers, *, date_1904: bool, to_the_end: bool
) -> FloatArray:
    """EDATE over draws, or EOMONTH, which goes to the month's last day."""
    dates = calendar_of(serials, date_1904=date_1904)
    steps = np.trunc(np.asarray(months, dtype=np.float64))
    far = ~(np.abs(steps) < 1e6)
    total = dates.month + np.where(far, 0, steps).astype(np.int64)
    bad = dates.outside | far | (total < _FIRST_MONTH) | (total > _LAST_MONTH)
    total = np.where(bad, _FIRST_MONTH + 120, total)
    length = days_in(total)
    day = length if to_the_end else np.minimum(dates.day, length)
    firsts = first_of(total, date_1904=date_1904)
    bad = bad | (firsts < 0)
    return np.where(bad, _NUM, (firsts + day - 1).astype(np.float64))
