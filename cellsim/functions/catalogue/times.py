"""Times of day, the present moment, and dates and times written as text."""

from __future__ import annotations

import math

from cellsim.functions.day_counts import to_serial
from cellsim.functions.number_text import date_time_from_text
from cellsim.functions.registry import Context, Number, ScalarValue, Whole, spreadsheet_function
from cellsim.values import ErrorValue, Fault, Scalar

_SECONDS = 86_400


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
