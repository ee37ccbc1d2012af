"""Depreciation."""

from __future__ import annotations

import numpy as np

from cellsim.functions.day_counts import year_fraction
from cellsim.functions.encoded import FloatArray, checked, numeric_function
from cellsim.functions.registry import Context, Logical, Number, Whole, spreadsheet_function
from cellsim.functions.rounding_rules import round_half_away, round_half_away_over_draws
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM


@numeric_function("SLN")
def straight_line(cost: Number, salvage: Number, life: Number) -> FloatArray:
    """Straight-line depreciation of one period."""
    years = np.asarray(life)
    return checked((cost - salvage) / years, (years == 0, ErrorValue.DIV0))


@numeric_function("SYD")
def sum_of_years_digits(cost: Number, salvage: Number, life: Number, period: Number) -> FloatArray:
    """Depreciation of a period by the sum of the years' digits."""
    years, place = np.asarray(life), np.asarray(period)
    part = (cost - salvage) * (years - place + 1) * 2 / (years * (years + 1))
    refused = (years <= 0) | (np.asarray(salvage) < 0) | (place < 1) | (place > years)
    return checked(part, (refused, _NUM))


@numeric_function("DB")
def fixed_declining(
    cost: Number, salvage: Number, life: Number, period: Whole, months: Number = 12.0
) -> FloatArray:
    """Fixed-declining depreciation, the rate rounded to three decimals."""
    amount, rest, years = np.asarray(cost), np.asarray(salvage), np.asarray(life)
    place, first_months = np.trunc(period), np.trunc(months)
    rate = round_half_away_over_draws(1 - np.power(rest / amount, 1 / years), 3.0)
    first = amount * rate * first_months / 12
    part = (amount - first) * np.power(1 - rate, place - 2) * rate
    part = np.where(place > years, part * (12 - first_months) / 12, part)
    part = np.where(place == 1, first, part)
    part = np.where(amount == 0, 0.0, part)
    refused = (amount < 0) | (rest < 0) | (years <= 0) | (place < 1) | (place > years + 1)
    return checked(part, (refused | (first_months < 1) | (first_months > 12), _NUM))


@numeric_function("DDB")
def double_declining(
    cost: Number, salvage: Number, life: Number, period: Number, factor: Number = 2.0
) -> FloatArray:
    """Declining-balance depreciation of a period, twice the straight line by default."""
    amount, rest, years = np.asarray(cost), np.asarray(salvage), np.asarray(life)
    place = np.asarray(period)
    kept = np.maximum(1 - factor / years, 0.0)
    before, after = amount * np.power(kept, place - 1), amount * np.power(kept, place)
    before = np.where(kept == 0, np.where(place == 1, amount, 0.0), before)
    part = np.maximum(before - np.maximum(after, rest), 0.0)
    refused = (amount < 0) | (rest < 0) | (years <= 0) | (place <= 0) | (place > years)
    return checked(part, (refused | (np.asarray(factor) <= 0), _NUM))


_MOST_PERIODS = 100_000
"""Periods are taken one after the other; longer lives end in #NUM! and not in hours."""


@numeric_function("VDB")
def variable_declining(
    cost: Number,
    salvage: Number,
    life: Number,
    start: Number,
    end: Number,
    factor: Number = 2.0,
    no_switch: Logical = False,
) -> FloatArray:
    """Declining-balance depreciation over a span of periods, with a switch to straight line."""
    amount, rest, years, begin, finish, speed, keep = np.broadcast_arrays(
        cost, salvage, life, start, end, factor, no_switch
    )
    refused = (amount < 0) | (rest < 0) | (years <= 0) | (begin < 0) | (speed < 0)
    refused = refused | (finish < begin) | (finish > years) | (finish > _MOST_PERIODS)
    total, book = np.zeros(amount.shape), amount
    last = np.max(finish, where=~refused & ~np.isnan(finish), initial=0.0)
    for period in np.arange(1.0, np.ceil(last) + 1):
        loss = np.maximum(book - rest, 0.0)
        part = np.minimum(book * np.minimum(speed / years, 1.0), loss)
        left = years - (period - 1)
        straight = np.minimum((book - rest) / left, loss)
        part = np.where((keep == 0) & (left > 0), np.maximum(part, straight), part)
        total = total + part * np.maximum(
            np.minimum(finish, period) - np.maximum(begin, period - 1), 0.0
        )
        book = book - part
    return checked(total, (refused, _NUM))


@spreadsheet_function("AMORLINC", strict=True)
def linear_by_days(
    context: Context,
    cost: Number,
    bought: Number,
    first_end: Number,
    salvage: Number,
    period: Whole,
    rate: Number,
    basis: Whole = 0,
) -> float:
    """Linear depreciation of a period with a first period counted in days."""
    _check(cost, salvage, period, rate, bought, first_end)
    full = cost * rate
    first = full * year_fraction(bought, first_end, basis, date_1904=context.date_1904)
    if period == 0:
        return min(first, cost - salvage)
    left = cost - salvage - first - full * (period - 1)
    return max(0.0, min(full, left))


@spreadsheet_function("AMORDEGRC", strict=True)
def degressive_by_days(
    context: Context,
    cost: Number,
    bought: Number,
    first_end: Number,
    salvage: Number,
    period: Whole,
    rate: Number,
    basis: Whole = 0,
) -> float:
    """Degressive depreciation of a period, each rounded to whole units."""
    _check(cost, salvage, period, rate, bought, first_end)
    life = 1 / rate
    if life < 3 or 4 < life < 5:  # lives for which no coefficient is laid down
        raise Fault(_NUM)
    raised = rate * (1.5 if life <= 4 else 2.0 if life <= 6 else 2.5)
    share = year_fraction(bought, first_end, basis, date_1904=context.date_1904)
    part = round_half_away(share * raised * cost, 0)
    left = cost - part
    rest = left - salvage
    for place in range(period):
        part = round_half_away(raised * left, 0)
        rest -= part
        if rest < 0:
            return round_half_away(left * 0.5, 0) if period - place in (0, 1) else 0.0
        left -= part
    return part


def _check(
    cost: float, salvage: float, period: int, rate: float, bought: float, first_end: float
) -> None:
    if rate <= 0 or cost <= 0 or salvage < 0 or salvage > cost or period < 0 or bought > first_end:
        raise Fault(_NUM)
