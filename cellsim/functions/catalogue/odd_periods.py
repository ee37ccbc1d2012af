"""Bonds whose first or last coupon period is longer or shorter than the others (ECMA-376, ODDFPRICE)."""

from __future__ import annotations

import math
from dataclasses import dataclass

from cellsim.functions.coupons import Calendar
from cellsim.functions.registry import Context, Number, Whole, spreadsheet_function
from cellsim.functions.root_finding import Evaluation, enclose, polish
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM


@dataclass(frozen=True, slots=True)
class _OddFirst:
    """A bond with an odd first period, in periods of regular length.

    Attributes:
        first: The length of the first period.
        accrued: How much of it has passed at the settlement.
        wait: From the settlement to the first coupon.
        others: Coupons after the first.
    """

    first: float
    accrued: float
    wait: float
    others: int

    def price(self, coupon: float, step: float, redemption: float) -> Evaluation:
        """The clean price and its derivative in the yield per period."""
        value = slope = 0.0
        for place in range(self.others + 1):
            paid = coupon if place else coupon * self.first
            if place == self.others:
                paid += redemption
            time = self.wait + place
            worth = paid * math.pow(1 + step, -time)
            value += worth
            slope -= time * worth / (1 + step)
        return value - coupon * self.accrued, slope


def _odd_first(
    settlement: float, maturity: float, issue: float, first_coupon: float, calendar: Calendar
) -> _OddFirst:
    settled, matures, issued, first = (
        float(int(day)) for day in (settlement, maturity, issue, first_coupon)
    )
    if not 0 <= issued < settled < first < matures:
        raise Fault(_NUM)
    others = calendar.periods_before(matures, first)
    if calendar.coupon(matures, -others) != first:
        raise Fault(_NUM)
    following = calendar.coupon(first, 1 - calendar.periods_before(first, settled))
    between = calendar.periods_before(first, following)
    return _OddFirst(
        first=calendar.span(first, issued, first),
        accrued=calendar.span(first, issued, settled),
        wait=between + calendar.span(first, settled, following),
        others=others,
    )


@spreadsheet_function("ODDFPRICE", strict=True)
def price_with_odd_first_period(
    context: Context,
    settlement: Number,
    maturity: Number,
    issue: Number,
    first_coupon: Number,
    rate: Number,
    bond_yield: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The price of a bond with an odd first period."""
    calendar = Calendar(frequency, basis, context.date_1904)
    bond = _odd_first(settlement, maturity, issue, first_coupon, calendar)
    if rate < 0 or bond_yield < 0 or redemption <= 0:
        raise Fault(_NUM)
    return bond.price(100 * rate / frequency, bond_yield / frequency, redemption)[0]


@spreadsheet_function("ODDFYIELD", strict=True)
def yield_with_odd_first_period(
    context: Context,
    settlement: Number,
    maturity: Number,
    issue: Number,
    first_coupon: Number,
    rate: Number,
    price: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The yield of a bond with an odd first period."""
    calendar = Calendar(frequency, basis, context.date_1904)
    bond = _odd_first(settlement, maturity, issue, first_coupon, calendar)
    if rate < 0 or price <= 0 or redemption <= 0:
        raise Fault(_NUM)
    coupon = 100 * rate / frequency

    def excess(step: float) -> Evaluation:
        value, slope = bond.price(coupon, step, redemption)
        return value - price, slope

    ends = enclose(lambda step: excess(step)[0], rate / frequency)
    if ends is None:
        raise Fault(_NUM)
    return frequency * polish(excess, *ends)


def _odd_last(
    settlement: float, maturity: float, last_coupon: float, calendar: Calendar
) -> tuple[float, float, float]:
    """The last period, what of it has passed at the settlement and what is left, in regular periods."""
    settled, matures, last = (float(int(day)) for day in (settlement, maturity, last_coupon))
    if not 0 <= last < settled < matures:
        raise Fault(_NUM)
    whole = calendar.span(last, last, matures)
    return whole, calendar.span(last, last, settled), calendar.span(last, settled, matures)


@spreadsheet_function("ODDLPRICE", strict=True)
def price_with_odd_last_period(
    context: Context,
    settlement: Number,
    maturity: Number,
    last_coupon: Number,
    rate: Number,
    bond_yield: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The price of a bond with an odd last period."""
    calendar = Calendar(frequency, basis, context.date_1904)
    whole, accrued, left = _odd_last(settlement, maturity, last_coupon, calendar)
    if rate < 0 or bond_yield < 0 or redemption <= 0:
        raise Fault(_NUM)
    coupon = 100 * rate / frequency
    paid = redemption + coupon * whole
    return paid / (1 + left * bond_yield / frequency) - coupon * accrued


@spreadsheet_function("ODDLYIELD", strict=True)
def yield_with_odd_last_period(
    context: Context,
    settlement: Number,
    maturity: Number,
    last_coupon: Number,
    rate: Number,
    price: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The yield of a bond with an odd last period."""
    calendar = Calendar(frequency, basis, context.date_1904)
    whole, accrued, left = _odd_last(settlement, maturity, last_coupon, calendar)
    if rate < 0 or price <= 0 or redemption <= 0:
        raise Fault(_NUM)
    coupon = 100 * rate / frequency
    dirty = price + coupon * accrued
    return (redemption + coupon * whole - dirty) / dirty * frequency / left
