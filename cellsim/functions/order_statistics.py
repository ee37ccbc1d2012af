"""Percentiles and ranks of plain lists of numbers."""

from __future__ import annotations

import math

from cellsim.values import ErrorValue, Fault


def kth_from_an_end(numbers: list[float], place: float, *, from_top: bool) -> float:
    """The number at a place counted from 1, rounded up, from the largest or the smallest.

    Raises:
        Fault: There is no such place (#NUM!).
    """
    k = math.ceil(place)
    if not 1 <= k <= len(numbers):
        raise Fault(ErrorValue.NUM)
    return sorted(numbers, reverse=from_top)[k - 1]


def percentile_inclusive(numbers: list[float], share: float) -> float:
    """The value at position 1 + (n - 1) p of the ordered numbers (Hyndman and Fan 1996, type 7).

    Raises:
        Fault: There is no number, or the share is not from 0 to 1 (#NUM!).
    """
    if not numbers or not 0 <= share <= 1:
        raise Fault(ErrorValue.NUM)
    return _at(sorted(numbers), share * (len(numbers) - 1))


def percentile_exclusive(numbers: list[float], share: float) -> float:
    """The value at position (n + 1) p of the ordered numbers (Hyndman and Fan 1996, type 6).

    Raises:
        Fault: The position lies outside the numbers (#NUM!).
    """
    n = len(numbers)
    if not numbers or not 1 / (n + 1) - 1e-12 <= share <= n / (n + 1) + 1e-12:
        raise Fault(ErrorValue.NUM)
    return _at(sorted(numbers), min(max(share * (n + 1) - 1, 0.0), n - 1.0))


def _at(ordered: list[float], place: float) -> float:
    low = math.floor(place)
    fraction = place - low
    if fraction == 0 or low + 1 >= len(ordered):
        return ordered[low]
    return ordered[low] + (ordered[low + 1] - ordered[low]) * fraction


def rank_of(number: float, numbers: list[float], *, ascending: bool) -> tuple[int, int] | None:
    """The best place of a number among others and how many share it; None if it is not among them."""
    ties = sum(item == number for item in numbers)
    if not ties:
        return None
    before = sum(item < number if ascending else item > number for item in numbers)
    return before + 1, ties
