"""Values and rates of return of cash flows."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.coercion import first_error, numbers_in, to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.rates_of_return import internal_rate_of
from cellsim.functions.rates_of_return_over_draws import internal_rates
from cellsim.functions.registry import (
    Context,
    FloatArray,
    Number,
    NumberItems,
    Operand,
    Stack,
    Values,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Reference, encode_error


@spreadsheet_function("NPV", least=2)
def net_present_value(rate: Number, *flows: NumberItems) -> float | ErrorValue:
    """The value today of flows at the ends of equal periods, by Horner's rule from the last back."""
    found = [flow for items in flows for flow in items]
    if not found:
        return ErrorValue.VALUE
    growth = rate + 1.0
    if growth == 0:
        return ErrorValue.DIV0
    total = 0.0
    for flow in reversed(found):
        total = (total + flow) / growth
    return total


def _signs_differ(flows: list[float]) -> bool:
    return any(flow > 0 for flow in flows) and any(flow < 0 for flow in flows)


@spreadsheet_function("IRR")
def internal_rate(flows: NumberItems, guess: Number = 0.1) -> float | ErrorValue:
    """The rate at which flows are worth nothing today; of several, the one nearest the guess."""
    return ErrorValue.VALUE if guess <= -1 else internal_rate_of(flows, guess)


@over_draws("IRR")
def internal_rate_over_draws(flows: FloatArray, guess: FloatArray | float = 0.1) -> FloatArray:
    """IRR over draws."""
    return internal_rates(flows, guess)


def _dated(context: Context, flows: Array, dates: Operand) -> tuple[list[float], list[float]]:
    """Flows and the years from the first date to each of theirs.

    Raises:
        Fault: Different lengths (#NUM!), no numbers (#VALUE!).
    """
    if isinstance(dates, ErrorValue):
        raise Fault(dates)
    days = values_of(dates, context)
    if len(flows.items) != len(days.items):
        raise Fault(ErrorValue.NUM)
    error = first_error(flows) or first_error(days)
    if error is not None:
        raise Fault(error)
    amounts, moments = numbers_in(flows), numbers_in(days)
    if len(amounts) != len(flows.items) or len(moments) != len(days.items):
        amounts, moments = _filled(flows, days)
    if not amounts:
        raise Fault(ErrorValue.NA)
    whole = [float(math.floor(moment)) for moment in moments]
    if any(moment < whole[0] for moment in whole):
        raise Fault(ErrorValue.NUM)
    return amounts, [(moment - whole[0]) / 365 for moment in whole]


def _filled(flows: Array, days: Array) -> tuple[list[float], list[float]]:
    """Pairs of which a blank flow counts as 0 and a date may be written as text."""
    amounts, moments = [], []
    for flow, day in zip(flows.items, days.items, strict=True):
        if flow is not None and type(flow) is not float:
            raise Fault(ErrorValue.VALUE)
        amounts.append(flow or 0.0)
        moments.append(to_number(day))
    return amounts, moments


@spreadsheet_function("XNPV")
def dated_present_value(
    context: Context, rate: Number, flows: Values, dates: Operand
) -> float | ErrorValue:
    """The value at the first date of flows at given dates."""
    if rate <= -1:
        return ErrorValue.NUM
    amounts, years = _dated(context, flows, dates)
    total = 0.0
    for amount, year in zip(amounts, years, strict=True):
        total += amount / math.pow(1 + rate, year)
    return total


@spreadsheet_function("XIRR")
def dated_internal_rate(
    context: Context, flows: Values, dates: Operand, guess: Number = 0.1
) -> float | ErrorValue:
    """The rate at which flows at given dates are worth nothing at the first."""
    amounts, years = _dated(context, flows, dates)
    return internal_rate_of(amounts, guess, years)


@over_draws("XNPV")
def dated_present_value_over_draws(
    rate: FloatArray | float, flows: Stack, dates: Stack
) -> FloatArray:
    """XNPV over draws."""
    days = np.floor(dates.data)
    years = (days - days[0]) / 365
    total = np.zeros(flows.data.shape[1])
    for amount, year in zip(flows.data, years, strict=True):
        total = total + amount / np.power(1 + rate, year)
    total = np.where((years < 0).any(axis=0), encode_error(ErrorValue.NUM), total)
    return np.where(np.asarray(rate) <= -1, encode_error(ErrorValue.NUM), total)


@over_draws("XIRR")
def dated_internal_rate_over_draws(
    flows: Stack, dates: Stack, guess: FloatArray | float = 0.1
) -> FloatArray:
    """XIRR over draws."""
    days = np.floor(dates.data)
    years = (days - days[0]) / 365
    if (years == years[:, :1]).all():
        years = years[:, :1]
    rates = internal_rates(flows.data, guess, years)
    return np.where((years < 0).any(axis=0), encode_error(ErrorValue.NUM), rates)


@spreadsheet_function("MIRR")
def modified_internal_rate(
    flows: NumberItems, finance_rate: Number, reinvestment_rate: Number
) -> float | ErrorValue:
    """The rate of return with one rate for outlays and one for what is reinvested."""
    if not _signs_differ(flows) or finance_rate == -1 or reinvestment_rate == -1:
        return ErrorValue.DIV0
    periods = len(flows)
    gains = net_present_value(reinvestment_rate, [flow if flow > 0 else 0.0 for flow in flows])
    costs = net_present_value(finance_rate, [flow if flow < 0 else 0.0 for flow in flows])
    if isinstance(gains, ErrorValue) or isinstance(costs, ErrorValue) or costs == 0:
        return ErrorValue.DIV0
    ratio = -gains * (1 + reinvestment_rate) ** periods / (costs * (1 + finance_rate))
    return math.pow(ratio, 1 / (periods - 1)) - 1 if periods > 1 and ratio >= 0 else ErrorValue.NUM


@spreadsheet_function("FVSCHEDULE")
def future_value_of_schedule(
    context: Context, principal: Number, rates: Operand
) -> float | ErrorValue:
    """A principal after a series of rates."""
    if isinstance(rates, ErrorValue):
        return rates
    items = values_of(rates, context).items if isinstance(rates, (Reference, Array)) else [rates]
    total = principal
    for item in items:
        if isinstance(item, ErrorValue):
            return item
        if item is not None and type(item) is not float:
            return ErrorValue.VALUE
        total *= 1 + (item or 0.0)
    return total
