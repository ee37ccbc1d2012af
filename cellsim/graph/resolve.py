"""What the references of a formula stand for: sheets, names, tables and linked workbooks."""

from __future__ import annotations

from dataclasses import dataclass

from cellsim.cells import LAST_COLUMN, LAST_ROW, CellRef, RangeRef
from cellsim.errors import FormulaSyntaxError
from cellsim.formula.cache import FormulaCache
from cellsim.formula.tree import (
    CellReference,
    Node,
    RangeReference,
    SheetPrefix,
    StructuredReference,
)
from cellsim.values import Array, ErrorValue, Reference, Scalar
from cellsim.workbook.model import DefinedName, ExternalWorkbook, Table, Workbook


@dataclass(frozen=True, slots=True)
class NameRecord:
    """A defined name with its formula parsed.

    Attributes:
        definition: The name as the workbook has it.
        tree: Its formula, relative references relative to cell A1; None if it does not parse.
    """

    definition: DefinedName
    tree: Node | None


class Resolver:
    """Looks up what references mean in one workbook; all spellings are case-insensitive."""

    def __init__(self, workbook: Workbook, cache: FormulaCache) -> None:
        self._titles = [sheet.title for sheet in workbook.sheets]
        self._by_title = {title.casefold(): title for title in self._titles}
        self._tables = {table.name.casefold(): table for table in workbook.tables}
        self._tables_by_sheet: dict[str, list[Table]] = {}
        for table in workbook.tables:
            self._tables_by_sheet.setdefault(table.area.sheet, []).append(table)
        self._external = {link.number: link for link in workbook.external}
        self._external_titles = {
            link.number: {title.casefold(): title for title in link.sheets}
            for link in workbook.external
        }
        self._names: dict[tuple[str | None, str], NameRecord] = {}
        for definition in workbook.names:
            scope = definition.scope.casefold() if definition.scope is not None else None
            self._names[scope, definition.name.casefold()] = NameRecord(
                definition, _parse_name(definition, cache)
            )
        self.last_row = max((sheet.last_row for sheet in workbook.sheets), default=0) or 1
        self.last_column = max((sheet.last_column for sheet in workbook.sheets), default=0) or 1

    def titles(self) -> list[str]:
        """The sheets' titles in order."""
        return self._titles

    def sheet(self, title: str) -> str | None:
        """The title as the workbook spells it, None if there is no such sheet."""
        return self._by_title.get(title.casefold())

    def sheets_of(self, prefix: SheetPrefix | None, own: str) -> list[str] | None:
        """The sheets that a prefix names, None if one is missing; a 3-D prefix names several."""
        if prefix is None:
            return [own]
        first = self.sheet(prefix.first)
        if first is None:
            return None
        if prefix.last is None:
            return [first]
        last = self.sheet(prefix.last)
        if last is None:
            return None
        start, end = sorted((self._titles.index(first), self._titles.index(last)))
        return self._titles[start : end + 1]

    def name(self, name: str, prefix: SheetPrefix | None, own: str) -> NameRecord | None:
        """The defined name that is meant: the sheet's own first, then the workbook's."""
        key = name.casefold()
        scope = prefix.first.casefold() if prefix is not None and prefix.first else own.casefold()
        return self._names.get((scope, key)) or self._names.get((None, key))

    def names(self) -> list[NameRecord]:
        """All defined names."""
        return list(self._names.values())

    def table(self, name: str) -> Table | None:
        """The table of that name."""
        return self._tables.get(name.casefold())

    def table_at(self, cell: CellRef) -> Table | None:
        """The table that holds a cell."""
        for table in self._tables_by_sheet.get(cell.sheet, ()):
            if table.area.holds(*cell):
                return table
        return None

    def area(self, node: CellReference | RangeReference, cell: CellRef) -> Reference | ErrorValue:
        """The cells that a plain reference of a workbook's own sheet means for a formula's cell."""
        sheets = self.sheets_of(node.prefix, cell.sheet)
        if sheets is None:
            return ErrorValue.REF
        bounds = bounds_of(node, cell.row, cell.column)
        return Reference(tuple(RangeRef(sheet, *bounds) for sheet in sheets))

    def structured(self, node: StructuredReference, cell: CellRef) -> Reference | ErrorValue:
        """The cells that a structured reference means for a formula's cell."""
        table = self.table_at(cell) if node.table is None else self.table(node.table)
        if table is None:
            return ErrorValue.REF
        columns = _table_columns(table, node)
        rows = _table_rows(table, node.items, cell)
        if isinstance(rows, ErrorValue):
            return rows
        if columns is None or rows[0] > rows[1]:
            return ErrorValue.REF
        return Reference((RangeRef(table.area.sheet, rows[0], columns[0], rows[1], columns[1]),))

    def external(self, node: CellReference | RangeReference, cell: CellRef) -> Scalar | Array:
        """The cached values of a reference into a linked workbook; #REF! where the file has none.

        Ask `keeps_values` first: where the file keeps no values of a sheet at all, nothing can be said.
        """
        link = self.external_link(node.prefix)
        if link is None or node.prefix is None:
            return ErrorValue.REF
        title = self._external_titles[link.number].get(node.prefix.first.casefold())
        if title is None:
            return ErrorValue.REF
        values = link.sheets[title]
        first_row, first_column, last_row, last_column = bounds_of(node, cell.row, cell.column)
        if (first_row, first_column) == (last_row, last_column):
            return values.get((first_row, first_column))
        last_row = min(last_row, max((row for row, _ in values), default=first_row))
        last_column = min(last_column, max((column for _, column in values), default=first_column))
        last_row, last_column = max(last_row, first_row), max(last_column, first_column)
        items = [
            values.get((row, column))
            for row in range(first_row, last_row + 1)
            for column in range(first_column, last_column + 1)
        ]
        return Array(last_row - first_row + 1, last_column - first_column + 1, items)

    def keeps_values(self, prefix: SheetPrefix) -> bool:
        """Whether the file keeps values of the linked sheet that a prefix names."""
        link = self.external_link(prefix)
        return link is None or prefix.first.casefold() in self._external_titles[link.number]

    def external_link(self, prefix: SheetPrefix | None) -> ExternalWorkbook | None:
        """The linked workbook that a prefix names by its number."""
        if prefix is None or prefix.workbook is None or not prefix.workbook.isdigit():
            return None
        return self._external.get(int(prefix.workbook))

    def clip(self, area: RangeRef) -> RangeRef:
        """A whole column or row cut off where the workbook's cells end; other ranges as they are.

        All sheets are cut at the same place, so that two columns of different sheets still match.
        """
        last_row, last_column = area.last_row, area.last_column
        if last_row - area.first_row > _CLIP_ROWS:
            last_row = max(area.first_row, min(last_row, self.last_row))
        if last_column - area.first_column > _CLIP_COLUMNS:
            last_column = max(area.first_column, min(last_column, self.last_column))
        if (last_row, last_column) == (area.last_row, area.last_column):
            return area
        return RangeRef(area.sheet, area.first_row, area.first_column, last_row, last_column)


