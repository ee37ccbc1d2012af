"""Dates."""

from __future__ import annotations

import numpy as np

from cellsim.functions.coercion import to_number
from cellsim.functions.dates_over_draws import (
    FloatArray,
    Numbers,
    calendar_of,
    date_of_parts,
    moved_by_months,
    part,
)
from cellsim.functions.day_counts import (
    add_months,
    days_360,
    days_in_month,
    numbered_day,
    to_date,
    to_serial,
    year_fraction,
)
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Logical,
    Number,
    Text,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.functions.serial_dates import LAST_SERIAL, OFFSET_1904
from cellsim.values import ErrorValue, Fault


@spreadsheet_function("DATE")
def date_from_parts(context: Context, year: Whole, month: Whole, day: Whole) -> float | ErrorValue:
    """The serial number of a year, month and day; months and days may run over."""
    if year < 0:
        return ErrorValue.NUM
    if year < 1900:
        year += 1900
    carried, month = divmod(month - 1, 12)
    year += carried
    if not 1900 <= year <= 9999:
        return ErrorValue.NUM
    serial = to_serial(year, month + 1, 1, date_1904=context.date_1904) + day - 1
    last = LAST_SERIAL - (OFFSET_1904 if context.date_1904 else 0)
    return serial if 0 <= serial <= last else ErrorValue.NUM


def _date(context: Context, serial: float) -> tuple[int, int, int]:
    return to_date(serial, date_1904=context.date_1904)


@spreadsheet_function("YEAR")
def year_of(context: Context, date: Number) -> float:
    """The year of a date."""
    return float(_date(context, date)[0])


@spreadsheet_function("MONTH")
def month_of(context: Context, date: Number) -> float:
    """The month of a date."""
    return float(_date(context, date)[1])


@spreadsheet_function("DAY")
def day_of(context: Context, date: Number) -> float:
    """The day of the month of a date."""
    return float(_date(context, date)[2])


@spreadsheet_function("EDATE", strict=True)
def months_later(context: Context, date: Number, months: Whole) -> float:
    """The same day some months later."""
    year, month, day = add_months(_date(context, date), months)
    return to_serial(year, month, 1, date_1904=context.date_1904) + day - 1


@spreadsheet_function("EOMONTH", strict=True)
def end_of_month(context: Context, date: Number, months: Whole) -> float:
    """The last day of the month some months later."""
    year, month, _ = add_months(_date(context, date), months)
    return to_serial(year, month, days_in_month(year, month), date_1904=context.date_1904)


@over_draws("DATE")
def date_from_parts_over_draws(
    year: Numbers, month: Numbers, day: Numbers, *, date_1904: bool = False
) -> FloatArray:
    """DATE over draws."""
    return date_of_parts(year, month, day, date_1904=date_1904)


@over_draws("YEAR")
def year_over_draws(date: Numbers, *, date_1904: bool = False) -> FloatArray:
    """YEAR over draws."""
    dates = calendar_of(date, date_1904=date_1904)
    return part(dates.year, dates)


@over_draws("MONTH")
def month_over_draws(date: Numbers, *, date_1904: bool = False) -> FloatArray:
    """MONTH over draws."""
    dates = calendar_of(date, date_1904=date_1904)
    return part(dates.month % 12 + 1, dates)


@over_draws("DAY")
def day_over_draws(date: Numbers, *, date_1904: bool = False) -> FloatArray:
    """DAY over draws."""
    dates = calendar_of(date, date_1904=date_1904)
    return part(dates.day, dates)


@over_draws("EDATE")
def months_later_over_draws(
    date: Numbers, months: Numbers, *, date_1904: bool = False
) -> FloatArray:
    """EDATE over draws."""
    return moved_by_months(date, months, date_1904=date_1904, to_the_end=False)


@over_draws("EOMONTH")
def end_of_month_over_draws(
    date: Numbers, months: Numbers, *, date_1904: bool = False
) -> FloatArray:
    """EOMONTH over draws."""
    return moved_by_months(date, months, date_1904=date_1904, to_the_end=True)


@over_draws("DAYS")
def days_between_over_draws(end: Numbers, start: Numbers) -> FloatArray:
    """DAYS over draws."""
    return np.asarray(np.trunc(end) - np.trunc(start))


