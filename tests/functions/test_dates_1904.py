"""The 1904 date system: ECMA-376 1st edition Part 4, 3.17.4.1 (0 is 1 January 1904; it begins 1462 days later)."""

from __future__ import annotations

import datetime as dt
from types import SimpleNamespace
from typing import Any, cast

import pytest

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import Context, find_function
from cellsim.values import ErrorValue, Value


def call(name: str, *arguments: Any, date_1904: bool = True) -> Value:
    function = find_function(name)
    assert function is not None
    now = dt.datetime(2026, 6, 30, 18, 0, 0)  # noqa: DTZ001
    context = cast("Context", SimpleNamespace(date_1904=date_1904, now=now))
    return call_function(function, list(arguments), context)


def test_day_zero_is_the_first_of_january_1904() -> None:
    assert call("DATE", 1904.0, 1.0, 1.0) == 0
    assert [call(part, 0.0) for part in ("YEAR", "MONTH", "DAY")] == [1904, 1, 1]


def test_last_day_of_the_calendar_is_2957003() -> None:
    assert call("DATE", 9999.0, 12.0, 31.0) == 2_957_003
    assert call("YEAR", 2_957_004.0) is ErrorValue.NUM


def test_29_february_1900_is_not_in_this_system() -> None:
    assert call("DATE", 1900.0, 2.0, 29.0) is ErrorValue.NUM


@pytest.mark.parametrize("name", ["WEEKDAY", "WEEKNUM", "ISOWEEKNUM"])
@pytest.mark.parametrize("day", [dt.date(1904, 1, 1), dt.date(2026, 6, 30), dt.date(2027, 1, 3)])
def test_days_of_the_week_are_those_of_the_calendar(name: str, day: dt.date) -> None:
    serial = float(day.toordinal() - dt.date(1904, 1, 1).toordinal())
    assert call(name, serial) == call(name, serial + 1462, date_1904=False)
    if name == "ISOWEEKNUM":
        assert call(name, serial) == day.isocalendar()[1]
    if name == "WEEKDAY":
        assert call(name, serial, 2.0) == day.isoweekday()


def test_workdays_pass_over_the_same_weekends_in_both_systems() -> None:
    start = float(dt.date(2026, 6, 29).toordinal() - dt.date(1904, 1, 1).toordinal())
    assert call("WORKDAY", start, 5.0) == start + 7
    assert call("NETWORKDAYS", start, start + 6) == 5
    assert call("WORKDAY", start, 1.0, start + 1) == start + 2


def test_today_counts_from_1904() -> None:
    days = (dt.date(2026, 6, 30) - dt.date(1904, 1, 1)).days
    assert call("TODAY") == days
    assert call("NOW") == days + 0.75


def test_written_dates_count_from_1904() -> None:
    assert call("DATEVALUE", "1904-01-02") == 1
    assert call("TEXT", 0.0, "yyyy-mm-dd") == "1904-01-01"
    assert call("EDATE", 0.0, 1.0) == 31
    assert call("YEARFRAC", 0.0, 366.0, 1.0) == 1
