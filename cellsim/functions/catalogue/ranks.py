"""Ranks, and percentiles without the ends."""

from __future__ import annotations

import numpy as np

from cellsim.functions.order_statistics import percentile_exclusive, rank_of
from cellsim.functions.registry import (
    FloatArray,
    Logical,
    Number,
    NumberItems,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import ErrorValue, encode_error

_NA, _NUM = encode_error(ErrorValue.NA), encode_error(ErrorValue.NUM)


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


def _ranked(
    number: FloatArray | float, numbers: FloatArray, ascending: FloatArray | float
) -> tuple[FloatArray, FloatArray]:
    """The best place of a number among others, #N/A if it is not there, and how many share it."""
    ties = (numbers == number).sum(axis=0).astype(np.float64)
    below, above = (numbers < number).sum(axis=0), (numbers > number).sum(axis=0)
    before = np.where(np.asarray(ascending) != 0, below, above)
    return np.where(ties > 0, before + 1.0, _NA), ties


@over_draws("RANK", "RANK.EQ")
def rank_over_draws(
    number: FloatArray | float, numbers: FloatArray, ascending: FloatArray | float = 0.0
) -> FloatArray:
    """RANK over draws."""
    return _ranked(number, numbers, ascending)[0]


@over_draws("RANK.AVG")
def average_rank_over_draws(
    number: FloatArray | float, numbers: FloatArray, ascending: FloatArray | float = 0.0
) -> FloatArray:
    """RANK.AVG over draws."""
    best, ties = _ranked(number, numbers, ascending)
    return np.where(ties > 0, best + (ties - 1) / 2, _NA)


@spreadsheet_function("PERCENTILE.EXC")
def percentile_without_ends(numbers: NumberItems, share: Number) -> float:
    """The number below which a share of the numbers lies, ends left out."""
    return percentile_exclusive(numbers, share)


@spreadsheet_function("QUARTILE.EXC")
def quartile_without_ends(numbers: NumberItems, quarter: Whole) -> float | ErrorValue:
    """A quartile, ends left out."""
    return percentile_exclusive(numbers, quarter / 4) if 1 <= quarter <= 3 else ErrorValue.NUM


@over_draws("PERCENTILE.EXC")
def percentile_without_ends_over_draws(
    numbers: FloatArray, share: FloatArray | float
) -> FloatArray:
    """PERCENTILE.EXC over draws."""
    ordered = np.sort(numbers, axis=0)
    n = len(ordered)
    shares = np.broadcast_to(share, ordered.shape[1:])
    good = (shares >= 1 / (n + 1) - 1e-12) & (shares <= n / (n + 1) + 1e-12)
    place = np.clip(np.where(good, shares, 0.0) * (n + 1) - 1, 0.0, n - 1.0)
    low = np.floor(place).astype(np.intp)
    below = np.take_along_axis(ordered, low[None], axis=0)[0]
    above = np.take_along_axis(ordered, np.minimum(low + 1, n - 1)[None], axis=0)[0]
    fraction = place - low
    between = below + (above - below) * fraction
    return np.where(good, np.where(fraction == 0, below, between), _NUM)


@over_draws("QUARTILE.EXC")
def quartile_without_ends_over_draws(
    numbers: FloatArray, quarter: FloatArray | float
) -> FloatArray:
    """QUARTILE.EXC over draws."""
    found = percentile_without_ends_over_draws(numbers, np.asarray(quarter) / 4)
    inner = (np.asarray(quarter) >= 1) & (np.asarray(quarter) <= 3)
    return np.where(inner, found, _NUM)
