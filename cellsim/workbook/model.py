"""The workbook as it was read: frozen records, no formula parsed, nothing calculated."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from cellsim.cells import RangeRef
from cellsim.values import Scalar

Position = tuple[int, int]
"""Row and column of a cell on its sheet, counted from 1."""


@dataclass(frozen=True, slots=True)
class DataTable:
    """A two-way or one-way data table (`TABLE`), stored at the top left cell of its interior.

    Attributes:
        area: The interior, without the row and column of arguments.
        row_input: The cell that takes the values of the row above the interior, or None.
        column_input: The cell that takes the values of the column left of it, or None.
    """

    area: RangeRef
    row_input: Position | None
    column_input: Position | None


@dataclass(frozen=True, slots=True)
class FormulaCell:
    """A cell that holds a formula.

    Attributes:
        text: The formula without its `=`; for a member of a shared formula, the master's text.
        origin: The position for which `text` was written: the cell's own, or the shared master's.
        stored: The value that the file holds for the cell; None if it holds none.
        array_area: The area of an array formula (legacy or spilled), at its first cell; else None.
        dynamic: Whether the array formula is a spilled one (`cm` metadata) and not a legacy one.
        data_table: The data table whose interior starts here, else None; then `text` is empty.
        has_stored: Whether the file holds a value at all (an empty text result is stored as "").
    """

    text: str
    origin: Position
    stored: Scalar
    array_area: RangeRef | None = None
    dynamic: bool = False
    data_table: DataTable | None = None
    has_stored: bool = True


@dataclass(frozen=True, slots=True)
class Table:
    """A table (list object).

    Attributes:
        name: Its name in formulas.
        area: The whole of it, headings and totals included.
        columns: The headings, as formulas spell them (line breaks kept).
        header_rows: 1, or 0 without a heading row.
        totals_rows: Number of totals rows.
    """

    name: str
    area: RangeRef
    columns: tuple[str, ...]
    header_rows: int = 1
    totals_rows: int = 0


@dataclass(frozen=True, slots=True)
class Sheet:
    """One worksheet; chart sheets are left out.

    Attributes:
        title: Its title as spelled in the file.
        state: "visible", "hidden" or "veryHidden".
        constants: Cells that hold no formula, blanks left out; dates are serial numbers.
        formulas: Cells that hold a formula.
        number_formats: Format codes other than General by position.
        hidden_rows: Rows hidden by hand or by a filter.
        filtered_rows: Rows hidden while an autofilter is active on the sheet.
        hidden_columns: Hidden columns.
        last_row: The last row that holds a value or a formula, 0 if none.
        last_column: The last column that holds a value or a formula, 0 if none.
    """

    title: str
    state: str
    constants: Mapping[Position, Scalar]
    formulas: Mapping[Position, FormulaCell]
    number_formats: Mapping[Position, str]
    hidden_rows: frozenset[int] = frozenset()
    filtered_rows: frozenset[int] = frozenset()
    hidden_columns: frozenset[int] = frozenset()
    last_row: int = 0
    last_column: int = 0


@dataclass(frozen=True, slots=True)
class DefinedName:
    """A defined name.

    Attributes:
        name: As spelled in the file.
        scope: The sheet's title for a sheet's own name, None for the workbook's.
        text: What it stands for, without `=`; relative references are relative to cell A1.
        hidden: Whether the program hides it from people.
    """

    name: str
    scope: str | None
    text: str
    hidden: bool = False


@dataclass(frozen=True, slots=True)
class ExternalWorkbook:
    """A linked workbook and what the file keeps of its values.

    Attributes:
        number: The number by which formulas name it: `[1]Sheet!A1`.
        target: Its path or address as stored.
        sheets: Cached values by sheet title and position.
        names: The external defined names with the text they stand for, empty where unknown.
    """

    number: int
    target: str
    sheets: Mapping[str, Mapping[Position, Scalar]]
    names: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Iteration:
    """Settings of iterative calculation.

    Attributes:
        enabled: Whether the workbook allows circular references.
        passes: The most passes.
        change: The largest change between passes at which it stops.
    """

    enabled: bool = False
    passes: int = 100
    change: float = 0.001


@dataclass(frozen=True, slots=True)
class Workbook:
    """Everything that cellsim keeps of a workbook.

    Attributes:
        path: The file.
        sheets: The worksheets in order.
        names: The defined names.
        tables: All tables of all sheets.
        date_1904: Whether serial number 0 is 1 January 1904.
        iteration: Settings of iterative calculation.
        external: The linked workbooks.
        last_saved: When the file says that it was last saved (UTC), or None.
        application: The program that says it wrote the file, or "".
        has_macros: Whether it carries macros, which are never run.
        full_precision: False where the workbook calculates with numbers as displayed.
    """

    path: Path
    sheets: tuple[Sheet, ...]
    names: tuple[DefinedName, ...] = ()
    tables: tuple[Table, ...] = ()
    date_1904: bool = False
    iteration: Iteration = Iteration()
    external: tuple[ExternalWorkbook, ...] = ()
    last_saved: dt.datetime | None = None
    application: str = ""
    has_macros: bool = False
    full_precision: bool = True
