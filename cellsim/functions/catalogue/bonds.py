"""Bonds with regular coupons."""

from __future__ import annotations

import math

from cellsim.functions.coupons import Calendar, Coupons, coupons_of
from cellsim.functions.registry import Context, Logical, Number, Whole, spreadsheet_function
from cellsim.functions.root_finding import Evaluation, enclose, polish
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM


def _coupons(
    context: Context, settlement: float, maturity: float, frequency: int, basis: int
) -> Coupons:
    calendar = Calendar(frequency, basis, context.date_1904)
    return coupons_of(settlement, maturity, calendar)


@spreadsheet_function("COUPDAYBS", strict=True)
def days_since_coupon(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The days from the last coupon date to the settlement."""
    return _coupons(context, settlement, maturity, frequency, basis).since


@spreadsheet_function("COUPDAYS", strict=True)
def days_in_coupon_period(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The days of the coupon period of the settlement."""
    return _coupons(context, settlement, maturity, frequency, basis).length


@spreadsheet_function("COUPDAYSNC", strict=True)
def days_until_coupon(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The days from the settlement to the next coupon date."""
    return _coupons(context, settlement, maturity, frequency, basis).until


@spreadsheet_function("COUPNCD", strict=True)
def next_coupon_date(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The next coupon date after the settlement."""
    return _coupons(context, settlement, maturity, frequency, basis).following


@spreadsheet_function("COUPPCD", strict=True)
def previous_coupon_date(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The last coupon date before the settlement."""
    return _coupons(context, settlement, maturity, frequency, basis).previous


@spreadsheet_function("COUPNUM", strict=True)
def number_of_coupons(
    context: Context, settlement: Number, maturity: Number, frequency: Whole, basis: Whole = 0
) -> float:
    """The number of coupons from the settlement to maturity."""
    return float(_coupons(context, settlement, maturity, frequency, basis).count)


def _price(coupons: Coupons, coupon: float, step: float, redemption: float) -> Evaluation:
    """The clean price and its derivative in the yield per period.

    Args:
        coupons: The coupons.
        coupon: One coupon.
        step: The yield per period.
        redemption: What is paid at maturity.
    """
    wait = coupons.until / coupons.length
    accrued = coupon * coupons.since / coupons.length
    if coupons.count == 1:
        growth = 1 + step * wait
        value = (coupon + redemption) / growth
        return value - accrued, -value * wait / growth
    value = slope = 0.0
    for place in range(coupons.count):
        time = place + wait
        paid = coupon + (redemption if place == coupons.count - 1 else 0.0)
        worth = paid * math.pow(1 + step, -time)
        value += worth
        slope -= time * worth / (1 + step)
    return value - accrued, slope


@spreadsheet_function("PRICE", strict=True)
def price(
    context: Context,
    settlement: Number,
    maturity: Number,
    rate: Number,
    bond_yield: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The price of a bond per 100 of face value, without accrued interest."""
    coupons = _coupons(context, settlement, maturity, frequency, basis)
    if rate < 0 or bond_yield < 0 or redemption <= 0:
        raise Fault(_NUM)
    return _price(coupons, 100 * rate / frequency, bond_yield / frequency, redemption)[0]


@spreadsheet_function("YIELD", strict=True)
def bond_yield(
    context: Context,
    settlement: Number,
    maturity: Number,
    rate: Number,
    paid: Number,
    redemption: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The yield of a bond from its price."""
    coupons = _coupons(context, settlement, maturity, frequency, basis)
    if rate < 0 or paid <= 0 or redemption <= 0:
        raise Fault(_NUM)
    coupon = 100 * rate / frequency
    if coupons.count == 1:
        dirty = paid + coupon * coupons.since / coupons.length
        gain = (redemption + coupon - dirty) / dirty
        return gain * frequency * coupons.length / coupons.until

    def excess(step: float) -> Evaluation:
        value, slope = _price(coupons, coupon, step, redemption)
        return value - paid, slope

    ends = enclose(lambda step: excess(step)[0], rate / frequency)
    if ends is None:
        raise Fault(_NUM)
    return frequency * polish(excess, *ends)


@spreadsheet_function("DURATION", strict=True)
def duration(
    context: Context,
    settlement: Number,
    maturity: Number,
    rate: Number,
    bond_yield: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The Macaulay duration of a bond with a face value of 100, in years."""
    coupons = _coupons(context, settlement, maturity, frequency, basis)
    if rate < 0 or bond_yield < 0:
        raise Fault(_NUM)
    wait = coupons.until / coupons.length
    value = weighted = 0.0
    for place in range(coupons.count):
        paid = 100 * rate / frequency + (100 if place == coupons.count - 1 else 0)
        worth = paid * math.pow(1 + bond_yield / frequency, -(place + wait))
        value += worth
        weighted += worth * (place + wait)
    return weighted / value / frequency


@spreadsheet_function("MDURATION", strict=True)
def modified_duration(
    context: Context,
    settlement: Number,
    maturity: Number,
    rate: Number,
    bond_yield: Number,
    frequency: Whole,
    basis: Whole = 0,
) -> float:
    """The modified duration of a bond with a face value of 100, in years."""
    years = duration(context, settlement, maturity, rate, bond_yield, frequency, basis)
    return years / (1 + bond_yield / frequency)


@spreadsheet_function("ACCRINT", strict=True)
def accrued_interest(
    context: Context,
    issue: Number,
    first_coupon: Number,
    settlement: Number,
    rate: Number,
    par: Number,
    frequency: Whole,
    basis: Whole = 0,
    from_issue: Logical = True,
) -> float:
    """The interest accrued from the issue, or from the first coupon, to the settlement."""
    calendar = Calendar(frequency, basis, context.date_1904)
    issued, first, settled = (float(int(day)) for day in (issue, first_coupon, settlement))
    if rate <= 0 or par <= 0 or issued >= settled:
        raise Fault(_NUM)
    start = issued if from_issue or settled <= first else first
    return par * rate / frequency * calendar.span(first, start, settled)