@spreadsheet_function("YEARFRAC", strict=True)
def share_of_year(
    context: Context, start: AnyScalar, end: AnyScalar, basis: AnyScalar = 0.0
) -> float:
    """The share of a year between two dates."""
    # The basis is looked at before the dates, and its error comes before theirs.
    rule = int(to_number(basis, date_1904=context.date_1904))
    if not 0 <= rule <= 4:
        raise Fault(ErrorValue.NUM)
    first, last = (to_number(date, date_1904=context.date_1904) for date in (start, end))
    if first < 0 or last < 0:
        raise Fault(ErrorValue.NUM)
    return year_fraction(first, last, rule, date_1904=context.date_1904)


@spreadsheet_function("DAYS")
def days_between(end: Number, start: Number) -> float:
    """The days from a start to an end."""
    return float(int(end) - int(start))


@spreadsheet_function("DAYS360")
def days_between_360(
    context: Context, start: Number, end: Number, european: Logical = False
) -> float:
    """The days between two dates in a year of 360."""
    a, b = _date(context, start), _date(context, end)
    if european:
        return float(days_360(a, b, european=True))
    (y1, m1, d1), (y2, m2, d2) = a, b
    if d1 == days_in_month(y1, m1) and (m1 == 2 or d1 == 31):
        d1 = 30
    if d2 == 31:
        if d1 < 30:
            d2, m2 = 1, m2 + 1
        else:
            d2 = 30
    return float((y2 - y1) * 360 + (m2 - m1) * 30 + d2 - d1)


@spreadsheet_function("DATEDIF")
def date_difference(context: Context, start: Number, end: Number, unit: Text) -> float | ErrorValue:
    """The whole years, months or days between two dates: Y, M, D, MD, YM or YD."""
    if start > end:
        return ErrorValue.NUM
    (y1, m1, d1), (y2, m2, d2) = _date(context, start), _date(context, end)
    months = (y2 - y1) * 12 + m2 - m1 - (d2 < d1)
    key = unit.upper()
    if key == "D":
        return float(int(end) - int(start))
    if key == "MD":
        if d2 >= d1:
            return float(d2 - d1)
        year, month = (y2, m2 - 1) if m2 > 1 else (y2 - 1, 12)
        return float(d2 - d1 + days_in_month(year, month))
    if key == "YD":  # counted in the year of the start, as stored values show
        year = y1 if (m1, d1) <= (m2, d2) else y1 + 1
        return to_serial(year, m2, 1, date_1904=context.date_1904) + d2 - 1 - int(start)
    results = {"Y": months // 12, "M": months, "YM": months % 12}
    return float(results[key]) if key in results else ErrorValue.NUM


@spreadsheet_function("WEEKDAY")
def day_of_week(context: Context, date: Number, kind: Whole = 1) -> float | ErrorValue:
    """The day of the week: kind 1 from Sunday as 1, 2 from Monday as 1, 3 from Monday as 0, 11-17."""
    monday_first = (numbered_day(date, date_1904=context.date_1904) - 2) % 7
    if kind == 3:
        return float(monday_first)
    first = _FIRST_DAYS.get(kind)
    return ErrorValue.NUM if first is None else float((monday_first - first) % 7 + 1)


_FIRST_DAYS = {1: 6, 2: 0, **{kind: kind - 11 for kind in range(11, 18)}}
"""The day with which the week begins, from Monday as 0, by the kind of week."""


@spreadsheet_function("WEEKNUM", strict=True)
def week_of_year(context: Context, date: Number, kind: Whole = 1) -> float | ErrorValue:
    """The week of the year; the first week holds 1 January, or for kind 21 the first Thursday."""
    if kind == 21:
        return iso_week(context, date)
    if kind not in _FIRST_DAYS:
        return ErrorValue.NUM
    year = _date(context, date)[0]
    new_year = numbered_day(
        to_serial(year, 1, 1, date_1904=context.date_1904), date_1904=context.date_1904
    )
    offset = (new_year - 2 - _FIRST_DAYS[kind]) % 7
    return float((numbered_day(date, date_1904=context.date_1904) - new_year + offset) // 7 + 1)


@spreadsheet_function("ISOWEEKNUM")
def iso_week(context: Context, date: Number) -> float:
    """The week of the year by ISO 8601: that of its Thursday."""
    day = numbered_day(date, date_1904=context.date_1904)
    thursday = day - (day - 2) % 7 + 3
    if thursday < 1:
        return 52.0  # in 1899
    new_year = to_serial(to_date(thursday)[0], 1, 1)
    return float((thursday - new_year) // 7 + 1)
