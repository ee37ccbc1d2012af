"""Arrays of random numbers."""

from __future__ import annotations

import math

from cellsim.functions.array_limits import bounded_shape
from cellsim.functions.coercion import to_logical, to_number
from cellsim.functions.registry import AnyScalar, Context, spreadsheet_function
from cellsim.values import Array, ErrorValue, Scalar


@spreadsheet_function("RANDARRAY", volatile=True, least=0)
def random_array(
    context: Context,
    rows: AnyScalar = None,
    columns: AnyScalar = None,
    low: AnyScalar = None,
    high: AnyScalar = None,
    whole: AnyScalar = None,
) -> Array | ErrorValue:
    """Numbers between two limits, row by row from the cell's own fixed stream; whole ones if asked.

    One row, one column, the limits 0 and 1 stand in for what is left out.
    """
    tall, wide, least, most = (
        _number(value, default)
        for value, default in ((rows, 1.0), (columns, 1.0), (low, 0.0), (high, 1.0))
    )
    height, width = int(tall), int(wide)
    if height < 1 or width < 1:
        return ErrorValue.CALC if height == 0 or width == 0 else ErrorValue.VALUE
    bounded_shape(height, width)
    if least > most:
        return ErrorValue.VALUE
    size = height * width
    if not to_logical(whole):
        span = most - least
        return Array(height, width, [least + span * context.random() for _ in range(size)])
    if least != math.floor(least) or most != math.floor(most):
        return ErrorValue.VALUE
    count = most - least + 1
    items: list[Scalar] = [least + math.floor(context.random() * count) for _ in range(size)]
    return Array(height, width, items)


def _number(value: Scalar, default: float) -> float:
    return default if value is None else to_number(value)
