"""Rounding."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.registry import FloatArray, Number, Whole, over_draws, spreadsheet_function
from cellsim.functions.rounding_rules import (
    nearly_whole,
    round_down,
    round_down_over_draws,
    round_half_away,
    round_half_away_over_draws,
    round_up,
    round_up_over_draws,
)
from cellsim.values import ErrorValue, Fault, encode_error


@spreadsheet_function("ROUND")
def round_to_places(number: Number, digits: Whole) -> float:
    """A number to some decimal places, ties away from zero."""
    return round_half_away(number, digits)


@over_draws("ROUND")
def round_to_places_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """ROUND over draws."""
    return round_half_away_over_draws(number, np.trunc(digits))


@spreadsheet_function("ROUNDUP")
def round_away_from_zero(number: Number, digits: Whole) -> float:
    """A number to some decimal places, away from zero."""
    return round_up(number, digits)


@spreadsheet_function("ROUNDDOWN")
def round_toward_zero(number: Number, digits: Whole) -> float:
    """A number to some decimal places, toward zero."""
    return round_down(number, digits)


@spreadsheet_function("TRUNC")
def truncate(number: Number, digits: Whole = 0) -> float:
    """A number cut after some decimal places."""
    return round_down(number, digits)


@over_draws("ROUNDUP")
def round_away_from_zero_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """ROUNDUP over draws."""
    return round_up_over_draws(number, np.trunc(digits))


@over_draws("ROUNDDOWN")
def round_toward_zero_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """ROUNDDOWN over draws."""
    return round_down_over_draws(number, np.trunc(digits))


@over_draws("TRUNC")
def truncate_over_draws(number: FloatArray, digits: FloatArray | float = 0.0) -> FloatArray:
    """TRUNC over draws."""
    return round_down_over_draws(number, np.trunc(digits))


@spreadsheet_function("INT")
def floor_to_whole(number: Number) -> float:
    """The largest whole number that is not above a number."""
    nearest = nearly_whole(number) if abs(number) > 1 else number
    return float(math.floor(nearest))


@over_draws("INT")
def floor_to_whole_over_draws(number: FloatArray) -> FloatArray:
    """INT over draws."""
    numbers = np.asarray(number, dtype=np.float64)
    nearest = np.round(numbers)
    close = (np.abs(numbers - nearest) <= np.abs(numbers) * 4e-15) & (np.abs(numbers) > 1)
    return np.floor(np.where(close, nearest, numbers))


@spreadsheet_function("MROUND", strict=True)
def round_to_multiple(number: Number, multiple: Number) -> float | ErrorValue:
    """A number to the nearest multiple, ties away from zero."""
    if multiple == 0 or number == 0:
        return 0.0
    if (number < 0) != (multiple < 0):
        return ErrorValue.NUM
    return round_half_away(number / multiple, 0) * multiple


def _to_multiple(number: float, significance: float, *, up: bool) -> float:
    quotient = nearly_whole(number / significance)
    return (math.ceil(quotient) if up else math.floor(quotient)) * significance


@spreadsheet_function("CEILING")
def ceiling(number: Number, significance: Number) -> float | ErrorValue:
    """A number rounded up to a multiple; away from zero where both are negative."""
    if significance == 0 or number == 0:
        return 0.0
    if number > 0 > significance:
        return ErrorValue.NUM
    return _to_multiple(number, significance, up=True)


@spreadsheet_function("FLOOR")
def floor(number: Number, significance: Number) -> float | ErrorValue:
    """A number rounded down to a multiple; toward zero where both are negative."""
    if number == 0:
        return 0.0
    if significance == 0:
        return ErrorValue.DIV0
    if number > 0 > significance:
        return ErrorValue.NUM
    return _to_multiple(number, significance, up=False)


@spreadsheet_function("CEILING.PRECISE", "ISO.CEILING")
def ceiling_precise(number: Number, significance: Number = 1.0) -> float:
    """A number rounded up to a multiple, whatever the signs."""
    return _to_multiple(number, abs(significance), up=True) if significance and number else 0.0


@spreadsheet_function("FLOOR.PRECISE")
def floor_precise(number: Number, significance: Number = 1.0) -> float:
    """A number rounded down to a multiple, whatever the signs."""
    return _to_multiple(number, abs(significance), up=False) if significance and number else 0.0


@spreadsheet_function("CEILING.MATH")
def ceiling_math(number: Number, significance: Number = 1.0, mode: Number = 0.0) -> float:
    """A number rounded up to a multiple; with a mode, negative ones away from zero."""
    if not significance or not number:
        return 0.0
    return _to_multiple(number, abs(significance), up=not (number < 0 and mode != 0))


@spreadsheet_function("FLOOR.MATH")
def floor_math(number: Number, significance: Number = 1.0, mode: Number = 0.0) -> float:
    """A number rounded down to a multiple; with a mode, negative ones toward zero."""
    if not significance or not number:
        return 0.0
    return _to_multiple(number, abs(significance), up=number < 0 and mode != 0)


@spreadsheet_function("EVEN")
def round_to_even(number: Number) -> float:
    """A number rounded away from zero to an even one."""
    return math.copysign(2 * math.ceil(nearly_whole(abs(number) / 2)), number)


@spreadsheet_function("ODD")
def round_to_odd(number: Number) -> float:
    """A number rounded away from zero to an odd one."""
    if number == 0:
        return 1.0
    return math.copysign(2 * math.ceil(nearly_whole((abs(number) - 1) / 2)) + 1, number)


@spreadsheet_function("MOD")
def modulo(number: Number, divisor: Number) -> float:
    """What is left of a division, with the divisor's sign."""
    if divisor == 0:
        raise Fault(ErrorValue.DIV0)
    if abs(number / divisor) >= 2.0**50:
        raise Fault(ErrorValue.NUM)
    rest = number - divisor * math.floor(number / divisor)
    if rest == divisor or abs(rest) <= abs(number) * 1e-16:
        return 0.0
    return rest


@over_draws("MOD")
def modulo_over_draws(number: FloatArray, divisor: FloatArray | float) -> FloatArray:
    """MOD over draws."""
    quotient = np.asarray(number) / divisor
    rest = number - divisor * np.floor(quotient)
    rest = np.where((rest == divisor) | (np.abs(rest) <= np.abs(number) * 1e-16), 0.0, rest)
    rest = np.where(np.abs(quotient) >= 2.0**50, encode_error(ErrorValue.NUM), rest)
    return np.where(np.asarray(divisor) == 0, encode_error(ErrorValue.DIV0), rest)


@spreadsheet_function("QUOTIENT")
def whole_quotient(number: Number, divisor: Number) -> float:
    """The whole part of a division."""
    if divisor == 0:
        raise Fault(ErrorValue.DIV0)
    return float(math.trunc(number / divisor))
