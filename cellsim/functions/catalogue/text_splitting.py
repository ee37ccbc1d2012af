"""Text cut at separators."""

from __future__ import annotations

import re

from cellsim.functions.coercion import to_text
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Logical,
    Operand,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Scalar


def _separators(context: Context, separators: Operand) -> list[str]:
    return [to_text(item) for item in values_of(separators, context).items]


def _pattern(separators: list[str], *, ignore_case: bool) -> re.Pattern[str]:
    """A pattern for any of some separators, at a place the longest."""
    ordered = sorted(separators, key=len, reverse=True)
    return re.compile("|".join(map(re.escape, ordered)), re.IGNORECASE if ignore_case else 0)


def _flag(number: int) -> bool:
    """A choice that is written as 0 or 1.

    Raises:
        Fault: It is neither (#VALUE!).
    """
    if number not in (0, 1):
        raise Fault(ErrorValue.VALUE)
    return number == 1


def _cut(
    text: str, separators: list[str], which: int, *, ignore_case: bool, to_end: bool
) -> tuple[int, int] | None:
    """Where a separator stands, counted from the start or, if negative, from the end.

    Raises:
        Fault: There cannot be so many (#VALUE!).
    """
    if which == 0 or abs(which) > max(len(text), 1):
        raise Fault(ErrorValue.VALUE)
    if "" in separators:  # an empty separator stands at the end from which one counts
        return (0, 0) if which > 0 else (len(text), len(text))
    matches = _pattern(separators, ignore_case=ignore_case).finditer(text)
    spots = [match.span() for match in matches]
    if to_end:
        spots = [(0, 0), *spots] if which < 0 else [*spots, (len(text), len(text))]
    place = which - 1 if which > 0 else which
    return spots[place] if -len(spots) <= place < len(spots) else None


@spreadsheet_function("TEXTBEFORE")
def text_before(
    context: Context,
    text: Text,
    separator: Operand,
    which: Whole = 1,
    ignore_case: Whole = 0,
    to_end: Whole = 0,
    missing: AnyScalar = ErrorValue.NA,
) -> Scalar:
    """The text before a separator."""
    wanted = _separators(context, separator)
    spot = _cut(text, wanted, which, ignore_case=_flag(ignore_case), to_end=_flag(to_end))
    return text[: spot[0]] if spot is not None else missing


@spreadsheet_function("TEXTAFTER")
def text_after(
    context: Context,
    text: Text,
    separator: Operand,
    which: Whole = 1,
    ignore_case: Whole = 0,
    to_end: Whole = 0,
    missing: AnyScalar = ErrorValue.NA,
) -> Scalar:
    """The text after a separator."""
    wanted = _separators(context, separator)
    spot = _cut(text, wanted, which, ignore_case=_flag(ignore_case), to_end=_flag(to_end))
    return text[spot[1] :] if spot is not None else missing


@spreadsheet_function("TEXTSPLIT")
def split_text(
    context: Context,
    text: Text,
    columns: Operand,
    rows: Operand | None = None,
    skip_empty: Logical = False,
    ignore_case: Whole = 0,
    padding: AnyScalar = ErrorValue.NA,
) -> Array | ErrorValue:
    """Text split into columns and rows."""
    at_columns = None if columns is None else _separators(context, columns)
    at_rows = None if rows is None else _separators(context, rows)
    if (at_columns is None and at_rows is None) or "" in [*(at_columns or ()), *(at_rows or ())]:
        return ErrorValue.VALUE
    either_case = _flag(ignore_case)
    lines = _split(text, at_rows, ignore_case=either_case)
    table = [_split(line, at_columns, ignore_case=either_case) for line in lines]
    if skip_empty:
        table = [[part for part in line if part] for line in table]
        table = [line for line in table if line] or [[""]]
    width = max(len(line) for line in table)
    return Array.from_rows([[*line, *[padding] * (width - len(line))] for line in table])


def _split(text: str, separators: list[str] | None, *, ignore_case: bool) -> list[str]:
    return (
        [text] if separators is None else _pattern(separators, ignore_case=ignore_case).split(text)
    )
