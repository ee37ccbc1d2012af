"""Paper without coupons: bought at a discount or paying interest at maturity, and Treasury bills."""

from __future__ import annotations

import math

from cellsim.functions.day_counts import add_months, to_date, to_serial, year_fraction
from cellsim.functions.registry import Context, Number, Whole, spreadsheet_function
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM


def _share(context: Context, start: float, end: float, basis: int) -> float:
    """The share of a year between two dates, of which the first must come first."""
    if not 0 <= int(start) < int(end):
        raise Fault(_NUM)
    return year_fraction(start, end, basis, date_1904=context.date_1904)


def _need_positive(*amounts: float) -> None:
    if any(amount <= 0 for amount in amounts):
        raise Fault(_NUM)


@spreadsheet_function("DISC", strict=True)
def discount_rate(
    context: Context,
    settlement: Number,
    maturity: Number,
    price: Number,
    redemption: Number,
    basis: Whole = 0,
) -> float:
    """The discount rate of a security."""
    _need_positive(price, redemption)
    return (1 - price / redemption) / _share(context, settlement, maturity, basis)


@spreadsheet_function("INTRATE", strict=True)
def interest_rate(
    context: Context,
    settlement: Number,
    maturity: Number,
    invested: Number,
    redemption: Number,
    basis: Whole = 0,
) -> float:
    """The interest rate of a fully invested security."""
    _need_positive(invested, redemption)
    return (redemption / invested - 1) / _share(context, settlement, maturity, basis)


@spreadsheet_function("RECEIVED", strict=True)
def amount_received(
    context: Context,
    settlement: Number,
    maturity: Number,
    invested: Number,
    discount: Number,
    basis: Whole = 0,
) -> float:
    """What a fully invested security pays at maturity."""
    _need_positive(invested, discount)
    kept = 1 - discount * _share(context, settlement, maturity, basis)
    _need_positive(kept)
    return invested / kept


@spreadsheet_function("PRICEDISC", strict=True)
def discounted_price(
    context: Context,
    settlement: Number,
    maturity: Number,
    discount: Number,
    redemption: Number,
    basis: Whole = 0,
) -> float:
    """The price of a discounted security."""
    _need_positive(discount, redemption)
    return redemption * (1 - discount * _share(context, settlement, maturity, basis))


@spreadsheet_function("YIELDDISC", strict=True)
def discounted_yield(
    context: Context,
    settlement: Number,
    maturity: Number,
    price: Number,
    redemption: Number,
    basis: Whole = 0,
) -> float:
    """The yearly yield of a discounted security."""
    _need_positive(price, redemption)
    return (redemption / price - 1) / _share(context, settlement, maturity, basis)


@spreadsheet_function("PRICEMAT", strict=True)
def price_with_interest_at_maturity(
    context: Context,
    settlement: Number,
    maturity: Number,
    issue: Number,
    rate: Number,
    bond_yield: Number,
    basis: Whole = 0,
) -> float:
    """The price of a security that pays interest at maturity."""
    if rate < 0 or bond_yield < 0:
        raise Fault(_NUM)
    whole, accrued, rest = _stretches(context, issue, settlement, maturity, basis)
    return 100 * ((1 + whole * rate) / (1 + rest * bond_yield) - accrued * rate)


@spreadsheet_function("YIELDMAT", strict=True)
def yield_with_interest_at_maturity(
    context: Context,
    settlement: Number,
    maturity: Number,
    issue: Number,
    rate: Number,
    price: Number,
    basis: Whole = 0,
) -> float:
    """The yearly yield of a security that pays interest at maturity."""
    _need_positive(price)
    if rate < 0:
        raise Fault(_NUM)
    whole, accrued, rest = _stretches(context, issue, settlement, maturity, basis)
    return ((1 + whole * rate) / (price / 100 + accrued * rate) - 1) / rest


def _stretches(
    context: Context, issue: float, settlement: float, maturity: float, basis: int
) -> tuple[float, float, float]:
    """Years from issue to maturity, from issue to settlement, from settlement to maturity."""
    if int(issue) > int(settlement):
        raise Fault(_NUM)
    accrued = year_fraction(issue, settlement, basis, date_1904=context.date_1904)
    rest = _share(context, settlement, maturity, basis)
    return _share(context, issue, maturity, basis), accrued, rest


@spreadsheet_function("ACCRINTM", strict=True)
def interest_at_maturity(
    context: Context,
    issue: Number,
    settlement: Number,
    rate: Number,
    par: Number = 1000.0,
    basis: Whole = 0,
) -> float:
    """The interest accrued at maturity."""
    _need_positive(rate, par)
    return par * rate * _share(context, issue, settlement, basis)


def _bill_days(context: Context, settlement: float, maturity: float) -> float:
    """The days to a bill's maturity, at most a year."""
    start, end = int(settlement), int(maturity)
    if not 0 <= start < end:
        raise Fault(_NUM)
    year_later = add_months(to_date(start, date_1904=context.date_1904), 12)
    if end > to_serial(*year_later, date_1904=context.date_1904):
        raise Fault(_NUM)
    return float(end - start)


@spreadsheet_function("TBILLPRICE", strict=True)
def bill_price(context: Context, settlement: Number, maturity: Number, discount: Number) -> float:
    """The price of a Treasury bill per 100 of face value."""
    _need_positive(discount)
    price = 100 * (1 - discount * _bill_days(context, settlement, maturity) / 360)
    _need_positive(price)
    return price


@spreadsheet_function("TBILLYIELD", strict=True)
def bill_yield(context: Context, settlement: Number, maturity: Number, price: Number) -> float:
    """The yield of a Treasury bill."""
    _need_positive(price)
    return (100 - price) / price * 360 / _bill_days(context, settlement, maturity)


@spreadsheet_function("TBILLEQ", strict=True)
def bill_equivalent_yield(
    context: Context, settlement: Number, maturity: Number, discount: Number
) -> float:
    """The yield of a Treasury bill as a bond with two coupons a year would have it."""
    _need_positive(discount)
    days = _bill_days(context, settlement, maturity)
    if days <= 182:
        kept = 360 - discount * days
        _need_positive(kept)
        return 365 * discount / kept
    price = 1 - discount * days / 360
    _need_positive(price)
    term = days / (366 if days == 366 else 365)
    root = math.sqrt(term * term - (2 * term - 1) * (1 - 1 / price))
    return 2 * (root - term) / (2 * term - 1)
