"""One draw of a whole workbook: cells calculated on demand, each once, cycles solved by iteration."""

from __future__ import annotations

import datetime as dt
import threading
import zlib
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field

import numpy as np

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.cells import CellRef, RangeRef, range_of
from cellsim.functions.array_limits import LARGEST_ARRAY
from cellsim.graph.build import Formula, Graph
from cellsim.graph.order import strongly_connected
from cellsim.program.deep_stack import run_deeply
from cellsim.program.interpret import (
    Frame,
    UnsupportedFunctionError,
    dereference,
    evaluate_formula,
)
from cellsim.program.spill_areas import is_blocked, item_shown, spill_target
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value
from cellsim.workbook.model import Position

_MISSING = object()
_SETTLED = 1e-14
"""Cells of a cycle stand still when no pass moves one by more than this, relative above 1."""
_MORE_PASSES = 20
"""A cycle that still converges after the workbook's number of passes gets up to so many times it."""


class _CycleFoundError(Exception):
    """A cell was read while it was being calculated."""

    def __init__(self, cells: tuple[CellRef, ...]) -> None:
        super().__init__()
        self.cells = cells


@dataclass(frozen=True, slots=True)
class Cycle:
    """Cells that depend on each other in a circle.

    Attributes:
        cells: The cells, in the order in which they are calculated.
        passes: How many passes were made.
        settled: Whether the last pass still moved no cell.
    """

    cells: tuple[CellRef, ...]
    passes: int
    settled: bool


@dataclass(slots=True)
class Findings:
    """What a calculation met on its way.

    Attributes:
        unsupported: By formula cell, the function for which its stored value stands in.
        cycles: Circular chains that were solved by iteration.
    """

    unsupported: dict[CellRef, str] = field(default_factory=dict)
    cycles: list[Cycle] = field(default_factory=list)


