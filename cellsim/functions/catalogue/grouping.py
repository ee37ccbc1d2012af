"""Summaries of rows by the values that they share.

The layout (headings, totals, the order of groups) is that of stored results; the arguments are described
in the documentation of the spreadsheet program that brought them in.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass

from cellsim.functions.coercion import first_error, numbers_in, to_logical, to_number
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    Function,
    Operand,
    Values,
    spreadsheet_function,
)
from cellsim.functions.value_order import ValueKey, sorted_places, value_key
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Scalar, Value


@spreadsheet_function("PERCENTOF")
def share_of_total(part: Values, whole: Values) -> float | ErrorValue:
    """The sum of a part divided by the sum of the whole; #NUM! where either holds an error."""
    if first_error(part) is not None or first_error(whole) is not None:
        return ErrorValue.NUM  # whatever the error is, as stored values show
    total = sum(numbers_in(whole))
    return ErrorValue.DIV0 if total == 0 else sum(numbers_in(part)) / total


_HEADERS_SHOWN = (2.0, 3.0)
_HEADERS_GIVEN = (1.0, 3.0)


@dataclass(frozen=True, slots=True)
class _Table:
    """Rows to be summarised.

    Attributes:
        fields: The fields of each row.
        values: The values of each row.
        keys: For each field, what orders it in each row.
        field_names: Headings of the fields; empty if none are shown.
        value_names: Headings of the values.
        columns: How many fields there are.
    """

    fields: list[list[Scalar]]
    values: list[list[Scalar]]
    keys: list[list[ValueKey]]
    field_names: list[Scalar]
    value_names: list[Scalar]
    columns: int


@dataclass(frozen=True, slots=True)
class _Group:
    """Rows that share their first fields.

    Attributes:
        places: The rows.
        level: How many fields they share.
        summary: A number or text for each column of values.
        parts: The groups inside, in order.
    """

    places: list[int]
    level: int
    summary: list[Scalar]
    parts: list[_Group]


@spreadsheet_function("GROUPBY")
def grouped_rows(
    context: Context,
    fields: ArrayValues,
    values: ArrayValues,
    function: Function,
    headers: Operand | None = None,
    totals: Operand | None = None,
    order: Operand | None = None,
    wanted: Operand | None = None,
    relationship: Operand | None = None,
) -> Array:
    """Rows that share their fields, each group's values summarised by a function.

    The function gets the values of a group and, if it needs a second argument, those of all rows.
    """
    table = _read(context, fields, values, _choice(context, headers, (0, 1, 2, 3)), wanted)
    depth = int(_single(context, totals, 1.0))
    as_table = _choice(context, relationship, (0, 1)) == 1
    if abs(depth) > table.columns or (as_table and abs(depth) > 1):
        raise Fault(ErrorValue.VALUE)
    count = table.columns + len(table.values[0])
    sorting = _sorting(context, order, table.columns, count)
    everything = list(range(len(table.fields)))

    def summary(places: Sequence[int]) -> list[Scalar]:
        return [
            _summarised(context, function, table.values, column, places)
            for column in range(len(table.values[0]))
        ]

    whole = _Group(everything, 0, summary(everything), [])
    whole.parts.extend(
        _leaves_as_table(table, everything, sorting, summary)
        if as_table
        else _parts(table, everything, 0, sorting, summary)
    )
    rows = [[*table.field_names, *table.value_names]] if table.field_names else []
    rows += _lines(table, whole, abs(depth), at_top=depth < 0)
    return Array.from_rows(rows)


def _single(context: Context, asked: Value, default: float) -> float:
    if asked is None:
        return default
    return to_number(values_of(asked, context).items[0], date_1904=context.date_1904)


def _choice(context: Context, asked: Value, choices: Sequence[int]) -> float | None:
    """One of some numbers, None for what is left out.

    Raises:
        Fault: It is none of them (#VALUE!).
    """
    if asked is None:
        return None
    number = _single(context, asked, 0.0)
    if number not in choices:
        raise Fault(ErrorValue.VALUE)
    return number


def _read(
    context: Context, fields: Array, values: Array, headers: float | None, wanted: Value
) -> _Table:
    """The rows that count and their headings.

    Headings are taken for given where the first value is text and the second a number.

    Raises:
        Fault: The arrays do not match (#VALUE!), or no row counts (#CALC!).
    """
    if fields.rows != values.rows:
        raise Fault(ErrorValue.VALUE)
    field_rows, value_rows = fields.to_rows(), values.to_rows()
    given = headers in _HEADERS_GIVEN
    if headers is None:
        given = (
            values.rows > 1
            and isinstance(values.at(0, 0), str)
            and isinstance(values.at(1, 0), float)
        )
    start = 1 if given else 0
    chosen = list(range(start, values.rows))
    if wanted is not None:
        mask = values_of(wanted, context)
        if (mask.rows, mask.columns) != (values.rows, 1):
            raise Fault(ErrorValue.VALUE)
        chosen = [place for place in chosen if to_logical(mask.items[place])]
    if not chosen:
        raise Fault(ErrorValue.CALC)
    field_names: list[Scalar] = []
    value_names: list[Scalar] = []
    if headers in _HEADERS_SHOWN:
        field_names = [f"Row Field {number}" for number in range(1, fields.columns + 1)]
        value_names = [f"Value {number}" for number in range(1, values.columns + 1)]
        if given:
            field_names, value_names = field_rows[0], value_rows[0]
    counted = [field_rows[place] for place in chosen]
    return _Table(
        fields=counted,
        values=[value_rows[place] for place in chosen],
        keys=[[value_key(row[level]) for row in counted] for level in range(fields.columns)],
        field_names=field_names,
        value_names=value_names,
        columns=fields.columns,
    )


