"""Loans and annuities with level payments."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from cellsim.functions.encoded import FloatArray, Numbers, checked, numeric_function
from cellsim.functions.registry import Number, Whole
from cellsim.functions.time_value import (
    Loan,
    annuity_future_value,
    annuity_present_value,
    annuity_rates,
    growth_less_one,
    level_payment,
    periods_needed,
)
from cellsim.values import ErrorValue

BoolArray = npt.NDArray[np.bool_]
_LONG_SPAN = 1_000
"""Payments of a shorter span are summed one by one."""


def _due(kind: float) -> FloatArray:
    return np.where(np.asarray(kind) != 0, 1.0, 0.0)


@numeric_function("PMT")
def payment(
    rate: Number, periods: Number, present: Number, future: Number = 0.0, kind: Number = 0.0
) -> FloatArray:
    """The level payment of a loan or annuity; kind 1 pays at the beginning of each period."""
    return level_payment(rate, periods, present, future, _due(kind))


@numeric_function("PV")
def present_value(
    rate: Number, periods: Number, paid: Number = 0.0, future: Number = 0.0, kind: Number = 0.0
) -> FloatArray:
    """The value today of level payments and a final amount."""
    return annuity_present_value(rate, periods, paid, future, _due(kind))


@numeric_function("FV")
def future_value(
    rate: Number, periods: Number, paid: Number = 0.0, present: Number = 0.0, kind: Number = 0.0
) -> FloatArray:
    """The value at the end of level payments and a first amount."""
    return annuity_future_value(rate, periods, paid, present, _due(kind))


@numeric_function("NPER")
def number_of_periods(
    rate: Number, paid: Number, present: Number, future: Number = 0.0, kind: Number = 0.0
) -> FloatArray:
    """The number of periods of a loan or annuity."""
    return periods_needed(rate, paid, present, future, _due(kind))


@numeric_function("RATE")
def periodic_rate(
    periods: Number,
    paid: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
    guess: Number = 0.1,
) -> FloatArray:
    """The rate per period of a loan or annuity; of several, the one nearest the guess."""
    return annuity_rates(periods, paid, present, future, _due(kind), guess)


@numeric_function("IPMT")
def interest_part(
    rate: Number,
    period: Number,
    periods: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
) -> FloatArray:
    """The interest part of a payment."""
    return Loan(rate, periods, present, future, _due(kind)).interest(period)


@numeric_function("PPMT")
def principal_part(
    rate: Number,
    period: Number,
    periods: Number,
    present: Number,
    future: Number = 0.0,
    kind: Number = 0.0,
) -> FloatArray:
    """The principal part of a payment."""
    return Loan(rate, periods, present, future, _due(kind)).principal(period)


@numeric_function("ISPMT")
def interest_with_level_principal(
    rate: Number, period: Number, periods: Number, present: Number
) -> FloatArray:
    """The interest of a loan whose principal is paid back evenly."""
    interest = -present * rate * (1 - period / np.asarray(periods))
    return checked(interest, (np.asarray(periods) == 0, ErrorValue.DIV0))


@numeric_function("CUMIPMT", strict=True)
def cumulated_interest(
    rate: Number, periods: Number, present: Number, first: Whole, last: Whole, kind: Number
) -> FloatArray:
    """The interest paid from one period to another."""
    refused = _is_refused(rate, periods, present, np.trunc(first), np.trunc(last), kind)
    loan = Loan(rate, periods, present, 0.0, _due(kind))
    long = np.trunc(last) - np.trunc(first) >= _LONG_SPAN
    total = _sum(loan.interest, first, last, refused)
    if np.any(long):
        total = np.where(long, _sums_of_long_span(loan, first, last)[0], total)
    return checked(total, (refused, ErrorValue.NUM))


@numeric_function("CUMPRINC", strict=True)
def cumulated_principal(
    rate: Number, periods: Number, present: Number, first: Whole, last: Whole, kind: Number
) -> FloatArray:
    """The principal paid from one period to another."""
    refused = _is_refused(rate, periods, present, np.trunc(first), np.trunc(last), kind)
    loan = Loan(rate, periods, present, 0.0, _due(kind))
    long = np.trunc(last) - np.trunc(first) >= _LONG_SPAN
    total = _sum(loan.principal, first, last, refused)
    if np.any(long):
        total = np.where(long, _sums_of_long_span(loan, first, last)[1], total)
    return checked(total, (refused, ErrorValue.NUM))


def _is_refused(*terms: float) -> BoolArray:
    """Whether a span of a loan's periods makes no sense."""
    rate, periods, present, first, last, kind = np.broadcast_arrays(*terms)
    no_loan = (rate <= 0) | (periods <= 0) | (present <= 0) | ((kind != 0) & (kind != 1))
    refused: BoolArray = no_loan | (first < 1) | (last < first) | (last > periods)
    return refused


def _sum(
    part: Callable[[Numbers], FloatArray], first: float, last: float, refused: BoolArray
) -> FloatArray:
    """A part of the payments of a short span, both ends included, summed where it is not refused."""
    begin, end, _ = np.broadcast_arrays(np.trunc(first), np.trunc(last), refused)
    total = np.zeros(refused.shape)
    summed = ~refused & (end - begin < _LONG_SPAN)
    if summed.any():
        for step in range(int((end - begin)[summed].max()) + 1):
            period = begin + step
            total = total + np.where(summed & (period <= end), part(period), 0.0)
    return total


def _sums_of_long_span(loan: Loan, first: float, last: float) -> tuple[FloatArray, FloatArray]:
    """Interest and principal of a long span in one step, as no loop would end in time.

    The payments' principal grows by the rate from payment to payment: a geometric series.
    """
    begin, end = np.trunc(first), np.trunc(last)
    rate = np.asarray(loan.rate)
    paid = level_payment(rate, loan.periods, loan.present, loan.future, loan.due)
    before = growth_less_one(rate, begin - 1 - loan.periods)
    principal = paid * (growth_less_one(rate, end - loan.periods) - before) / rate
    at_once = (np.asarray(loan.due) != 0) & (begin == 1)  # the first payment then bears no interest
    principal = principal + np.where(at_once, -paid * before, 0.0)
    return paid * (end - begin + 1) - principal, principal