class Calculation:
    """Values of a workbook's cells in one draw.

    Attributes:
        graph: The formulas.
        as_of: What NOW() returns.
        findings: What was met on the way.
        lock: To be held by threads that share a calculation.
    """

    def __init__(
        self,
        graph: Graph,
        *,
        as_of: dt.datetime,
        overrides: Mapping[CellRef, Scalar] | None = None,
        seed: int = 0,
    ) -> None:
        self._graph = graph
        self._as_of = as_of
        self._date_1904 = graph.workbook.date_1904
        self._seed = seed
        self.findings = Findings()
        self._values: dict[str, dict[Position, Scalar]] = {}
        self._overridden: frozenset[CellRef] = frozenset(overrides or ())
        for title, sheet in graph.sheets.items():
            values = dict(sheet.constants)
            for position in graph.members[title]:
                values.pop(position, None)
            self._values[title] = values
        for cell, value in (overrides or {}).items():
            self._values[cell.sheet][cell.row, cell.column] = value
        self._spills: dict[CellRef, Array] = {}
        self._areas: dict[RangeRef, Array] = {}
        self._ready: set[RangeRef] = set()
        self._active: dict[CellRef, None] = {}
        self._moving: frozenset[CellRef] = frozenset()  # cells of the cycle being solved
        self._moving_areas: dict[RangeRef, bool] = {}
        self.lock = threading.RLock()

    @property
    def graph(self) -> Graph:
        """The formulas."""
        return self._graph

    @property
    def date_1904(self) -> bool:
        """Whether serial number 0 is 1 January 1904."""
        return self._date_1904

    @property
    def as_of(self) -> dt.datetime:
        """What NOW() returns."""
        return self._as_of

    def cell_value(self, sheet: str, row: int, column: int) -> Scalar:
        """The value of one cell, calculated if it has not been yet; None for a blank."""
        values = self._values[sheet]
        position = (row, column)
        value = values.get(position, _MISSING)
        if value is not _MISSING:
            return value  # type: ignore[return-value]
        formula = self._graph.formulas[sheet].get(position)
        if formula is None:
            first = self._graph.members[sheet].get(position)
            if first is None:
                return None
            formula = self._graph.formulas[sheet].get(first)
            if formula is None:
                return None
        self._ensure(formula)
        return values.get(position)

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle; the same object as long as none of them changes.

        Raises:
            Fault: The rectangle is too large (#NUM!).
        """
        array = self._areas.get(area)
        if array is not None:
            return array
        clipped = self._graph.resolver.clip(area)
        if clipped.size > LARGEST_ARRAY:
            raise Fault(ErrorValue.NUM)
        pending = self._make_ready(clipped)
        get = self._values[clipped.sheet].get
        columns = range(clipped.first_column, clipped.last_column + 1)
        items = [
            get((row, column))
            for row in range(clipped.first_row, clipped.last_row + 1)
            for column in columns
        ]
        array = Array(clipped.rows, clipped.columns, items)
        if not pending:
            self._areas[area] = array
        return array

    def _make_ready(self, area: RangeRef) -> bool:
        """Calculate the formula cells of an area; whether some may still change (a cycle's)."""
        if area in self._ready:
            return False
        cells = self._graph.formula_cells_in(area)
        if self._moving:
            pending = self._moving_areas.get(area)
            if pending is None:
                pending = self._moving_areas[area] = not self._moving.isdisjoint(cells)
            if pending:
                return True
        for cell in cells:
            self.cell_value(*cell)
        self._ready.add(area)
        return False

    def spill_of(self, cell: CellRef) -> Value:
        """The cells that a formula's array fills, as a reference; #REF! if it holds no array formula.

        An array that has outgrown the area kept in the file is given as values.
        """
        value = self.cell_value(*cell)
        formula = self._graph.formula(cell)
        if formula is None or formula.area is None:
            return value if isinstance(value, ErrorValue) else ErrorValue.REF
        spill = self._spills.get(cell)
        if spill is None:
            return value if isinstance(value, ErrorValue) else Reference((formula.area,))
        if spill.rows > formula.area.rows or spill.columns > formula.area.columns:
            return spill
        return Reference((spill_target(cell, spill.rows, spill.columns),))

    def spill_area(self, formula: Formula) -> RangeRef:
        """The cells that a formula's array fills: one where it gives a single value or is blocked."""
        self.cell_value(*formula.cell)
        spill = self._spills.get(formula.cell)
        if spill is None:
            return range_of(formula.cell)
        return spill_target(formula.cell, spill.rows, spill.columns)

    def stream_for(self, cell: CellRef) -> Callable[[], float]:
        """A fixed stream of random numbers in [0, 1) for a cell's volatile functions."""
        place = zlib.crc32(cell.sheet.encode())
        key = np.random.SeedSequence((self._seed, place, cell.row, cell.column))
        generator = np.random.Generator(np.random.Philox(key))
        return lambda: float(generator.random())

    def _is_done(self, cell: CellRef) -> bool:
        return (cell.row, cell.column) in self._values[cell.sheet]

    def _ensure(self, formula: Formula) -> None:
        """Calculate a formula cell.

        Outermost, those that it reads come first, so that recursion stays shallow. A cell that turns
        out to be read while another is calculated (a computed reference) is calculated alone: what
        its references name but do not read must not be taken for a cycle.
        """
        if self._active:
            self._calculate(formula)
            return
        while not self._is_done(formula.cell):
            try:
                try:
                    self._calculate_in_order(formula)
                except RecursionError:
                    run_deeply(lambda: self._calculate_in_order(formula))
            except _CycleFoundError as found:
                self._solve_cycle(found.cells)

    def _calculate_in_order(self, start: Formula) -> None:
        waiting: dict[CellRef, None] = {start.cell: None}
        stack: list[tuple[Formula, Iterator[CellRef]]] = [(start, self._open_precedents(start))]
        while stack:
            formula, precedents = stack[-1]
            for cell in precedents:
                if cell in waiting or cell in self._active or self._is_done(cell):
                    continue  # a chain that closes here may still turn out not to be followed
                precedent = self._graph.formula(cell)
                if precedent is not None:
                    waiting[cell] = None
                    stack.append((precedent, self._open_precedents(precedent)))
                    break
            else:
                stack.pop()
                del waiting[formula.cell]
                if not self._is_done(formula.cell):
                    self._calculate(formula)

    def _open_precedents(self, formula: Formula) -> Iterator[CellRef]:
        for area in self._graph.precedents(formula):
            if area in self._ready:
                continue
            yield from self._graph.formula_cells_in(self._graph.resolver.clip(area))

    def _calculate(self, formula: Formula) -> None:
        cell = formula.cell
        if cell in self._active:
            chain = list(self._active)
            raise _CycleFoundError(tuple(chain[chain.index(cell) :]))
        self._active[cell] = None
        try:
            self._store(formula, self._value_of(formula))
        finally:
            del self._active[cell]

    def _value_of(self, formula: Formula) -> Value:
        if formula.data_table is not None:
            return self._data_table(formula)
        if formula.tree is None:
            return self._stand_in(formula, "")
        frame = Frame(self, formula.cell)
        try:
            value = evaluate_formula(formula.tree, frame, whole=formula.whole_arrays)
            return dereference(value, frame, whole=formula.whole_arrays)
        except UnsupportedFunctionError as missing:
            return self._stand_in(formula, missing.name)
        except Fault as fault:
            return fault.error

    def _stand_in(self, formula: Formula, function: str) -> Value:
        """The stored value of a formula that cannot be calculated, of all cells of an array."""
        self.findings.unsupported[formula.cell] = function
        return self._stored_value(formula)

    def _stored_value(self, formula: Formula) -> Value:
        if formula.area is None:
            return formula.stored if formula.has_stored else ErrorValue.NAME
        area = formula.area
        constants = self._graph.sheets[area.sheet].constants
        items: list[Scalar] = [
            formula.stored if cell == formula.cell else constants.get((cell.row, cell.column))
            for cell in area.cells()
        ]
        return Array(area.rows, area.columns, items)

    def _store(self, formula: Formula, value: Value) -> None:
        cell = formula.cell
        values = self._values[cell.sheet]
        if formula.area is None:
            values[cell.row, cell.column] = _single(value)
            return
        if formula.dynamic and isinstance(value, Array):
            target = spill_target(cell, value.rows, value.columns)
            if target != formula.area and is_blocked(self._graph, formula, target):
                value = ErrorValue.SPILL
        if formula.data_table is None:
            if isinstance(value, Array):
                self._spills[cell] = value
            else:
                self._spills.pop(cell, None)
        array = value if isinstance(value, Array) else Array(1, 1, [_single(value)])
        area = formula.area
        members = self._graph.members[cell.sheet]
        for row in range(area.rows):
            for column in range(area.columns):
                position = (area.first_row + row, area.first_column + column)
                if position == (cell.row, cell.column) or members.get(position) == (
                    cell.row,
                    cell.column,
                ):
                    item = item_shown(array, row, column, spilled=formula.dynamic)
                    values[position] = None if item is None else _shown(item)

    def _data_table(self, formula: Formula) -> Value:
        """The interior of a data table: the corner's formula with the input cells replaced."""
        table = formula.data_table
        if table is None:
            return ErrorValue.VALUE
        area = table.area
        sheet = area.sheet
        items: list[Scalar] = []
        for row in range(area.first_row, area.last_row + 1):
            for column in range(area.first_column, area.last_column + 1):
                overrides: dict[CellRef, Scalar] = {}
                if table.row_input is not None:
                    overrides[CellRef(sheet, *table.row_input)] = self.cell_value(
                        sheet, area.first_row - 1, column
                    )
                if table.column_input is not None:
                    overrides[CellRef(sheet, *table.column_input)] = self.cell_value(
                        sheet, row, area.first_column - 1
                    )
                if table.row_input is not None and table.column_input is not None:
                    result = CellRef(sheet, area.first_row - 1, area.first_column - 1)
                elif table.row_input is not None:
                    result = CellRef(sheet, row, area.first_column - 1)
                else:
                    result = CellRef(sheet, area.first_row - 1, column)
                items.append(self._with_overrides(overrides).cell_value(*result))
        return Array(area.rows, area.columns, items)

    def _with_overrides(self, overrides: Mapping[CellRef, Scalar]) -> Calculation:
        merged = {
            cell: self._values[cell.sheet].get((cell.row, cell.column)) for cell in self._overridden
        }
        merged.update(overrides)
        return Calculation(self._graph, as_of=self._as_of, overrides=merged, seed=self._seed)

    def _solve_cycle(self, chain: tuple[CellRef, ...]) -> None:
        """Solve the circular chain through some cells by Gauss-Seidel passes.

        Starts from zero, as a spreadsheet program does with a new formula; where that ends in
        errors, from the stored values, which a program would have kept.
        """
        cells = strongly_connected(self._graph, chain[0])
        if not set(chain) <= set(cells):
            cells = (*cells, *(cell for cell in chain if cell not in set(cells)))
        formulas = [formula for cell in cells if (formula := self._graph.formula(cell)) is not None]
        inside = set(cells)
        for formula in formulas:  # what feeds the cycle from outside comes first
            for precedent in self._open_precedents(formula):
                if precedent not in inside:
                    self.cell_value(*precedent)
        passes, settled = self._iterate(formulas, from_stored=False)
        if any(
            isinstance(self._values[f.cell.sheet][f.cell.row, f.cell.column], ErrorValue)
            for f in formulas
        ):
            stored = {f.cell: f.stored for f in formulas}
            if not any(isinstance(value, ErrorValue) for value in stored.values()):
                passes, settled = self._iterate(formulas, from_stored=True)
        self.findings.cycles.append(Cycle(tuple(cells), passes, settled))

    def _iterate(self, formulas: list[Formula], *, from_stored: bool) -> tuple[int, bool]:
        for formula in formulas:
            self._store(formula, self._stored_value(formula) if from_stored else 0.0)
        self._moving = frozenset(formula.cell for formula in formulas)
        self._moving_areas = {}
        limit = self._graph.workbook.iteration.passes
        last_change = float("inf")
        passes = 0
        try:
            while passes < limit * _MORE_PASSES:
                change = 0.0
                for formula in formulas:
                    change = max(change, self._pass_over(formula))
                passes += 1
                if change <= _SETTLED:
                    return passes, True
                if passes >= limit and not change < last_change:
                    break
                last_change = change
        finally:
            self._moving = frozenset()
        return passes, False

    def _pass_over(self, formula: Formula) -> float:
        """Calculate one cell of a cycle again; how far it moved, relative above 1."""
        cell = formula.cell
        before = self._values[cell.sheet][cell.row, cell.column]
        self._active[cell] = None
        try:
            self._store(formula, self._value_of(formula))
        finally:
            del self._active[cell]
        after = self._values[cell.sheet][cell.row, cell.column]
        if isinstance(before, float) and isinstance(after, float):
            return abs(after - before) / max(1.0, abs(after))
        return 0.0 if type(before) is type(after) and before == after else 1.0


def _shown(item: Value) -> Scalar:
    """What a cell of an array shows of an item: #VALUE! for a function."""
    return ErrorValue.VALUE if isinstance(item, LambdaValue) else _single(item)


def _single(value: Value) -> Scalar:
    """What a cell shows of a value: an array's first item, zero for a blank."""
    if isinstance(value, Array):
        value = value.items[0]
    if value is None:
        return 0.0
    if isinstance(value, LambdaValue):
        return ErrorValue.CALC
    if isinstance(value, Reference):
        return ErrorValue.VALUE
    return value


def calculate_all(calculation: Calculation) -> None:
    """Calculate every formula cell that has not been yet."""
    for formula in calculation.graph.all_formulas():
        calculation.cell_value(*formula.cell)
