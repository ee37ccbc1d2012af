"""Trigonometric and hyperbolic functions."""

from __future__ import annotations

import math

from cellsim.functions.registry import Number, spreadsheet_function
from cellsim.values import ErrorValue

_LARGEST_ANGLE = 2.0**27
"""Angles beyond this are refused with #NUM!, as their sine would be noise."""


def _bounded(angle: float) -> bool:
    return abs(angle) < _LARGEST_ANGLE


@spreadsheet_function("SIN")
def sine(angle: Number) -> float | ErrorValue:
    """The sine of an angle in radians."""
    return math.sin(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("COS")
def cosine(angle: Number) -> float | ErrorValue:
    """The cosine of an angle in radians."""
    return math.cos(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("TAN")
def tangent(angle: Number) -> float | ErrorValue:
    """The tangent of an angle in radians."""
    return math.tan(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("COT")
def cotangent(angle: Number) -> float | ErrorValue:
    """The cotangent of an angle in radians."""
    if angle == 0:
        return ErrorValue.DIV0
    return 1 / math.tan(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("SEC")
def secant(angle: Number) -> float | ErrorValue:
    """The secant of an angle in radians."""
    return 1 / math.cos(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("CSC")
def cosecant(angle: Number) -> float | ErrorValue:
    """The cosecant of an angle in radians."""
    if angle == 0:
        return ErrorValue.DIV0
    return 1 / math.sin(angle) if _bounded(angle) else ErrorValue.NUM


@spreadsheet_function("ASIN")
def arc_sine(number: Number) -> float | ErrorValue:
    """The angle whose sine a number is."""
    return math.asin(number) if abs(number) <= 1 else ErrorValue.NUM


@spreadsheet_function("ACOS")
def arc_cosine(number: Number) -> float | ErrorValue:
    """The angle whose cosine a number is."""
    return math.acos(number) if abs(number) <= 1 else ErrorValue.NUM


@spreadsheet_function("ATAN")
def arc_tangent(number: Number) -> float:
    """The angle whose tangent a number is."""
    return math.atan(number)


@spreadsheet_function("ATAN2")
def arc_tangent_of_point(x: Number, y: Number) -> float | ErrorValue:
    """The angle of a point from the x axis."""
    return math.atan2(y, x) if x or y else ErrorValue.DIV0


@spreadsheet_function("ACOT")
def arc_cotangent(number: Number) -> float:
    """The angle, from 0 to pi, whose cotangent a number is."""
    return math.pi / 2 - math.atan(number)


@spreadsheet_function("SINH")
def hyperbolic_sine(number: Number) -> float:
    """The hyperbolic sine."""
    return math.sinh(number)


@spreadsheet_function("COSH")
def hyperbolic_cosine(number: Number) -> float:
    """The hyperbolic cosine."""
    return math.cosh(number)


@spreadsheet_function("TANH")
def hyperbolic_tangent(number: Number) -> float:
    """The hyperbolic tangent."""
    return math.tanh(number)


@spreadsheet_function("COTH")
def hyperbolic_cotangent(number: Number) -> float | ErrorValue:
    """The hyperbolic cotangent."""
    return 1 / math.tanh(number) if number else ErrorValue.DIV0


@spreadsheet_function("SECH")
def hyperbolic_secant(number: Number) -> float:
    """The hyperbolic secant."""
    return 1 / math.cosh(number) if abs(number) < 710 else 0.0


@spreadsheet_function("CSCH")
def hyperbolic_cosecant(number: Number) -> float | ErrorValue:
    """The hyperbolic cosecant."""
    if not number:
        return ErrorValue.DIV0
    return 1 / math.sinh(number) if abs(number) < 710 else 0.0


@spreadsheet_function("ASINH")
def inverse_hyperbolic_sine(number: Number) -> float:
    """The number whose hyperbolic sine a number is."""
    return math.asinh(number)


@spreadsheet_function("ACOSH")
def inverse_hyperbolic_cosine(number: Number) -> float | ErrorValue:
    """The number whose hyperbolic cosine a number is."""
    return math.acosh(number) if number >= 1 else ErrorValue.NUM


@spreadsheet_function("ATANH")
def inverse_hyperbolic_tangent(number: Number) -> float | ErrorValue:
    """The number whose hyperbolic tangent a number is."""
    return math.atanh(number) if abs(number) < 1 else ErrorValue.NUM


@spreadsheet_function("ACOTH")
def inverse_hyperbolic_cotangent(number: Number) -> float | ErrorValue:
    """The number whose hyperbolic cotangent a number is."""
    return math.atanh(1 / number) if abs(number) > 1 else ErrorValue.NUM


@spreadsheet_function("DEGREES")
def radians_to_degrees(angle: Number) -> float:
    """An angle in radians as degrees."""
    return math.degrees(angle)


@spreadsheet_function("RADIANS")
def degrees_to_radians(angle: Number) -> float:
    """An angle in degrees as radians."""
    return math.radians(angle)
