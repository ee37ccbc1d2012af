"""The formula graph of a workbook: every formula parsed once per shape, its precedents on demand."""

from __future__ import annotations

import bisect
from collections.abc import Iterator
from dataclasses import dataclass

from cellsim.cells import CellRef, RangeRef, range_of
from cellsim.errors import FormulaSyntaxError, Problem
from cellsim.formula.cache import FormulaCache
from cellsim.formula.tree import (
    Binary,
    Call,
    CellReference,
    NameReference,
    Node,
    Postfix,
    RangeReference,
    StructuredReference,
)
from cellsim.formula.walk import walk
from cellsim.functions.registry import find_function
from cellsim.graph.resolve import Resolver, bounds_of
from cellsim.values import ErrorValue, Scalar
from cellsim.workbook.model import DataTable, FormulaCell, Position, Sheet, Workbook

DYNAMIC_FUNCTIONS = frozenset({"OFFSET", "INDIRECT"})
"""Functions that read cells which no reference in the formula names."""

_MOST_NESTED_NAMES = 64


@dataclass(frozen=True, slots=True)
class Formula:
    """A formula cell ready to be evaluated.

    Attributes:
        cell: Where it stands.
        tree: Its syntax tree, shared by all formulas of the same shape; None if it does not parse.
        whole_arrays: Whether it is an array formula, in which ranges are taken item by item.
        area: The cells that an array formula fills, else None.
        dynamic: Whether the array formula spills as far as its result goes.
        data_table: The data table that starts here, else None.
        stored: The value in the file.
        has_stored: Whether the file holds a value.
        source: The formula as it was read.
    """

    cell: CellRef
    tree: Node | None
    whole_arrays: bool
    area: RangeRef | None
    dynamic: bool
    data_table: DataTable | None
    stored: Scalar
    has_stored: bool
    source: FormulaCell


@dataclass(frozen=True, slots=True)
class ShapeFacts:
    """What can be said of a tree without its place.

    Attributes:
        references: Plain references, in order.
        names: Names and structured references, in order.
        functions: Names of the functions that it calls.
        dynamic: Whether it reads cells that its references do not name.
    """

    references: tuple[CellReference | RangeReference, ...]
    names: tuple[NameReference | StructuredReference, ...]
    functions: frozenset[str]
    dynamic: bool