def _sorting(context: Context, asked: Value, fields: int, count: int) -> list[int]:
    """By which columns groups are ordered, the first counting most; negative ones descend.

    Raises:
        Fault: There is no such column, or of several one holds values (#VALUE!).
    """
    if asked is None:
        return []
    numbers = [
        int(to_number(item, date_1904=context.date_1904))
        for item in values_of(asked, context).items
    ]
    most = count if len(numbers) == 1 else fields
    if any(number == 0 or abs(number) > most for number in numbers):
        raise Fault(ErrorValue.VALUE)
    return numbers


def _summarised(
    context: Context,
    function: LambdaValue,
    rows: list[list[Scalar]],
    column: int,
    places: Sequence[int],
) -> Scalar:
    """What the function gives for a column of values in some rows."""
    arguments: list[Value] = [Array(len(places), 1, [rows[place][column] for place in places])]
    if function.least > 1:
        arguments.append(Array(len(rows), 1, [row[column] for row in rows]))
    if not function.least <= len(arguments) <= function.most:
        raise Fault(ErrorValue.VALUE)
    try:
        found = values_of(function.call(arguments), context)
    except Fault as fault:
        return fault.error
    if found.rows * found.columns != 1:
        return ErrorValue.CALC
    return found.items[0]


_Summary = Callable[[Sequence[int]], list[Scalar]]


def _split(keys: Sequence[Sequence[ValueKey]], places: Sequence[int]) -> list[list[int]]:
    """Rows parted by their keys, in the order in which these are met."""
    found: dict[tuple[ValueKey, ...], list[int]] = {}
    for place in places:
        found.setdefault(tuple(column[place] for column in keys), []).append(place)
    return list(found.values())


def _parts(
    table: _Table, places: list[int], level: int, sorting: list[int], summary: _Summary
) -> list[_Group]:
    """The groups inside a group, each with those inside it: fields in a hierarchy."""
    if level == table.columns:
        return []
    groups = [
        _Group(
            inside,
            level + 1,
            summary(inside),
            _parts(table, inside, level + 1, sorting, summary),
        )
        for inside in _split([table.keys[level]], places)
    ]
    column = [table.keys[level][group.places[0]] for group in groups]
    by_value = next((number for number in sorting if abs(number) > table.columns), None)
    descending = -(level + 1) in sorting
    keys: list[tuple[Sequence[ValueKey], bool]] = [(column, descending)]
    if by_value is not None:
        keys.insert(0, (_summary_keys(groups, abs(by_value) - table.columns - 1), by_value < 0))
    return [groups[place] for place in sorted_places(len(groups), keys)]


def _leaves_as_table(
    table: _Table, places: list[int], sorting: list[int], summary: _Summary
) -> list[_Group]:
    """The innermost groups, ordered by their columns one after the other: fields side by side."""
    groups = [
        _Group(inside, table.columns, summary(inside), []) for inside in _split(table.keys, places)
    ]
    rest = [level + 1 for level in range(table.columns)]
    keys: list[tuple[Sequence[ValueKey], bool]] = []
    for number in [*sorting, *(level for level in rest if level not in map(abs, sorting))]:
        column = abs(number) - 1
        if column >= table.columns:
            keys.append((_summary_keys(groups, column - table.columns), number < 0))
        else:
            keys.append(([table.keys[column][g.places[0]] for g in groups], number < 0))
    return [groups[place] for place in sorted_places(len(groups), keys)]


def _summary_keys(groups: list[_Group], column: int) -> list[ValueKey]:
    return [value_key(group.summary[column]) for group in groups]


def _lines(table: _Table, group: _Group, depth: int, *, at_top: bool) -> Iterator[list[Scalar]]:
    """The lines of a group: its parts and, where it is asked for, its total before or after them."""
    names: list[Scalar] = list(table.fields[group.places[0]][: group.level])
    if group.level == table.columns:
        yield [*names, *group.summary]
        return
    has_total = group.level < depth
    if group.level == 0:
        names = ["Grand Total" if depth > 1 else "Total"]
    names += [""] * (table.columns - len(names))
    total = [*names, *group.summary]
    if has_total and at_top:
        yield total
    for part in group.parts:
        yield from _lines(table, part, depth, at_top=at_top)
    if has_total and not at_top:
        yield total
