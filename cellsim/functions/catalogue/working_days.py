"""Working days between dates."""

from __future__ import annotations

from cellsim.functions.coercion import to_number
from cellsim.functions.day_counts import numbered_day
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import Context, Number, Operand, Whole, spreadsheet_function
from cellsim.functions.serial_dates import OFFSET_1904
from cellsim.functions.workdays import Weekend, count_workdays, move_workdays, weekend_of
from cellsim.values import ErrorValue, Fault


def _holidays(context: Context, holidays: Operand | None) -> frozenset[int]:
    if holidays is None:
        return frozenset()
    items = values_of(holidays, context).items
    return frozenset(
        numbered_day(to_number(item, date_1904=context.date_1904), date_1904=context.date_1904)
        for item in items
        if item is not None
    )


def _weekend(context: Context, value: Operand | None) -> Weekend:
    return weekend_of(1.0 if value is None else values_of(value, context).items[0])


def _count(
    context: Context, start: float, end: float, weekend: Weekend, holidays: Operand | None
) -> float:
    first, last = (numbered_day(day, date_1904=context.date_1904) for day in (start, end))
    return float(count_workdays(first, last, weekend, _holidays(context, holidays)))


def _move(
    context: Context, start: float, days: int, weekend: Weekend, holidays: Operand | None
) -> float:
    moved = move_workdays(
        numbered_day(start, date_1904=context.date_1904),
        days,
        weekend,
        _holidays(context, holidays),
    )
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