class Graph:
    """Formulas by place, and what each reads.

    Attributes:
        workbook: The workbook as read.
        resolver: What its references mean.
        sheets: Its sheets by title.
        formulas: Formulas by sheet and position.
        members: For cells inside an array, spill or data table: the position of its first cell.
        problems: Formulas that do not parse.
    """

    def __init__(self, workbook: Workbook) -> None:
        cache = FormulaCache()
        self.workbook = workbook
        self.resolver = Resolver(workbook, cache)
        self.cache = cache
        self.sheets: dict[str, Sheet] = {sheet.title: sheet for sheet in workbook.sheets}
        self.formulas: dict[str, dict[Position, Formula]] = {}
        self.members: dict[str, dict[Position, Position]] = {title: {} for title in self.sheets}
        self.problems: list[Problem] = []
        self._facts: dict[int, ShapeFacts] = {}
        self._columns: dict[str, dict[int, list[int]]] = {}
        self._in_area: dict[RangeRef, tuple[CellRef, ...]] = {}
        for sheet in workbook.sheets:
            self._add_sheet(sheet)

    def _add_sheet(self, sheet: Sheet) -> None:
        title = sheet.title
        formulas: dict[Position, Formula] = {}
        members = self.members[title]
        parse = self.cache.parse
        for position, source in sheet.formulas.items():
            cell = CellRef(title, *position)
            tree: Node | None = None
            if source.data_table is None:
                try:
                    tree = parse(source.text, source.origin[0], source.origin[1], "")
                except FormulaSyntaxError as error:
                    self.problems += [
                        Problem(str(cell), problem.message, problem.hint)
                        for problem in error.problems
                    ]
            area = source.data_table.area if source.data_table else source.array_area
            formulas[position] = Formula(
                cell=cell,
                tree=tree,
                whole_arrays=source.array_area is not None,
                area=area,
                dynamic=source.dynamic,
                data_table=source.data_table,
                stored=source.stored,
                has_stored=source.has_stored,
                source=source,
            )
            if area is not None and area.size > 1:
                for member in area.cells():
                    place = (member.row, member.column)
                    if place != position and place not in sheet.formulas:
                        members[place] = position
        self.formulas[title] = formulas
        columns: dict[int, list[int]] = {}
        for row, column in formulas:
            columns.setdefault(column, []).append(row)
        for row, column in members:
            columns.setdefault(column, []).append(row)
        for rows in columns.values():
            rows.sort()
        self._columns[title] = columns

    def formula(self, cell: CellRef) -> Formula | None:
        """The formula in a cell, None if it holds none."""
        formulas = self.formulas.get(cell.sheet)
        return formulas.get((cell.row, cell.column)) if formulas is not None else None

    def source_of(self, cell: CellRef) -> CellRef | None:
        """The formula cell that gives a cell its value: itself, an array's first cell, or None."""
        position = (cell.row, cell.column)
        if position in self.formulas[cell.sheet]:
            return cell
        first = self.members[cell.sheet].get(position)
        return CellRef(cell.sheet, *first) if first is not None else None

    def all_formulas(self) -> Iterator[Formula]:
        """Every formula, sheet by sheet in the order of the file."""
        for formulas in self.formulas.values():
            yield from formulas.values()

    def formula_cells_in(self, area: RangeRef) -> tuple[CellRef, ...]:
        """The formula cells that give values to cells of an area, each once."""
        found = self._in_area.get(area)
        if found is None:
            found = tuple(self._find_formula_cells(area))
            if area.size > 1:
                self._in_area[area] = found
        return found

    def _find_formula_cells(self, area: RangeRef) -> Iterator[CellRef]:
        columns = self._columns.get(area.sheet)
        if not columns:
            return
        members = self.members[area.sheet]
        seen: set[Position] = set()
        wanted: Iterator[int] | range = range(area.first_column, area.last_column + 1)
        if area.columns > len(columns):
            wanted = iter(sorted(c for c in columns if area.first_column <= c <= area.last_column))
        for column in wanted:
            rows = columns.get(column)
            if rows is None:
                continue
            start = bisect.bisect_left(rows, area.first_row)
            end = bisect.bisect_right(rows, area.last_row)
            for row in rows[start:end]:
                position = members.get((row, column), (row, column))
                if position not in seen:
                    seen.add(position)
                    yield CellRef(area.sheet, *position)

    def facts(self, tree: Node) -> ShapeFacts:
        """What can be said of a tree without its place; found once per tree."""
        facts = self._facts.get(id(tree))
        if facts is None:
            facts = _shape_facts(tree)
            self._facts[id(tree)] = facts  # trees live as long as the graph does
        return facts

    def precedents(self, formula: Formula) -> list[RangeRef]:
        """The areas that a formula's references name, defined names followed; no duplicates removed.

        What OFFSET, INDIRECT and computed range ends read is not among them.
        """
        if formula.data_table is not None:
            return self._data_table_precedents(formula)
        if formula.tree is None:
            return []
        found: list[RangeRef] = []
        self._collect(self.facts(formula.tree), formula.cell, found, 0)
        return found

    def areas_of(self, tree: Node, cell: CellRef) -> list[RangeRef]:
        """The areas that an expression's references name at a place, defined names followed."""
        found: list[RangeRef] = []
        self._collect(self.facts(tree), cell, found, 0)
        return found

    def _collect(self, facts: ShapeFacts, cell: CellRef, found: list[RangeRef], depth: int) -> None:
        resolver = self.resolver
        for reference in facts.references:
            prefix = reference.prefix
            if prefix is None:
                found.append(RangeRef(cell.sheet, *bounds_of(reference, cell.row, cell.column)))
            elif prefix.workbook is None:
                bounds = bounds_of(reference, cell.row, cell.column)
                sheets = resolver.sheets_of(prefix, cell.sheet) or ()
                found += [RangeRef(sheet, *bounds) for sheet in sheets]
        for name in facts.names:
            if isinstance(name, StructuredReference):
                reference_value = resolver.structured(name, cell)
                if not isinstance(reference_value, ErrorValue):
                    found.extend(reference_value.areas)
                continue
            record = resolver.name(name.name, name.prefix, cell.sheet)
            if record is not None:
                if record.tree is not None and depth < _MOST_NESTED_NAMES:
                    self._collect(self.facts(record.tree), cell, found, depth + 1)
            elif (table := resolver.table(name.name)) is not None:
                found.append(table.area)

    def _data_table_precedents(self, formula: Formula) -> list[RangeRef]:
        table = formula.data_table
        if table is None:
            return []
        area = table.area
        found = [
            RangeRef(
                area.sheet,
                area.first_row - 1,
                area.first_column - 1,
                area.first_row - 1,
                area.last_column,
            ),
            RangeRef(
                area.sheet,
                area.first_row,
                area.first_column - 1,
                area.last_row,
                area.first_column - 1,
            ),
        ]
        found += [
            range_of(CellRef(area.sheet, *position))
            for position in (table.row_input, table.column_input)
            if position is not None
        ]
        return found

    def is_dynamic(self, formula: Formula) -> bool:
        """Whether a formula reads cells that its references do not name, names followed."""
        return formula.data_table is not None or (
            formula.tree is not None
            and self._any(formula.tree, formula.cell, lambda facts: facts.dynamic, 0)
        )

    def reads_unnamed(self, tree: Node, cell: CellRef) -> bool:
        """Whether an expression reads cells that its references do not name, names followed."""
        return self._any(tree, cell, lambda facts: facts.dynamic, 0)

    def functions_of(self, formula: Formula) -> frozenset[str]:
        """Names of all functions that a formula calls, names followed."""
        if formula.tree is None:
            return frozenset()
        names: set[str] = set()

        def collect(facts: ShapeFacts) -> bool:
            names.update(facts.functions)
            return False

        self._any(formula.tree, formula.cell, collect, 0)
        return frozenset(names)

    def _any(self, tree: Node, cell: CellRef, test: object, depth: int) -> bool:
        facts = self.facts(tree)
        if test(facts):  # type: ignore[operator]
            return True
        if depth >= _MOST_NESTED_NAMES:
            return False
        for name in facts.names:
            if isinstance(name, NameReference):
                record = self.resolver.name(name.name, name.prefix, cell.sheet)
                if (
                    record is not None
                    and record.tree is not None
                    and self._any(record.tree, cell, test, depth + 1)
                ):
                    return True
        return False


def build_graph(workbook: Workbook) -> Graph:
    """Parse every formula of a workbook and index it; formulas that do not parse are kept aside."""
    return Graph(workbook)


def _shape_facts(tree: Node) -> ShapeFacts:
    references: list[CellReference | RangeReference] = []
    names: list[NameReference | StructuredReference] = []
    functions: set[str] = set()
    dynamic = False
    for node in walk(tree):
        if isinstance(node, (CellReference, RangeReference)):
            references.append(node)
        elif isinstance(node, (NameReference, StructuredReference)):
            names.append(node)
        elif isinstance(node, Call):
            functions.add(node.name)
            if find_function(node.name) is None:  # may be a defined name that holds a LAMBDA
                names.append(NameReference(None, node.name))
            dynamic = dynamic or node.name in DYNAMIC_FUNCTIONS
        elif (isinstance(node, Binary) and node.operator == ":") or (
            isinstance(node, Postfix) and node.operator == "#"
        ):
            dynamic = True
    return ShapeFacts(tuple(references), tuple(names), frozenset(functions), dynamic)
