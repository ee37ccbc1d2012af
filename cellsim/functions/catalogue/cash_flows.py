"""Values and rates of return of cash flows."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.coercion import first_error, to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.encoded import checked
from cellsim.functions.flows_over_draws import sum_of_rows
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
from cellsim.values import Array, ErrorValue, Fault, Scalar, decode_error

_NUM, _DIV0 = ErrorValue.NUM, ErrorValue.DIV0


def _one_draw(numbers: list[float]) -> FloatArray:
    return np.array(numbers, dtype=np.float64)[:, None]


def _only(result: FloatArray) -> float | ErrorValue:
    number = float(result[0])
    return number if number == number else decode_error(number)


@spreadsheet_function("NPV", least=2)
def net_present_value(rate: Number, *flows: NumberItems) -> float | ErrorValue:
    """The value today of flows at the ends of equal periods, by Horner's rule from the last back."""
    found = [flow for items in flows for flow in items]
    if not found:
        return ErrorValue.VALUE
    growth = rate + 1.0
    if growth == 0:
        return _DIV0
    total = 0.0
    for flow in reversed(found):
        total = (total + flow) / growth
    return total


@spreadsheet_function("IRR")
def internal_rate(flows: NumberItems, guess: Number = 0.1) -> float | ErrorValue:
    """The rate at which flows are worth nothing today; of several, the one nearest the guess."""
    return ErrorValue.VALUE if guess <= -1 else internal_rate_of(flows, guess)


@over_draws("IRR")
def internal_rate_over_draws(flows: FloatArray, guess: FloatArray | float = 0.1) -> FloatArray:
    """IRR over draws."""
    too_low = np.asarray(guess) <= -1
    return checked(internal_rates(flows, guess), (too_low, ErrorValue.VALUE))


def _dated(context: Context, flows: Array, dates: Operand) -> tuple[list[float], list[float]]:
    """Flows and the years from the first date to each of theirs; pairs of blanks are left out.

    Raises:
        Fault: Different lengths, or a date before the first (#NUM!); logicals or other text than
            numbers (#VALUE!); no flows at all (#N/A).
    """
    if isinstance(dates, ErrorValue):
        raise Fault(dates)
    days = values_of(dates, context)
    if len(flows.items) != len(days.items):
        raise Fault(_NUM)
    error = first_error(days) or first_error(flows)
    if error is not None:
        raise Fault(error)
    pairs = [
        (_plain_number(flow, context), math.floor(_plain_number(day, context)))
        for flow, day in zip(flows.items, days.items, strict=True)
        if flow is not None or day is not None
    ]
    if not pairs:
        raise Fault(ErrorValue.NA)
    first = pairs[0][1]
    if any(day < first for _, day in pairs):
        raise Fault(_NUM)
    return [flow for flow, _ in pairs], [(day - first) / 365 for _, day in pairs]


def _plain_number(value: Scalar, context: Context) -> float:
    if isinstance(value, bool):
        raise Fault(ErrorValue.VALUE)
    return to_number(value, date_1904=context.date_1904)


def _worth_at_dates(rate: FloatArray | float, flows: FloatArray, years: FloatArray) -> FloatArray:
    total = sum_of_rows(flows / np.power(1 + np.asarray(rate), years))
    return checked(total, (np.asarray(rate) <= 0, _NUM), ((years < 0).any(axis=0), _NUM))


@spreadsheet_function("XNPV", strict=True)
def dated_present_value(
    context: Context, rate: Number, flows: Values, dates: Operand
) -> float | ErrorValue:
    """The value at the first date of flows at given dates; the rate must be above 0."""
    amounts, years = _dated(context, flows, dates)
    if rate <= 0:
        return _NUM
    with np.errstate(all="ignore"):
        return _only(_worth_at_dates(rate, _one_draw(amounts), _one_draw(years)))


@spreadsheet_function("XIRR", strict=True)
def dated_internal_rate(
    context: Context, flows: Values, dates: Operand, guess: Number = 0.1
) -> float | ErrorValue:
    """The rate at which flows at given dates are worth nothing at the first."""
    amounts, years = _dated(context, flows, dates)
    return internal_rate_of(amounts, guess, years)


