"""Dates and times."""

from __future__ import annotations

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
    AnyScalar,
    Context,
    Logical,
    Number,
    Operand,
    ScalarValue,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.functions.serial_dates import LAST_SERIAL, OFFSET_1904
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
    serial = to_serial(year, month + 1, 1, date_1904=context.date_1904) + day - 1
    last = LAST_SERIAL - (OFFSET_1904 if context.date_1904 else 0)
    return serial if 0 <= serial <= last else ErrorValue.NUM


def _date(context: Context, serial: float) -> tuple[int, int, int]:
    return to_date(serial, date_1904=context.date_1904)


def _day(context: Context, serial: float) -> int:
    """The day as the 1900 system numbers it, by which weekdays are counted.

    Raises:
        Fault: It is out of range (#NUM!).
    """
    day = math.floor(serial) + (OFFSET_1904 if context.date_1904 else 0)
    if serial < 0 or day > LAST_SERIAL:
        raise Fault(ErrorValue.NUM)
    return day


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
    monday_first = (_day(context, date) - 2) % 7
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
    new_year = _day(context, to_serial(year, 1, 1, date_1904=context.date_1904))
    offset = (new_year - 2 - _FIRST_DAYS[kind]) % 7
    return float((_day(context, date) - new_year + offset) // 7 + 1)


@spreadsheet_function("ISOWEEKNUM")
def iso_week(context: Context, date: Number) -> float:
    """The week of the year by ISO 8601: that of its Thursday."""
    day = _day(context, date)
    thursday = day - (day - 2) % 7 + 3
    if thursday < 1:
        return 52.0  # in 1899
    new_year = to_serial(to_date(thursday)[0], 1, 1)
    return float((thursday - new_year) // 7 + 1)


def _holidays(context: Context, holidays: Operand | None) -> frozenset[int]:
    if holidays is None:
        return frozenset()
    items = values_of(holidays, context).items
    return frozenset(
        _day(context, to_number(item, date_1904=context.date_1904))
        for item in items
        if item is not None
    )


def _weekend(context: Context, value: Operand | None) -> Weekend:
    return weekend_of(1.0 if value is None else values_of(value, context).items[0])


def _count(
    context: Context, start: float, end: float, weekend: Weekend, holidays: Operand | None
) -> float:
    days = _day(context, start), _day(context, end)
    return float(count_workdays(*days, weekend, _holidays(context, holidays)))


def _move(
    context: Context, start: float, days: int, weekend: Weekend, holidays: Operand | None
) -> float:
    moved = move_workdays(_day(context, start), days, weekend, _holidays(context, holidays))
    serial = moved - (OFFSET_1904 if context.date_1904 else 0)
    if serial < 0:
        raise Fault(ErrorValue.NUM)
    return float(serial)


@spreadsheet_function("NETWORKDAYS", strict=True)
def workdays_between(
    context: Context, start: Number, end: Number, holidays: Operand | None = None
) -> float:
    """The workdays from one date to another, both included."""
    return _count(context, start, end, weekend_of(1.0), holidays)


@spreadsheet_function("NETWORKDAYS.INTL")
def workdays_between_by_weekend(
    context: Context,
    start: Number,
    end: Number,
    weekend: Operand | None = None,
    holidays: Operand | None = None,
) -> float:
    """The workdays between two dates with a weekend of one's own."""
    return _count(context, start, end, _weekend(context, weekend), holidays)


@spreadsheet_function("WORKDAY", strict=True)
def workdays_later(
    context: Context, start: Number, days: Whole, holidays: Operand | None = None
) -> float:
    """The date some workdays later."""
    return _move(context, start, days, weekend_of(1.0), holidays)


@spreadsheet_function("WORKDAY.INTL")
def workdays_later_by_weekend(
    context: Context,
    start: Number,
    days: Whole,
    weekend: Operand | None = None,
    holidays: Operand | None = None,
) -> float:
    """The date some workdays later with a weekend of one's own."""
    return _move(context, start, days, _weekend(context, weekend), holidays)


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
