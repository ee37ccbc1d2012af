"""Order: medians, places, ranks, percentiles and quartiles."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.moments import (
    joined,
    stacked,
)
from cellsim.functions.order_statistics import (
    kth_from_an_end,
    percentile_exclusive,
    percentile_inclusive,
    rank_of,
)
from cellsim.functions.registry import (
    FloatArray,
    Logical,
    Number,
    NumberItems,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import ErrorValue, Fault, encode_error


@spreadsheet_function("MEDIAN", least=1)
def median(*numbers: NumberItems) -> float | ErrorValue:
    """The middle number."""
    found = sorted(joined(numbers))
    if not found:
        return ErrorValue.NUM
    middle = len(found) // 2
    return found[middle] if len(found) % 2 else (found[middle - 1] + found[middle]) / 2


@over_draws("MEDIAN")
def median_over_draws(*numbers: FloatArray) -> FloatArray:
    """MEDIAN over draws."""
    data = np.sort(stacked(numbers), axis=0)
    middle = len(data) // 2
    result: FloatArray = data[middle] if len(data) % 2 else (data[middle - 1] + data[middle]) / 2
    return result


@spreadsheet_function("LARGE", scalars_first=True)
def kth_largest(numbers: NumberItems, place: Number) -> float:
    """The number at a place from the top."""
    return kth_from_an_end(numbers, place, from_top=True)


@spreadsheet_function("SMALL", scalars_first=True)
def kth_smallest(numbers: NumberItems, place: Number) -> float:
    """The number at a place from the bottom."""
    return kth_from_an_end(numbers, place, from_top=False)


def _pick(data: FloatArray, place: FloatArray | float, *, from_top: bool) -> FloatArray:
    ordered = np.sort(data, axis=0)
    k = np.ceil(np.broadcast_to(place, ordered.shape[1:]))
    good = (k >= 1) & (k <= len(ordered))
    index = np.where(good, np.where(np.isnan(k), 1, k), 1).astype(np.intp)
    rows = len(ordered) - index if from_top else index - 1
    picked = np.take_along_axis(ordered, rows[None], axis=0)[0]
    return np.where(good, picked, encode_error(ErrorValue.NUM))


@over_draws("LARGE")
def kth_largest_over_draws(numbers: FloatArray, place: FloatArray | float) -> FloatArray:
    """LARGE over draws."""
    return _pick(numbers, place, from_top=True)


@over_draws("SMALL")
def kth_smallest_over_draws(numbers: FloatArray, place: FloatArray | float) -> FloatArray:
    """SMALL over draws."""
    return _pick(numbers, place, from_top=False)


@spreadsheet_function("RANK", "RANK.EQ")
def rank(number: Number, numbers: NumberItems, ascending: Logical = False) -> float | ErrorValue:
    """The place of a number among others, ties sharing the best."""
    found = rank_of(number, numbers, ascending=ascending)
    return ErrorValue.NA if found is None else float(found[0])


@spreadsheet_function("RANK.AVG")
def average_rank(
    number: Number, numbers: NumberItems, ascending: Logical = False
) -> float | ErrorValue:
    """The place of a number among others, ties sharing their mean."""
    found = rank_of(number, numbers, ascending=ascending)
    return ErrorValue.NA if found is None else found[0] + (found[1] - 1) / 2


@spreadsheet_function("PERCENTILE", "PERCENTILE.INC", scalars_first=True)
def percentile(numbers: NumberItems, share: Number) -> float:
    """The number below which a share of the numbers lies, ends included."""
    return percentile_inclusive(numbers, share)


@spreadsheet_function("PERCENTILE.EXC", scalars_first=True)
def percentile_without_ends(numbers: NumberItems, share: Number) -> float:
    """The number below which a share of the numbers lies, ends left out."""
    return percentile_exclusive(numbers, share)


@spreadsheet_function("QUARTILE", "QUARTILE.INC", scalars_first=True)
def quartile(numbers: NumberItems, quarter: Whole) -> float | ErrorValue:
    """A quartile, ends included."""
    return percentile_inclusive(numbers, quarter / 4) if 0 <= quarter <= 4 else ErrorValue.NUM


@spreadsheet_function("QUARTILE.EXC", scalars_first=True)
def quartile_without_ends(numbers: NumberItems, quarter: Whole) -> float | ErrorValue:
    """A quartile, ends left out."""
    return percentile_exclusive(numbers, quarter / 4) if 1 <= quarter <= 3 else ErrorValue.NUM


@over_draws("PERCENTILE", "PERCENTILE.INC")
def percentile_over_draws(numbers: FloatArray, share: FloatArray | float) -> FloatArray:
    """PERCENTILE over draws."""
    ordered = np.sort(numbers, axis=0)
    shares = np.broadcast_to(share, ordered.shape[1:])
    good = (shares >= 0) & (shares <= 1)
    place = np.where(good, shares, 0.0) * (len(ordered) - 1)
    low = np.floor(place).astype(np.intp)
    high = np.minimum(low + 1, len(ordered) - 1)
    below = np.take_along_axis(ordered, low[None], axis=0)[0]
    above = np.take_along_axis(ordered, high[None], axis=0)[0]
    return np.where(good, below + (above - below) * (place - low), encode_error(ErrorValue.NUM))


@over_draws("QUARTILE", "QUARTILE.INC")
def quartile_over_draws(numbers: FloatArray, quarter: FloatArray | float) -> FloatArray:
    """QUARTILE over draws."""
    return percentile_over_draws(numbers, np.trunc(quarter) / 4)


def _percent_rank(numbers: list[float], number: float, digits: int, *, ends: bool) -> float:
    ordered = sorted(numbers)
    if not ordered or digits < 1:
        raise Fault(ErrorValue.NUM)
    if not ordered[0] <= number <= ordered[-1]:
        raise Fault(ErrorValue.NA)
    below = sum(item < number for item in ordered)
    if number in ordered:
        place = float(below)
    else:
        low, high = ordered[below - 1], ordered[below]
        place = below - 1 + (number - low) / (high - low)
    share = (
        (place / (len(ordered) - 1) if len(ordered) > 1 else 1.0)
        if ends
        else (place + 1) / (len(ordered) + 1)
    )
    scale = 10.0**digits
    return math.floor(share * scale + 1e-9) / scale


@spreadsheet_function("PERCENTRANK", "PERCENTRANK.INC")
def percent_rank(numbers: NumberItems, number: Number, digits: Whole = 3) -> float:
    """The share of numbers below one, ends included, cut to some digits."""
    return _percent_rank(numbers, number, digits, ends=True)


@spreadsheet_function("PERCENTRANK.EXC")
def percent_rank_without_ends(numbers: NumberItems, number: Number, digits: Whole = 3) -> float:
    """The share of numbers below one, ends left out, cut to some digits."""
    return _percent_rank(numbers, number, digits, ends=False)