@over_draws("XNPV")
def dated_present_value_over_draws(
    rate: FloatArray | float, flows: Stack, dates: Stack
) -> FloatArray | None:
    """XNPV over draws."""
    if flows.data.shape != dates.data.shape:
        return None
    return _worth_at_dates(rate, flows.data, _years(dates))


@over_draws("XIRR")
def dated_internal_rate_over_draws(
    flows: Stack, dates: Stack, guess: FloatArray | float = 0.1
) -> FloatArray | None:
    """XIRR over draws."""
    if flows.data.shape != dates.data.shape:
        return None
    years = _years(dates)
    amounts = flows.data
    if (years[1:] < years[:-1]).any():
        order = np.argsort(years, axis=0, kind="stable")
        if years.shape[1] == 1:
            amounts, years = amounts[order[:, 0]], years[order[:, 0]]
        else:
            amounts = np.take_along_axis(amounts, order, axis=0)
            years = np.take_along_axis(years, order, axis=0)
    early = (years < 0).any(axis=0)
    return checked(internal_rates(amounts, guess, np.maximum(years, 0.0)), (early, _NUM))


def _years(dates: Stack) -> FloatArray:
    """Years from the first date, shape (dates, draws), or (dates, 1) where they do not vary."""
    days = np.floor(dates.data)
    if (days == days[:, :1]).all():
        days = days[:, :1]
    years: FloatArray = (days - days[0]) / 365
    return years


def _modified_rate(
    flows: FloatArray, finance_rate: FloatArray | float, reinvestment_rate: FloatArray | float
) -> FloatArray:
    periods = len(flows)
    gains = _discounted(np.maximum(flows, 0.0), reinvestment_rate)
    costs = _discounted(np.minimum(flows, 0.0), finance_rate)
    growth = np.power(1 + np.asarray(reinvestment_rate), periods)
    ratio = -gains * growth / (costs * (1 + np.asarray(finance_rate)))
    rate = np.power(ratio, 1 / (periods - 1) if periods > 1 else np.nan) - 1
    no_sides = ~((flows > 0).any(axis=0) & (flows < 0).any(axis=0))
    no_rate = (np.asarray(finance_rate) == -1) | (np.asarray(reinvestment_rate) == -1)
    return checked(rate, (no_sides | no_rate, _DIV0))


def _discounted(flows: FloatArray, rate: FloatArray | float) -> FloatArray:
    """The worth a period before the first flow, as NPV has it."""
    growth = 1 + np.asarray(rate)
    total = np.zeros(flows.shape[1:])
    for flow in flows[::-1]:
        total = (total + flow) / growth
    return total


@spreadsheet_function("MIRR")
def modified_internal_rate(
    flows: NumberItems, finance_rate: Number, reinvestment_rate: Number
) -> float | ErrorValue:
    """The rate of return with one rate for outlays and one for what is reinvested."""
    if not flows:
        return _DIV0
    with np.errstate(all="ignore"):
        return _only(_modified_rate(_one_draw(flows), finance_rate, reinvestment_rate))


@over_draws("MIRR")
def modified_internal_rate_over_draws(
    flows: FloatArray, finance_rate: FloatArray | float, reinvestment_rate: FloatArray | float
) -> FloatArray:
    """MIRR over draws."""
    return _modified_rate(flows, finance_rate, reinvestment_rate)


@spreadsheet_function("FVSCHEDULE", strict=True)
def future_value_of_schedule(
    context: Context, principal: Number, rates: Operand
) -> float | ErrorValue:
    """A principal after a series of rates."""
    if isinstance(rates, ErrorValue):
        return rates
    total = principal
    for item in values_of(rates, context).items:
        if isinstance(item, ErrorValue):
            return item
        if item is not None and type(item) is not float:
            return ErrorValue.VALUE
        total *= 1 + (item or 0.0)
    return total


@over_draws("FVSCHEDULE")
def future_value_of_schedule_over_draws(principal: FloatArray | float, rates: Stack) -> FloatArray:
    """FVSCHEDULE over draws."""
    total = np.broadcast_to(np.asarray(principal, dtype=np.float64), rates.data.shape[1:])
    for rate in rates.data:
        total = total * (1 + rate)
    return checked(total)
