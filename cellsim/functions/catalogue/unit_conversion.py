"""Conversion between units of measurement."""

from __future__ import annotations

from cellsim.functions.conversions import find_conversion
from cellsim.functions.registry import Number, Text, spreadsheet_function
from cellsim.values import ErrorValue, Fault


@spreadsheet_function("CONVERT", strict=True)
def converted(number: Number, from_unit: Text, to_unit: Text) -> float:
    """A number in one unit of measurement, in another (#N/A if they do not fit)."""
    conversion = find_conversion(from_unit, to_unit)
    if conversion is None:
        raise Fault(ErrorValue.NA)
    return (number * conversion.factor + conversion.shift) / conversion.divisor
