"""Dates and times."""

from __future__ import annotations

import datetime as dt
import math

from cellsim.functions.coercion import to_number
from cellsim.functions.day_counts import (
    add_months,
    days_360,
    days_in_month,
    to_date,
    to_serial,
    year_fraction,
)
from cellsim.functions.dispatch import values_of
from cellsim.functions.number_text import date_time_from_text
from cellsim.functions.registry import (
    Context,
    Logical,
    Number,
    Operand,
    ScalarValue,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.functions.serial_dates import LAST_SERIAL
from cellsim.functions.workdays import Weekend, count_workdays, move_workdays, weekend_of
from cellsim.values import ErrorValue, Fault, Scalar

_SECONDS = 86_400


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
    first = to_serial(year, month + 1, 1, date_1904=context.date_1904)
    serial = first + day - 1
    return serial if 0 <= serial <= LAST_SERIAL else ErrorValue.NUM


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


@spreadsheet_function("EDATE")
def months_later(context: Context, date: Number, months: Whole) -> float:
    """The same day some months later."""
    moved = add_months(_date(context, date), months)
    return to_serial(*moved, date_1904=context.date_1904)


@spreadsheet_function("EOMONTH")
def end_of_month(context: Context, date: Number, months: Whole) -> float:
    """The last day of the month some months later."""
    year, month, _ = add_months(_date(context, date), months)
    return to_serial(year, month, days_in_month(year, month), date_1904=context.date_1904)


@spreadsheet_function("YEARFRAC")
def share_of_year(context: Context, start: Number, end: Number, basis: Whole = 0) -> float:
    """The share of a year between two dates."""
    if start < 0 or end < 0:
        raise Fault(ErrorValue.NUM)
    return year_fraction(start, end, basis, date_1904=context.date_1904)


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
    if key == "YD":
        anniversary = y2 if (m1, d1) <= (m2, d2) else y2 - 1
        day = min(d1, days_in_month(anniversary, m1))
        return int(end) - to_serial(anniversary, m1, day, date_1904=context.date_1904)
    results = {"Y": months // 12, "M": months, "YM": months % 12}
    return float(results[key]) if key in results else ErrorValue.NUM


@spreadsheet_function("WEEKDAY")
def day_of_week(date: Number, kind: Whole = 1) -> float | ErrorValue:
    """The day of the week: kind 1 from Sunday as 1, 2 from Monday as 1, 3 from Monday as 0, 11-17."""
    if date < 0 or date > LAST_SERIAL:
        return ErrorValue.NUM
    sunday_first = (int(date) - 1) % 7  # Sunday is 0
    if kind in {1, 17}:
        return float(sunday_first + 1)
    monday_first = (sunday_first - 1) % 7
    if kind == 2:
        return float(monday_first + 1)
    if kind == 3:
        return float(monday_first)
    if 11 <= kind <= 16:
        return float((monday_first - (kind - 11)) % 7 + 1)
    return ErrorValue.NUM


@spreadsheet_function("WEEKNUM")
def week_of_year(context: Context, date: Number, kind: Whole = 1) -> float | ErrorValue:
    """The week of the year; the first week holds 1 January, or for kind 21 the first Thursday."""
    if kind == 21:
        return iso_week(context, date)
    starts = {1: 0, 17: 0, 2: 1, 11: 1, 12: 2, 13: 3, 14: 4, 15: 5, 16: 6}
    if kind not in starts:
        return ErrorValue.NUM
    year = _date(context, date)[0]
    first = to_serial(year, 1, 1, date_1904=context.date_1904)
    offset = (int(first) - 1 - starts[kind]) % 7
    return float((int(date) - int(first) + offset) // 7 + 1)


@spreadsheet_function("ISOWEEKNUM")
def iso_week(context: Context, date: Number) -> float:
    """The week of the year by ISO 8601."""
    year, month, day = _date(context, date)
    return float(dt.date(year, month, max(day, 1)).isocalendar()[1])


def _holidays(context: Context, holidays: Operand | None) -> frozenset[int]:
    if holidays is None:
        return frozenset()
    days = set()
    for item in values_of(holidays, context).items:
        if item is not None:
            days.add(int(to_number(item)))
    return frozenset(days)


def _weekend(context: Context, value: Operand | None) -> Weekend:
    if value is None:
        return weekend_of(1.0)
    return weekend_of(values_of(value, context).items[0])


@spreadsheet_function("NETWORKDAYS")
def workdays_between(
    context: Context, start: Number, end: Number, holidays: Operand | None = None
) -> float:
    """The workdays from one date to another, both included."""
    return float(
        count_workdays(int(start), int(end), weekend_of(1.0), _holidays(context, holidays))
    )


@spreadsheet_function("NETWORKDAYS.INTL")
def workdays_between_by_weekend(
    context: Context,
    start: Number,
    end: Number,
    weekend: Operand | None = None,
    holidays: Operand | None = None,
) -> float:
    """The workdays between two dates with a weekend of one's own."""
    chosen = _weekend(context, weekend)
    return float(count_workdays(int(start), int(end), chosen, _holidays(context, holidays)))


@spreadsheet_function("WORKDAY")
def workdays_later(
    context: Context, start: Number, days: Whole, holidays: Operand | None = None
) -> float:
    """The date some workdays later."""
    return float(move_workdays(int(start), days, weekend_of(1.0), _holidays(context, holidays)))


@spreadsheet_function("WORKDAY.INTL")
def workdays_later_by_weekend(
    context: Context,
    start: Number,
    days: Whole,
    weekend: Operand | None = None,
    holidays: Operand | None = None,
) -> float:
    """The date some workdays later with a weekend of one's own."""
    chosen = _weekend(context, weekend)
    return float(move_workdays(int(start), days, chosen, _holidays(context, holidays)))


def _serial_now(context: Context) -> float:
    moment = context.now
    day = to_serial(moment.year, moment.month, moment.day, date_1904=context.date_1904)
    return day + (moment.hour * 3600 + moment.minute * 60 + moment.second) / _SECONDS


@spreadsheet_function("TODAY", volatile=True)
def today(context: Context) -> float:
    """The date on which the model is evaluated."""
    return float(math.floor(_serial_now(context)))


@spreadsheet_function("NOW", volatile=True)
def now(context: Context) -> float:
    """The moment at which the model is evaluated."""
    return _serial_now(context)


@spreadsheet_function("TIME")
def time_from_parts(hour: Whole, minute: Whole, second: Whole) -> float | ErrorValue:
    """A time of day as a share of a day."""
    total = hour * 3600 + minute * 60 + second
    if total < 0 or max(hour, minute, second) > 32_767:
        return ErrorValue.NUM
    return total % _SECONDS / _SECONDS


def _second_of_day(time: float) -> int:
    if time < 0:
        raise Fault(ErrorValue.NUM)
    return math.floor((time - math.floor(time)) * _SECONDS + 0.5) % _SECONDS


@spreadsheet_function("HOUR")
def hour_of(time: Number) -> float:
    """The hour of a time."""
    return float(_second_of_day(time) // 3600)


@spreadsheet_function("MINUTE")
def minute_of(time: Number) -> float:
    """The minute of a time."""
    return float(_second_of_day(time) // 60 % 60)


@spreadsheet_function("SECOND")
def second_of(time: Number) -> float:
    """The second of a time."""
    return float(_second_of_day(time) % 60)


def _from_text(context: Context, text: ScalarValue) -> float:
    value: Scalar = text
    if not isinstance(value, str):
        raise Fault(ErrorValue.VALUE)
    serial = date_time_from_text(value, date_1904=context.date_1904)
    if serial is None:
        raise Fault(ErrorValue.VALUE)
    return serial


@spreadsheet_function("DATEVALUE")
def date_from_written(context: Context, text: ScalarValue) -> float:
    """The serial number of a date written as text."""
    return float(math.floor(_from_text(context, text)))


@spreadsheet_function("TIMEVALUE")
def time_from_written(context: Context, text: ScalarValue) -> float:
    """The share of a day of a time written as text."""
    serial = _from_text(context, text)
    return serial - math.floor(serial)
