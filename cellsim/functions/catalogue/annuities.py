"""Level payments: annuities, loans, interest conversion.

All follow the one equation of the time value of money, pv (1+r)^n + pmt (1 + r type) ((1+r)^n - 1) / r
+ fv = 0 (ECMA-376 Part 1, PV), with the limit pv + pmt n + fv = 0 at r = 0. Kernels are written so that
they take single numbers and arrays of draws alike.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from cellsim.functions.registry import FloatArray, Number, Whole, over_draws, spreadsheet_function
from cellsim.functions.root_finding import enclose, polish
from cellsim.values import ErrorValue, Fault, encode_error


def _growth(rate: float, periods: float) -> float:
    if rate <= -1 and periods != int(periods):
        raise Fault(ErrorValue.NUM)
    if rate == -1 and periods < 0:
        raise Fault(ErrorValue.DIV0)
    try:
        return math.pow(1 + rate, periods)
    except (OverflowError, ValueError):
        raise Fault(ErrorValue.NUM) from None


def _due(kind: float) -> float:
    return 1.0 if kind else 0.0


@spreadsheet_function("PMT")
def payment(
    rate: Number, periods: Number, present: Number, future: Number = 0.0, kind: Number = 0.0
) -> float | ErrorValue:
    """The level payment of a loan or annuity; kind 1 pays at the beginning of each period."""
    if periods == 0:
        return ErrorValue.NUM
    if rate == 0:
        return -(present + future) / periods
    growth = _growth(rate, periods)
    if growth == 1:
        return ErrorValue.NUM
    return -(present * growth + future) * rate / ((1 + rate * _due(kind)) * (growth - 1))


@spreadsheet_function("PV")
def present_value(
    rate: Number, periods: Number, paid: Number = 0.0, future: Number = 0.0, kind: Number = 0.0
) -> float:
    """The value today of level payments and a final amount."""
    if rate == 0:
        return -(future + paid * periods)
    growth = _growth(rate, periods)
    if growth == 0:
        raise Fault(ErrorValue.DIV0)
    return -(future + paid * (1 + rate * _due(kind)) * (growth - 1) / rate) / growth


@spreadsheet_function("FV")
def future_value(
    rate: Number, periods: Number, paid: Number = 0.0, present: Number = 0.0, kind: Number = 0.0
) -> float:
    """The value at the end of level payments and a first amount."""
    if rate == 0:
        return -(present + paid * periods)
    growth = _growth(rate, periods)
    return -(present * growth + paid * (1 + rate * _due(kind)) * (growth - 1) / rate)


@spreadsheet_function("NPER")
def number_of_periods(
    rate: Number, paid: Number, present: Number, future: Number = 0.0, kind: Number = 0.0
) -> float | ErrorValue:
    """The number of periods of a loan or annuity."""
    if rate == 0:
        return -(present + future) / paid if paid else ErrorValue.NUM
    if rate <= -1:
        return ErrorValue.NUM
    level = paid * (1 + rate * _due(kind)) / rate
    if level + present == 0:
        return ErrorValue.NUM
    ratio = (level - future) / (level + present)
    return math.log(ratio) / math.log1p(rate) if ratio > 0 else ErrorValue.NUM


@spreadsheet_function("RATE")
def periodic_rate(
    periods: Number,
    paid: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
    guess: Number = 0.1,
) -> float | ErrorValue:
    """The rate per period of a loan or annuity."""
    if periods <= 0 or guess <= -1:
        return ErrorValue.NUM
    due = _due(kind)

    def value(rate: float) -> float:
        if abs(rate) < 1e-10:
            return present + paid * periods + future
        try:
            growth = math.pow(1 + rate, periods)
        except OverflowError:
            return math.nan
        return present * growth + paid * (1 + rate * due) * (growth - 1) / rate + future

    def scaled(rate: float) -> float:
        """The same root with discounted amounts, which stay bounded at high rates."""
        if abs(rate) < 1e-10:
            return value(rate)
        discount = math.pow(1 + rate, -periods)
        return present + paid * (1 + rate * due) * (1 - discount) / rate + future * discount

    def with_slope(rate: float) -> tuple[float, float]:
        h = 1e-6 * max(abs(rate), 1e-3)
        return scaled(rate), (scaled(rate + h) - scaled(rate - h)) / (2 * h)

    found = enclose(lambda rate: _quiet(scaled, rate), guess)
    return ErrorValue.NUM if found is None else polish(with_slope, *found)


def _quiet(function: Any, rate: float) -> float:
    try:
        return float(function(rate))
    except (OverflowError, ZeroDivisionError):
        return math.nan


def _interest(
    rate: float, period: float, periods: float, present: float, future: float, kind: float
) -> float:
    paid = payment(rate, periods, present, future, kind)
    if isinstance(paid, ErrorValue):
        raise Fault(paid)
    if kind and period == 1:
        return 0.0
    owed = future_value(rate, period - 1, paid, present, kind)
    return owed * rate / (1 + rate if kind else 1.0)


@spreadsheet_function("IPMT")
def interest_paid(
    rate: Number,
    period: Number,
    periods: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
) -> float | ErrorValue:
    """The interest part of a payment."""
    if period < 1 or period >= periods + 1:
        return ErrorValue.NUM
    return _interest(rate, period, periods, present, future, kind)


@spreadsheet_function("PPMT")
def principal_paid(
    rate: Number,
    period: Number,
    periods: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
) -> float | ErrorValue:
    """The principal part of a payment."""
    if period < 1 or period >= periods + 1:
        return ErrorValue.NUM
    paid = payment(rate, periods, present, future, kind)
    if isinstance(paid, ErrorValue):
        return paid
    return paid - _interest(rate, period, periods, present, future, kind)


@spreadsheet_function("ISPMT")
def interest_with_level_principal(
    rate: Number, period: Number, periods: Number, present: Number
) -> float | ErrorValue:
    """The interest of a loan whose principal is paid back evenly."""
    return -present * rate * (1 - period / periods) if periods else ErrorValue.DIV0


def _cumulated(
    rate: float, periods: int, present: float, first: int, last: int, kind: float, *, interest: bool
) -> float:
    if (
        rate <= 0
        or periods <= 0
        or present <= 0
        or first < 1
        or last < first
        or last > periods
        or kind not in (0, 1)
    ):
        raise Fault(ErrorValue.NUM)
    total = 0.0
    for period in range(first, last + 1):
        part = _interest(rate, period, periods, present, 0.0, kind)
        paid = payment(rate, periods, present, 0.0, kind)
        if isinstance(paid, ErrorValue):
            raise Fault(paid)
        total += part if interest else paid - part
    return total


@spreadsheet_function("CUMIPMT")
def cumulated_interest(
    rate: Number, periods: Whole, present: Number, first: Whole, last: Whole, kind: Number
) -> float:
    """The interest paid from one period to another."""
    return _cumulated(rate, periods, present, first, last, kind, interest=True)


@spreadsheet_function("CUMPRINC")
def cumulated_principal(
    rate: Number, periods: Whole, present: Number, first: Whole, last: Whole, kind: Number
) -> float:
    """The principal paid from one period to another."""
    return _cumulated(rate, periods, present, first, last, kind, interest=False)


@spreadsheet_function("EFFECT")
def effective_rate(nominal: Number, periods: Whole) -> float | ErrorValue:
    """The yearly rate with compounding of a nominal one."""
    return (
        (1 + nominal / periods) ** periods - 1 if nominal > 0 and periods >= 1 else ErrorValue.NUM
    )


@spreadsheet_function("NOMINAL")
def nominal_rate(effective: Number, periods: Whole) -> float | ErrorValue:
    """The nominal rate of a yearly one with compounding."""
    return (
        ((1 + effective) ** (1 / periods) - 1) * periods
        if effective > 0 and periods >= 1
        else ErrorValue.NUM
    )


@spreadsheet_function("PDURATION")
def periods_to_reach(rate: Number, present: Number, future: Number) -> float | ErrorValue:
    """The periods that an investment takes to reach a value."""
    if rate <= 0 or present <= 0 or future <= 0:
        return ErrorValue.NUM
    return (math.log(future) - math.log(present)) / math.log1p(rate)


@spreadsheet_function("RRI")
def equivalent_rate(periods: Number, present: Number, future: Number) -> float | ErrorValue:
    """The rate at which an amount grows to another."""
    if periods <= 0 or present == 0 or future / present < 0:
        return ErrorValue.NUM
    return math.pow(future / present, 1 / periods) - 1


@spreadsheet_function("DOLLARDE")
def decimal_price(price: Number, fraction: Whole) -> float | ErrorValue:
    """A price in fractions as a decimal one."""
    if fraction < 0:
        return ErrorValue.NUM
    if fraction == 0:
        return ErrorValue.DIV0
    whole = math.trunc(price)
    return (
        whole
        + (price - whole)
        * 10.0 ** math.ceil(math.log10(fraction) if fraction > 1 else 0)
        / fraction
    )


@spreadsheet_function("DOLLARFR")
def fractional_price(price: Number, fraction: Whole) -> float | ErrorValue:
    """A decimal price in fractions."""
    if fraction < 0:
        return ErrorValue.NUM
    if fraction == 0:
        return ErrorValue.DIV0
    whole = math.trunc(price)
    return whole + (price - whole) * fraction / 10.0 ** math.ceil(
        math.log10(fraction) if fraction > 1 else 0
    )


# Over draws.


def _growth_over_draws(rate: FloatArray, periods: FloatArray) -> FloatArray:
    growth = np.power(1 + rate, periods)
    growth = np.where(
        (rate <= -1) & (periods != np.trunc(periods)), encode_error(ErrorValue.NUM), growth
    )
    growth = np.where((rate == -1) & (periods < 0), encode_error(ErrorValue.DIV0), growth)
    return np.where(np.isinf(growth), encode_error(ErrorValue.NUM), growth)


def _arrays(*values: FloatArray | float) -> list[FloatArray]:
    return [np.asarray(value, dtype=np.float64) for value in np.broadcast_arrays(*values)]


@over_draws("PMT")
def payment_over_draws(
    rate: FloatArray,
    periods: FloatArray,
    present: FloatArray,
    future: FloatArray | float = 0.0,
    kind: FloatArray | float = 0.0,
) -> FloatArray:
    """PMT over draws."""
    r, n, p, f, k = _arrays(rate, periods, present, future, kind)
    growth = _growth_over_draws(r, n)
    paid = -(p * growth + f) * r / ((1 + r * (k != 0)) * (growth - 1))
    paid = np.where((growth == 1) & (r != 0), encode_error(ErrorValue.NUM), paid)
    paid = np.where(r == 0, -(p + f) / n, np.where(np.isnan(growth), growth, paid))
    return np.where(n == 0, encode_error(ErrorValue.NUM), paid)


@over_draws("PV")
def present_value_over_draws(
    rate: FloatArray,
    periods: FloatArray,
    paid: FloatArray | float = 0.0,
    future: FloatArray | float = 0.0,
    kind: FloatArray | float = 0.0,
) -> FloatArray:
    """PV over draws."""
    r, n, p, f, k = _arrays(rate, periods, paid, future, kind)
    growth = _growth_over_draws(r, n)
    value = -(f + p * (1 + r * (k != 0)) * (growth - 1) / r) / growth
    value = np.where(growth == 0, encode_error(ErrorValue.DIV0), value)
    return np.where(r == 0, -(f + p * n), np.where(np.isnan(growth), growth, value))


@over_draws("FV")
def future_value_over_draws(
    rate: FloatArray,
    periods: FloatArray,
    paid: FloatArray | float = 0.0,
    present: FloatArray | float = 0.0,
    kind: FloatArray | float = 0.0,
) -> FloatArray:
    """FV over draws."""
    r, n, p, v, k = _arrays(rate, periods, paid, present, kind)
    growth = _growth_over_draws(r, n)
    value = -(v * growth + p * (1 + r * (k != 0)) * (growth - 1) / r)
    return np.where(r == 0, -(v + p * n), np.where(np.isnan(growth), growth, value))
