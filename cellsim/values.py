"""What a cell can hold: numbers, text, logicals, blanks, errors, arrays, references, functions."""

from __future__ import annotations

import enum
import struct
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeAlias

from cellsim.cells import RangeRef


class ErrorValue(enum.Enum):
    """A spreadsheet error; `str()` is its spelling in a cell."""

    NULL = "#NULL!"
    DIV0 = "#DIV/0!"
    VALUE = "#VALUE!"
    REF = "#REF!"
    NAME = "#NAME?"
    NUM = "#NUM!"
    NA = "#N/A"
    GETTING_DATA = "#GETTING_DATA"
    SPILL = "#SPILL!"
    CONNECT = "#CONNECT!"
    BLOCKED = "#BLOCKED!"
    UNKNOWN = "#UNKNOWN!"
    FIELD = "#FIELD!"
    CALC = "#CALC!"
    BUSY = "#BUSY!"

    def __str__(self) -> str:
        return self.value


ERROR_BY_SPELLING = {error.value: error for error in ErrorValue}

Scalar: TypeAlias = float | str | bool | ErrorValue | None
"""One value: a number (dates are serial numbers), text, a logical, an error, or None for blank."""


class Fault(Exception):  # noqa: N818  (a spreadsheet error on its way up, not a Python failure)
    """Raised inside a function kernel to make its result a spreadsheet error."""

    def __init__(self, error: ErrorValue) -> None:
        super().__init__(str(error))
        self.error = error


class Array:
    """A rectangle of values, row by row.

    Attributes:
        rows: Number of rows, at least 1.
        columns: Number of columns, at least 1.
        items: The values, `rows * columns` of them, row by row.
    """

    __slots__ = ("columns", "items", "rows")

    def __init__(self, rows: int, columns: int, items: list[Scalar]) -> None:
        self.rows = rows
        self.columns = columns
        self.items = items

    @classmethod
    def from_rows(cls, rows: Sequence[Sequence[Scalar]]) -> Array:
        """An array from a sequence of rows of equal length."""
        return cls(len(rows), len(rows[0]), [item for row in rows for item in row])

    def at(self, row: int, column: int) -> Scalar:
        """The value at a row and column counted from 0."""
        return self.items[row * self.columns + column]

    def to_rows(self) -> list[list[Scalar]]:
        """The values as a list of rows."""
        width = self.columns
        return [self.items[k : k + width] for k in range(0, len(self.items), width)]

    def __eq__(self, other: object) -> bool:
        return (
            isinstance(other, Array)
            and (self.rows, self.columns) == (other.rows, other.columns)
            and self.items == other.items
        )

    __hash__ = None  # type: ignore[assignment]

    def __repr__(self) -> str:
        return f"Array({self.rows}x{self.columns}, {self.items[:12]!r})"


@dataclass(frozen=True, slots=True)
class Reference:
    """A reference to cells as a value: what OFFSET, INDIRECT, INDEX or a plain `A1:B2` gives.

    Attributes:
        areas: The rectangles, in order; more than one for a union or a 3-D reference.
    """

    areas: tuple[RangeRef, ...]


@dataclass(frozen=True, slots=True, eq=False)
class LambdaValue:
    """A function as a value (LAMBDA).

    Attributes:
        least: The fewest arguments it takes.
        most: The most arguments it takes.
        call: Calls it with evaluated arguments.
    """

    least: int
    most: int
    call: Callable[[Sequence[Value]], Value]


Value: TypeAlias = Scalar | Array | Reference | LambdaValue
"""Whatever an expression can give."""

_ERROR_ORDER = tuple(ErrorValue)
_QUIET_NAN = 0x7FF8_0000_0000_0000
_PAYLOADS: dict[ErrorValue, float] = {
    error: struct.unpack("<d", struct.pack("<Q", _QUIET_NAN | (code + 1)))[0]
    for code, error in enumerate(_ERROR_ORDER)
}


def encode_error(error: ErrorValue) -> float:
    """The quiet NaN that stands for the error in an array of numbers over draws."""
    return _PAYLOADS[error]


def decode_error(number: float) -> ErrorValue:
    """The error that a NaN stands for; #NUM! for a NaN without a known payload."""
    code = struct.unpack("<Q", struct.pack("<d", number))[0] & 0xFF
    return _ERROR_ORDER[code - 1] if 0 < code <= len(_ERROR_ORDER) else ErrorValue.NUM
