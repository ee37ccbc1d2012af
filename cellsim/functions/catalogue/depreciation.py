"""Depreciation."""

from __future__ import annotations

import math

from cellsim.functions.day_counts import year_fraction
from cellsim.functions.registry import Context, Logical, Number, Whole, spreadsheet_function
from cellsim.functions.rounding_rules import round_half_away
from cellsim.values import ErrorValue, Fault


@spreadsheet_function("SLN")
def straight_line(cost: Number, salvage: Number, life: Number) -> float | ErrorValue:
    """Straight-line depreciation of one period."""
    return (cost - salvage) / life if life else ErrorValue.DIV0


@spreadsheet_function("SYD")
def sum_of_years_digits(
    cost: Number, salvage: Number, life: Number, period: Number
) -> float | ErrorValue:
    """Depreciation of a period by the sum of the years' digits."""
    if life <= 0 or salvage < 0 or not 1 <= period <= life:
        return ErrorValue.NUM
    return (cost - salvage) * (life - period + 1) * 2 / (life * (life + 1))


@spreadsheet_function("DB")
def fixed_declining(
    cost: Number, salvage: Number, life: Number, period: Whole, months: Number = 12.0
) -> float | ErrorValue:
    """Fixed-declining depreciation, the rate rounded to three decimals."""
    if (
        cost < 0
        or salvage < 0
        or life <= 0
        or period < 1
        or not 1 <= months <= 12
        or period > life + 1
    ):
        return ErrorValue.NUM
    if cost == 0:
        return 0.0
    rate = round_half_away(1 - math.pow(salvage / cost, 1 / life), 3)
    first = cost * rate * months / 12
    if period == 1:
        return first
    total = first
    last = math.ceil(life) + (1 if months < 12 else 0)
    for place in range(2, period + 1):
        part = (cost - total) * rate
        if place == last and months < 12:
            part = (cost - total) * rate * (12 - months) / 12
        if place == period:
            return part
        total += part
    return 0.0


def _declining(cost: float, salvage: float, life: float, period: float, factor: float) -> float:
    """Declining-balance depreciation up to a whole period, never below the salvage value."""
    rate = factor / life
    if rate >= 1:
        rate = 1.0
        before = cost if period == 1 else 0.0
    else:
        before = cost * math.pow(1 - rate, period - 1)
    after = cost * math.pow(1 - rate, period)
    part = before - salvage if after < salvage else before - after
    return max(part, 0.0)


@spreadsheet_function("DDB")
def double_declining(
    cost: Number, salvage: Number, life: Number, period: Number, factor: Number = 2.0
) -> float | ErrorValue:
    """Declining-balance depreciation of a period, twice the straight line by default."""
    if cost < 0 or salvage < 0 or life <= 0 or period <= 0 or period > life or factor <= 0:
        return ErrorValue.NUM
    return _declining(cost, salvage, life, period, factor)


@spreadsheet_function("VDB")
def variable_declining(
    cost: Number,
    salvage: Number,
    life: Number,
    start: Number,
    end: Number,
    factor: Number = 2.0,
    no_switch: Logical = False,
) -> float | ErrorValue:
    """Declining-balance depreciation over a span of periods, with a switch to straight line."""
    if cost < 0 or salvage < 0 or life <= 0 or start < 0 or end < start or end > life or factor < 0:
        return ErrorValue.NUM
    total = 0.0
    book = cost
    for period in range(1, math.ceil(end) + 1):
        declining = min(book * min(factor / life, 1.0), max(book - salvage, 0.0))
        part = declining
        left = life - (period - 1)
        if not no_switch and left > 0:
            straight = (book - salvage) / left
            part = (
                max(declining, min(straight, book - salvage)) if straight > declining else declining
            )
        share = max(0.0, min(end, period) - max(start, period - 1))
        total += part * share
        book -= part
    return total


@spreadsheet_function("AMORLINC")
def linear_by_days(
    context: Context,
    cost: Number,
    bought: Number,
    first_end: Number,
    salvage: Number,
    period: Whole,
    rate: Number,
    basis: Whole = 0,
) -> float | ErrorValue:
    """Linear depreciation of a period with a first period counted in days."""
    if rate <= 0 or cost < salvage or period < 0:
        return ErrorValue.NUM
    full = cost * rate
    first = full * year_fraction(bought, first_end, basis, date_1904=context.date_1904)
    if period == 0:
        return min(first, cost - salvage)
    left = cost - salvage - first - full * (period - 1)
    return max(0.0, min(full, left))


@spreadsheet_function("AMORDEGRC")
def degressive_by_days(
    context: Context,
    cost: Number,
    bought: Number,
    first_end: Number,
    salvage: Number,
    period: Whole,
    rate: Number,
    basis: Whole = 0,
) -> float | ErrorValue:
    """Degressive depreciation of a period, each rounded to whole units."""
    if rate <= 0 or cost < salvage or period < 0:
        return ErrorValue.NUM
    life = 1 / rate
    if life < 3:
        raise Fault(ErrorValue.NUM)
    coefficient = 1.5 if life <= 4 else 2.0 if life <= 6 else 2.5
    raised = rate * coefficient
    part = round_half_away(
        year_fraction(bought, first_end, basis, date_1904=context.date_1904) * raised * cost, 0
    )
    left = cost - part
    rest = left - salvage
    for place in range(period):
        part = round_half_away(raised * left, 0)
        rest -= part
        if rest < 0:
            return round_half_away(left * 0.5, 0) if period - place in (0, 1) else 0.0
        left -= part
    return part
