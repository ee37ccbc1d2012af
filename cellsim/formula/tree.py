"""The syntax tree of a formula: frozen nodes, references kept relative to the formula's own cell.

A relative row or column is stored as its distance from the cell that holds the formula, so that all
cells of a filled row share one tree: the tree says the shape, the cell's position says the rest.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from cellsim.values import ErrorValue, Scalar


@dataclass(frozen=True, slots=True)
class NumberLiteral:
    """A number as written, such as `1.5` or `2E-3`."""

    value: float


@dataclass(frozen=True, slots=True)
class TextLiteral:
    """Text between double quotes, the doubled quotes undone."""

    value: str


@dataclass(frozen=True, slots=True)
class LogicalLiteral:
    """TRUE or FALSE."""

    value: bool


@dataclass(frozen=True, slots=True)
class ErrorLiteral:
    """An error written in a formula, such as `#N/A`; `#REF!` also stands for a lost reference."""

    value: ErrorValue


@dataclass(frozen=True, slots=True)
class ArrayLiteral:
    """An array constant such as `{1,2;3,4}`, as rows of equal length."""

    rows: tuple[tuple[Scalar, ...], ...]


@dataclass(frozen=True, slots=True)
class MissingArgument:
    """An argument left out between two commas."""


@dataclass(frozen=True, slots=True)
class SheetPrefix:
    """What stands before the `!` of a reference.

    Attributes:
        workbook: What stands between square brackets (for a file, the link's number), or None.
        first: The sheet's title as written, unquoted; empty for a workbook-wide external name.
        last: The last sheet of a 3-D reference, or None.
    """

    workbook: str | None
    first: str
    last: str | None = None


@dataclass(frozen=True, slots=True)
class CellReference:
    """One cell.

    Attributes:
        prefix: The sheet, or None for the formula's own.
        row: The row from 1, or the distance from the formula's row if relative.
        column: The column from 1, or the distance from the formula's column if relative.
        row_relative: False where the row is written with `$`.
        column_relative: False where the column is written with `$`.
    """

    prefix: SheetPrefix | None
    row: int
    column: int
    row_relative: bool
    column_relative: bool


@dataclass(frozen=True, slots=True)
class RangeReference:
    """A range between two cells written in the formula, or whole columns or rows.

    Attributes:
        prefix: The sheet, or None for the formula's own; the corners carry no prefix.
        first: The first corner as written (the corners need not be in order).
        last: The second corner.
        whole: "columns" for `A:C` (rows 1 to the last, absolute), "rows" for `2:5`, else "".
    """

    prefix: SheetPrefix | None
    first: CellReference
    last: CellReference
    whole: str = ""


@dataclass(frozen=True, slots=True)
class NameReference:
    """A defined name, a LET or LAMBDA variable; `name` as written without `_xlpm.`."""

    prefix: SheetPrefix | None
    name: str


@dataclass(frozen=True, slots=True)
class StructuredReference:
    """A reference into a table such as `Sales[[#Data],[Net]:[Tax]]` or `[@Net]`.

    Attributes:
        table: The table's name, or None inside the table itself.
        items: The specifiers in upper case: "#ALL", "#DATA", "#HEADERS", "#TOTALS", "#THIS ROW";
            `[@...]` counts as "#THIS ROW"; empty means the data rows.
        first_column: The first column's heading with its escapes undone, or None for all columns.
        last_column: The last column's heading, or None for just the first.
        workbook: External workbook prefix or None.
    """

    table: str | None
    items: tuple[str, ...]
    first_column: str | None
    last_column: str | None
    workbook: str | None = None


@dataclass(frozen=True, slots=True)
class Unary:
    """A prefix operator: `-`, `+` or `@`."""

    operator: str
    operand: Node


@dataclass(frozen=True, slots=True)
class Postfix:
    """A postfix operator: `%`, or `#` for the spill range of a cell."""

    operator: str
    operand: Node


@dataclass(frozen=True, slots=True)
class Binary:
    """An infix operator.

    `operator` is one of `+ - * / ^ & = <> < <= > >=`, or of the reference operators: `:` (a range
    with a computed end), a single space (intersection), `,` (union).
    """

    operator: str
    left: Node
    right: Node


@dataclass(frozen=True, slots=True)
class Call:
    """A call by name; `name` in upper case without `_xlfn.`, `_xlws.` and the like."""

    name: str
    arguments: tuple[Node, ...]


@dataclass(frozen=True, slots=True)
class Invocation:
    """A call of something computed, such as `LAMBDA(x, x+1)(2)`."""

    function: Node
    arguments: tuple[Node, ...]


Node: TypeAlias = (
    NumberLiteral
    | TextLiteral
    | LogicalLiteral
    | ErrorLiteral
    | ArrayLiteral
    | MissingArgument
    | CellReference
    | RangeReference
    | NameReference
    | StructuredReference
    | Unary
    | Postfix
    | Binary
    | Call
    | Invocation
)
"""Any node of a formula's tree."""