_CLIP_ROWS = 60_000
_CLIP_COLUMNS = 4_000


def bounds_of(
    node: CellReference | RangeReference, row: int, column: int
) -> tuple[int, int, int, int]:
    """First row, first column, last row, last column of a reference in a formula at a position.

    A relative reference that leaves the sheet comes in again on its other side.
    """
    if isinstance(node, CellReference):
        r, c = _corner(node, row, column)
        return r, c, r, c
    row_1, column_1 = _corner(node.first, row, column)
    row_2, column_2 = _corner(node.last, row, column)
    return min(row_1, row_2), min(column_1, column_2), max(row_1, row_2), max(column_1, column_2)


def _corner(node: CellReference, row: int, column: int) -> tuple[int, int]:
    r = node.row + row if node.row_relative else node.row
    c = node.column + column if node.column_relative else node.column
    if not 1 <= r <= LAST_ROW:
        r = (r - 1) % LAST_ROW + 1
    if not 1 <= c <= LAST_COLUMN:
        c = (c - 1) % LAST_COLUMN + 1
    return r, c


def _parse_name(definition: DefinedName, cache: FormulaCache) -> Node | None:
    try:
        return cache.parse(definition.text, 1, 1, definition.name)
    except FormulaSyntaxError:
        return None  # a name that no formula may use; one that does gives #NAME?


def _table_columns(table: Table, node: StructuredReference) -> tuple[int, int] | None:
    if node.first_column is None:
        return table.area.first_column, table.area.last_column
    wanted = [node.first_column, node.last_column or node.first_column]
    headings = {heading.casefold(): k for k, heading in reversed(list(enumerate(table.columns)))}
    positions = [headings.get(heading.casefold()) for heading in wanted]
    if positions[0] is None or positions[1] is None:
        return None
    first, last = sorted((positions[0], positions[1]))
    return table.area.first_column + first, table.area.first_column + last


def _table_rows(
    table: Table, items: tuple[str, ...], cell: CellRef
) -> tuple[int, int] | ErrorValue:
    area = table.area
    data = area.first_row + table.header_rows, area.last_row - table.totals_rows
    if "#THIS ROW" in items:
        if not data[0] <= cell.row <= data[1]:
            return ErrorValue.VALUE
        return cell.row, cell.row
    parts = {
        "#ALL": (area.first_row, area.last_row),
        "#DATA": data,
        "#HEADERS": (area.first_row, area.first_row + table.header_rows - 1),
        "#TOTALS": (area.last_row - table.totals_rows + 1, area.last_row),
    }
    chosen = [parts[item] for item in items if item in parts] or [data]
    return min(first for first, _ in chosen), max(last for _, last in chosen)
