"""Cells and rectangular ranges, and the A1 notation in which people write them."""

from __future__ import annotations

import re
from functools import lru_cache
from typing import NamedTuple

LAST_ROW = 1_048_576
LAST_COLUMN = 16_384

_ADDRESS = re.compile(r"\$?([A-Za-z]{1,3})\$?([0-9]{1,7})\Z")
_PLAIN_TITLE = re.compile(r"[^\W\d][\w.]*\Z")
_LOOKS_LIKE_ADDRESS = re.compile(
    r"(?:[A-Za-z]{1,3}[0-9]{1,7}|[Rr][0-9]*(?:[Cc][0-9]*)?|[Cc][0-9]*)\Z"
)


class CellRef(NamedTuple):
    """One cell: the sheet's title as the workbook spells it, row and column counted from 1."""

    sheet: str
    row: int
    column: int

    @property
    def address(self) -> str:
        """The A1 address without the sheet, such as `C6`."""
        return f"{column_letters(self.column)}{self.row}"

    @property
    def key(self) -> str:
        """The name of the cell in results: title, `!`, address, unquoted."""
        return f"{self.sheet}!{column_letters(self.column)}{self.row}"

    def __str__(self) -> str:
        return f"{quote_title(self.sheet)}!{self.address}"


class RangeRef(NamedTuple):
    """A rectangle of cells on one sheet, all bounds inclusive and counted from 1."""

    sheet: str
    first_row: int
    first_column: int
    last_row: int
    last_column: int

    @property
    def rows(self) -> int:
        """The number of rows."""
        return self.last_row - self.first_row + 1

    @property
    def columns(self) -> int:
        """The number of columns."""
        return self.last_column - self.first_column + 1

    @property
    def size(self) -> int:
        """The number of cells."""
        return self.rows * self.columns

    @property
    def first(self) -> CellRef:
        """The top left cell."""
        return CellRef(self.sheet, self.first_row, self.first_column)

    @property
    def address(self) -> str:
        """The A1 address without the sheet, such as `C6:D9` or `C6`."""
        first = f"{column_letters(self.first_column)}{self.first_row}"
        if self.size == 1:
            return first
        return f"{first}:{column_letters(self.last_column)}{self.last_row}"

    def __str__(self) -> str:
        return f"{quote_title(self.sheet)}!{self.address}"

    def holds(self, sheet: str, row: int, column: int) -> bool:
        """Whether the cell lies in the rectangle."""
        return (
            self.first_row <= row <= self.last_row
            and self.first_column <= column <= self.last_column
            and self.sheet == sheet
        )

    def intersection(self, other: RangeRef) -> RangeRef | None:
        """The cells in both rectangles, or None."""
        area = RangeRef(
            self.sheet,
            max(self.first_row, other.first_row),
            max(self.first_column, other.first_column),
            min(self.last_row, other.last_row),
            min(self.last_column, other.last_column),
        )
        if self.sheet != other.sheet or area.rows < 1 or area.columns < 1:
            return None
        return area

    def cells(self) -> list[CellRef]:
        """Every cell, row by row; meant for ranges of bounded size."""
        return [
            CellRef(self.sheet, row, column)
            for row in range(self.first_row, self.last_row + 1)
            for column in range(self.first_column, self.last_column + 1)
        ]


def range_of(cell: CellRef) -> RangeRef:
    """The range that holds just this cell."""
    return RangeRef(cell.sheet, cell.row, cell.column, cell.row, cell.column)


@lru_cache(maxsize=LAST_COLUMN)
def column_letters(column: int) -> str:
    """Column 1 is `A`, 27 is `AA`."""
    letters = ""
    while column > 0:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


@lru_cache(maxsize=LAST_COLUMN)
def column_number(letters: str) -> int:
    """`A` is 1, `AA` is 27; any case."""
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number


def parse_address(text: str) -> tuple[int, int] | None:
    """Row and column of an A1 address such as `C6` or `$C$6`; None if it is none or off the sheet."""
    match = _ADDRESS.match(text)
    if match is None:
        return None
    column, row = column_number(match[1]), int(match[2])
    if not (1 <= row <= LAST_ROW and column <= LAST_COLUMN):
        return None
    return row, column


def quote_title(title: str) -> str:
    """A sheet's title as it must be written in a formula, quoted where needed."""
    if _PLAIN_TITLE.match(title) and not _LOOKS_LIKE_ADDRESS.match(title):
        return title
    return "'" + title.replace("'", "''") + "'"
