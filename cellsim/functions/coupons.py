"""Coupon periods of bonds.

Coupon dates are counted in months from an anchor, the maturity or the first coupon; where the anchor is
the last day of its month, all of them are (common practice of spreadsheet programs; the day counts within
a period follow ECMA-376 Part 1, COUPDAYS and its like).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from cellsim.functions.day_counts import (
    Date,
    add_months,
    days_360,
    days_in_month,
    to_date,
    to_serial,
)
from cellsim.values import ErrorValue, Fault


@dataclass(frozen=True, slots=True)
class Calendar:
    """How a bond counts its days and periods.

    Attributes:
        frequency: Coupons a year: 1, 2 or 4.
        basis: 0 US 30/360, 1 actual/actual, 2 actual/360, 3 actual/365, 4 European 30/360.
        date_1904: The date system.
    """

    frequency: int
    basis: int
    date_1904: bool = False

    def __post_init__(self) -> None:
        if self.frequency not in (1, 2, 4) or not 0 <= self.basis <= 4:
            raise Fault(ErrorValue.NUM)

    @property
    def months(self) -> int:
        """Months in a period."""
        return 12 // self.frequency

    def date(self, serial: float) -> Date:
        """The calendar date of a serial number."""
        return to_date(serial, date_1904=self.date_1904)

    def days(self, start: float, end: float) -> float:
        """Days from one date to another by the basis."""
        if self.basis in (1, 2, 3):
            return end - start
        return float(days_360(self.date(start), self.date(end), european=self.basis == 4))

    def coupon(self, anchor: float, periods: int) -> float:
        """The coupon date so many periods after an anchor, or before it."""
        date = self.date(anchor)
        year, month, day = add_months(date, periods * self.months)
        if date[2] == days_in_month(date[0], date[1]):
            day = days_in_month(year, month)
        return to_serial(year, month, day, date_1904=self.date_1904)

    def periods_before(self, anchor: float, day: float) -> int:
        """How many periods before an anchor the last coupon date on or before a day is."""
        (y1, m1, _), (y2, m2, _) = self.date(day), self.date(anchor)
        count = ((y2 - y1) * 12 + m2 - m1) // self.months
        while self.coupon(anchor, -count) > day:
            count += 1
        while self.coupon(anchor, 1 - count) <= day:
            count -= 1
        return count

    def length(self, start: float, end: float) -> float:
        """The length in days of the period between two coupon dates."""
        if self.basis == 1:
            return end - start
        return (365 if self.basis == 3 else 360) / self.frequency

    def span(self, anchor: float, start: float, end: float) -> float:
        """The stretch from one day to another in periods, counted period by period."""
        return sum(days / length for days, length in self._pieces(anchor, start, end))

    def _pieces(self, anchor: float, start: float, end: float) -> Iterator[tuple[float, float]]:
        """Days of a stretch within each period, and the period's length."""
        place = -self.periods_before(anchor, start)
        begin = self.coupon(anchor, place)
        while begin < end:
            place += 1
            finish = self.coupon(anchor, place)
            length = self.length(begin, finish)
            if self.basis in (0, 4) and start <= begin and finish <= end:
                yield length, length  # whatever the days of February
            else:
                yield self.days(max(begin, start), min(finish, end)), length
            begin = finish


@dataclass(frozen=True, slots=True)
class Coupons:
    """The coupons of a bond from its settlement on.

    Attributes:
        previous: The last coupon date on or before the settlement.
        following: The first after it.
        count: Coupons from the settlement to maturity.
        since: Days from the previous coupon date to the settlement.
        until: Days from the settlement to the following coupon date.
        length: Days in the period.
    """

    previous: float
    following: float
    count: int
    since: float
    until: float
    length: float


def coupons_of(settlement: float, maturity: float, calendar: Calendar) -> Coupons:
    """The coupons from a settlement to a maturity.

    Raises:
        Fault: The settlement is not before the maturity, or a date is out of range (#NUM!).
    """
    settlement, maturity = float(int(settlement)), float(int(maturity))
    if settlement >= maturity or settlement < 0:
        raise Fault(ErrorValue.NUM)
    count = calendar.periods_before(maturity, settlement)
    previous, following = calendar.coupon(maturity, -count), calendar.coupon(maturity, 1 - count)
    length = calendar.length(previous, following)
    since = calendar.days(previous, settlement)
    whole_months = calendar.basis in (0, 4)
    until = length - since if whole_months else calendar.days(settlement, following)
    return Coupons(previous, following, count, since, until, length)
