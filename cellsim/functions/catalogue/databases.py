"""Database functions: a statistic of a field over the records that a block of criteria picks.

Source: ECMA-376 Part 1, 18.17.7 (DAVERAGE and its kin). Each row of the criteria is an alternative whose
cells must all hold; a blank cell holds for every record.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from cellsim.functions.criteria import Criterion, parse_criterion
from cellsim.functions.moments import average, total, variance
from cellsim.functions.registry import AnyScalar, CellArea, Context, spreadsheet_function
from cellsim.values import Array, ErrorValue, Fault, Scalar

Alternative = list[tuple[int, Criterion]]


def _records(
    context: Context, database: CellArea, field: Scalar, criteria: CellArea
) -> tuple[list[Scalar], bool]:
    """The field's values in the records picked, and whether a field was given."""
    table = context.area_values(database.areas[0])
    rows = table.to_rows()
    names = [_name(item) for item in rows[0]]
    column = _column(names, field)
    alternatives = _alternatives(names, context.area_values(criteria.areas[0]))
    picked = [
        row
        for row in rows[1:]
        if any(all(test.test(row[k]) for k, test in tests) for tests in alternatives)
    ]
    if column is None:
        return [1.0] * len(picked), False
    return [row[column] for row in picked], True


def _name(item: Scalar) -> str:
    if isinstance(item, float):
        return f"{item:.15g}"
    return "" if item is None else str(item).strip().casefold()


def _column(names: list[str], field: Scalar) -> int | None:
    """Where a field stands, from 0; None if none is given."""
    if isinstance(field, ErrorValue):
        raise Fault(field)
    if field is None:
        return None
    if isinstance(field, str):
        name = field.strip().casefold()
        if name in names:
            return names.index(name)
        raise Fault(ErrorValue.VALUE)
    place = int(field)
    if not 1 <= place <= len(names):
        raise Fault(ErrorValue.VALUE)
    return place - 1


def _alternatives(names: list[str], block: Array) -> list[Alternative]:
    """The rows of the criteria; a heading that is no field holds for every record."""
    rows = block.to_rows()
    heads = [_name(item) for item in rows[0]]
    found: list[Alternative] = []
    for row in rows[1:]:
        tests: Alternative = []
        for head, item in zip(heads, row, strict=True):
            if item is None or item == "" or head not in names:
                continue
            tests.append((names.index(head), _criterion(item)))
        found.append(tests)
    return found


def _criterion(item: Scalar) -> Criterion:
    """A criterion; text without an operator matches what begins with it."""
    if isinstance(item, str) and item[0] not in "=<>":
        return parse_criterion(item if item.endswith("*") else f"{item}*")
    return parse_criterion(item)


def _numbers(
    context: Context, database: CellArea, field: Scalar, criteria: CellArea
) -> list[float]:
    values, given = _records(context, database, field, criteria)
    if not given:
        raise Fault(ErrorValue.VALUE)
    for value in values:
        if isinstance(value, ErrorValue):
            raise Fault(value)
    return [value for value in values if type(value) is float]


@spreadsheet_function("DCOUNT")
def count_of_numbers(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The numbers in a field of the records picked; without a field, the records."""
    values, _ = _records(context, database, field, criteria)
    return float(sum(type(value) is float for value in values))


@spreadsheet_function("DCOUNTA")
def count_of_values(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """What is not blank in a field of the records picked; without a field, the records."""
    values, _ = _records(context, database, field, criteria)
    return float(sum(value is not None for value in values))


@spreadsheet_function("DGET")
def only_value(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> Scalar:
    """The field of the one record picked; #VALUE! if there is none, #NUM! if there are several."""
    values, given = _records(context, database, field, criteria)
    if not given or not values:
        return ErrorValue.VALUE
    return values[0] if len(values) == 1 else ErrorValue.NUM


@spreadsheet_function("DSUM")
def sum_of_field(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The sum of a field over the records picked."""
    return total(_numbers(context, database, field, criteria))


@spreadsheet_function("DPRODUCT")
def product_of_field(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The product of a field over the records picked."""
    numbers = _numbers(context, database, field, criteria)
    return math.prod(numbers) if numbers else 0.0


@spreadsheet_function("DMAX")
def largest_of_field(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The largest number of a field in the records picked; 0 if there is none."""
    return max(_numbers(context, database, field, criteria), default=0.0)


@spreadsheet_function("DMIN")
def smallest_of_field(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The smallest number of a field in the records picked; 0 if there is none."""
    return min(_numbers(context, database, field, criteria), default=0.0)


@spreadsheet_function("DAVERAGE")
def mean_of_field(
    context: Context, database: CellArea, field: AnyScalar, criteria: CellArea
) -> float:
    """The mean of a field over the records picked."""
    return average(_numbers(context, database, field, criteria))


def _spread(
    name: str, documentation: str, lost: int, finish: Callable[[float], float]
) -> Callable[..., float]:
    def kernel(context: Context, database: CellArea, field: AnyScalar, criteria: CellArea) -> float:
        return finish(variance(_numbers(context, database, field, criteria), lost))

    kernel.__doc__ = documentation
    return spreadsheet_function(name)(kernel)


sample_variance = _spread("DVAR", "The variance of a field, the records a sample.", 1, float)
population_variance = _spread(
    "DVARP", "The variance of a field, the records all there are.", 0, float
)
sample_deviation = _spread(
    "DSTDEV", "The standard deviation of a field, the records a sample.", 1, math.sqrt
)
population_deviation = _spread(
    "DSTDEVP", "The standard deviation of a field, the records all there are.", 0, math.sqrt
)
