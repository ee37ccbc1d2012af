"""Compiling a model: the cells between inputs and outputs become one program over draws.

Cells are lowered on demand, those that they read first, so that a chain which only seems circular (a
branch never taken, a lookup over a block that holds the cell) is never followed.
"""

from __future__ import annotations

import bisect
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TypeAlias

from cellsim.cells import CellRef, RangeRef
from cellsim.errors import CircularReferenceError, Problem
from cellsim.formula.tree import CellReference, Node
from cellsim.graph.build import Formula, Graph
from cellsim.graph.order import strongly_connected
from cellsim.graph.slicing import affected_cells
from cellsim.program.calculation import Calculation
from cellsim.program.emit import Emitter
from cellsim.program.interpret import Frame
from cellsim.program.ir import (
    Builder,
    Expression,
    Instruction,
    Kind,
    Loop,
    Op,
    Operand,
    Program,
    Register,
    eliminate_dead_code,
)
from cellsim.program.lower_nodes import NodeLowering
from cellsim.program.lowered import Block, Known, Lowered, Numeric, UnlowerableError
from cellsim.values import Reference

LARGEST_BLOCK = 2_000_000
"""More cells than this in one varying range are not unrolled into a program."""


@dataclass(frozen=True, slots=True)
class OutputFormula:
    """An output that is a formula over the model.

    Attributes:
        tree: The formula.
        cell: The place for which relative references and the sheet are meant.
    """

    tree: Node
    cell: CellRef


Target: TypeAlias = CellRef | OutputFormula


class _CycleFoundError(Exception):
    """A cell was read while it was being lowered."""

    def __init__(self, cell: CellRef) -> None:
        super().__init__()
        self.cell = cell


@dataclass(frozen=True, slots=True)
class Compiled:
    """A compiled model and what was met on the way.

    Attributes:
        program: The program.
        varying: The formula cells between inputs and outputs.
        loops: Circular chains that are solved per draw.
    """

    program: Program
    varying: frozenset[CellRef]
    loops: tuple[tuple[CellRef, ...], ...]


def compile_program(
    base: Calculation,
    inputs: Sequence[CellRef],
    outputs: Sequence[Target],
    *,
    iterate: bool,
) -> Compiled:
    """Compile what lies between inputs and outputs.

    Args:
        base: The base case; what does not vary is taken from it.
        inputs: The input cells; a formula in one of them is replaced.
        outputs: What is wanted.
        iterate: Whether circular chains are solved by iteration.

    Raises:
        CircularReferenceError: Cells depend on each other and `iterate` is false.
    """
    return _ModelLowering(base, inputs, outputs, iterate=iterate).compile(outputs)


class _ModelLowering:
    """Lowers cells on demand; what `NodeLowering` sees as the model's cells."""

    def __init__(
        self,
        base: Calculation,
        inputs: Sequence[CellRef],
        outputs: Sequence[Target],
        *,
        iterate: bool,
    ) -> None:
        self.base = base
        self.graph: Graph = base.graph
        self.builder = Builder(inputs)
        self.emitter = Emitter(self.builder, date_1904=base.date_1904)
        self._iterate = iterate
        self._lowered: dict[CellRef, Lowered] = {
            cell: Numeric(Register(number)) for number, cell in enumerate(inputs)
        }
        self._inputs = frozenset(inputs)
        self._affected = affected_cells(self.graph, inputs, _target_cells(self.graph, outputs))
        self._varying = self._with_members()
        self._columns = _column_index(self._varying)
        self._varying_areas: dict[RangeRef, tuple[CellRef, ...]] = {}
        self._blocks: dict[RangeRef, Block] = {}
        self._active: dict[CellRef, None] = {}
        self._open_shapes: set[CellRef] = set()
        self._loops: list[tuple[CellRef, ...]] = []
        self._in_loop = False

    def compile(self, outputs: Sequence[Target]) -> Compiled:
        """Lower the outputs and all that they need."""
        results = tuple(self._output(target) for target in outputs)
        needed = {operand.number for operand, _ in results if isinstance(operand, Register)}
        instructions = eliminate_dead_code(self.builder.instructions, needed)
        program = Program(self.builder.inputs, instructions, results, self.builder.registers)
        return Compiled(program, self._affected, tuple(self._loops))

    def _output(self, target: Target) -> tuple[Operand, Kind]:
        try:
            if isinstance(target, CellRef):
                value = self.cell(target)
            else:
                lowering = NodeLowering(self, target.cell)
                value = lowering.operand(target.tree, whole=False)
            return self._as_output(value)
        except UnlowerableError as problem:
            return self._recalculated(target, problem.reason), Kind.NUMBER

    def _as_output(self, value: Lowered) -> tuple[Operand, Kind]:
        if isinstance(value, Block):
            value = value.items[0]
        if isinstance(value, Numeric):
            return self.emitter.settled(value), Kind.NUMBER
        return self.emitter.number(value), Kind.NUMBER

    def _recalculated(self, target: Target, reason: str) -> Operand:
        """An output for which the whole model is calculated again in every draw."""
        cell = target if isinstance(target, CellRef) else target.cell
        tree = (
            CellReference(None, cell.row, cell.column, False, False)
            if isinstance(target, CellRef)
            else target.tree
        )
        reads = tuple((c, self._input_register(c), Kind.NUMBER) for c in self.builder.inputs)
        expression = Expression(tree, cell, False, reads, reason, (0, 0), recalculate=True)
        return self.builder.emit_expression(expression, Kind.NUMBER)

    def _input_register(self, cell: CellRef) -> Register:
        return Register(self.builder.inputs.index(cell))

    # What NodeLowering asks for.

    def frame(self, cell: CellRef) -> Frame:
        """A cell's surroundings in the base case."""
        return Frame(self.base, cell)

    def varies(self, cell: CellRef) -> bool:
        """Whether a cell changes from draw to draw."""
        return cell in self._varying

    def varying_in(self, area: RangeRef) -> Sequence[CellRef]:
        """The cells of an area that change from draw to draw."""
        if area.first_row == area.last_row and area.first_column == area.last_column:
            cell = area.first
            return (cell,) if cell in self._varying else ()
        found = self._varying_areas.get(area)
        if found is None:
            found = tuple(_cells_in(self._columns, area))
            self._varying_areas[area] = found
        return found

    def has_fixed_shape(self, cell: CellRef) -> bool:
        """Whether the array of a formula cell fills the same cells in every draw."""
        self.cell(cell)
        return cell not in self._open_shapes

    def all_varying(self, reader: CellRef) -> Sequence[CellRef]:
        """All varying cells but those that depend on the reader."""
        dependents = affected_cells(self.graph, [reader], self._affected)
        return [
            cell
            for cell in self._varying
            if cell != reader
            and (self.graph.source_of(cell) or cell) not in dependents
            and cell not in self._active
        ]

    def area_block(self, area: RangeRef) -> Block:
        """The values of a rectangle.

        Raises:
            UnlowerableError: It is too large to be unrolled.
        """
        block = self._blocks.get(area)
        if block is not None:
            return block
        clipped = self.graph.resolver.clip(area)
        if clipped.size > LARGEST_BLOCK:
            raise UnlowerableError("a range too large to unroll")
        varying = self.varying_in(clipped)
        if len(varying) * 4 < clipped.size:
            values = self.base_items(clipped, varying)
        else:
            values = [self.cell(cell) for cell in clipped.cells()]
        block = Block(clipped.rows, clipped.columns, tuple(values))
        if not self._in_loop:
            self._blocks[area] = block
        return block

    def base_items(self, area: RangeRef, varying: Sequence[CellRef]) -> list[Lowered]:
        """The items of an area of which few cells vary."""
        items: list[Lowered] = []
        wanted = set(varying)
        for cell in area.cells():
            if cell in wanted:
                items.append(self.cell(cell))
            else:
                items.append(Known(self.base.cell_value(*cell)))
        return items

    def cell(self, cell: CellRef) -> Lowered:
        """The value of a cell.

        Raises:
            UnlowerableError: It depends on what has no form over draws.
        """
        found = self._lowered.get(cell)
        if found is not None:
            return found
        if cell not in self._varying:
            return Known(self.base.cell_value(*cell))
        source = self.graph.source_of(cell)
        formula = self.graph.formula(source) if source is not None else None
        if formula is None:
            return Known(self.base.cell_value(*cell))
        while cell not in self._lowered:
            outermost = not self._active
            try:
                self._lower_in_order(formula)
            except _CycleFoundError as found_cycle:
                if not outermost:
                    raise
                self._lower_cycle(found_cycle.cell)
        return self._lowered[cell]

    # Order.

    def _lower_in_order(self, start: Formula) -> None:
        waiting: dict[CellRef, None] = {start.cell: None}
        stack: list[tuple[Formula, Iterator[CellRef]]] = [(start, self._open_precedents(start))]
        while stack:
            formula, precedents = stack[-1]
            for cell in precedents:
                if cell in waiting or cell in self._active or cell in self._lowered:
                    continue
                precedent = self.graph.formula(cell)
                if precedent is not None:
                    waiting[cell] = None
                    stack.append((precedent, self._open_precedents(precedent)))
                    break
            else:
                stack.pop()
                del waiting[formula.cell]
                if formula.cell not in self._lowered:
                    self._lower_formula(formula)

    def _open_precedents(self, formula: Formula) -> Iterator[CellRef]:
        for area in self.graph.precedents(formula):
            for cell in self.varying_in(self.graph.resolver.clip(area)):
                if cell not in self._lowered:
                    yield self.graph.source_of(cell) or cell

    def _lower_formula(self, formula: Formula) -> None:
        cell = formula.cell
        if cell in self._active:
            raise _CycleFoundError(cell)
        self._active[cell] = None
        try:
            for place, value in self._formula_values(formula):
                self._lowered[place] = value
        finally:
            del self._active[cell]

    def _formula_values(self, formula: Formula) -> list[tuple[CellRef, Lowered]]:
        if formula.tree is None:
            raise UnlowerableError("a data table, or a formula that does not parse")
        lowering = NodeLowering(self, formula.cell)
        whole = formula.whole_arrays
        area = formula.area
        places = [formula.cell] if area is None else area.cells()
        try:
            value = lowering.dereference(lowering.formula(formula.tree, whole=whole), whole=whole)
        except UnlowerableError as problem:
            if formula.dynamic:
                self._open_shapes.add(formula.cell)
            return [
                (
                    place,
                    lowering.interpreted(
                        formula.tree,
                        whole=whole,
                        reason=problem.reason,
                        item=(place.row - formula.cell.row, place.column - formula.cell.column),
                        spilled=formula.dynamic,
                    ),
                )
                for place in places
            ]
        if not isinstance(value, Block):
            return [(place, _shown(value)) for place in places]
        if area is None:
            return [(formula.cell, _shown(value.items[0]))]
        return [
            (
                place,
                _shown(
                    _spread(value, place.row - area.first_row, place.column - area.first_column)
                ),
            )
            for place in places
        ]

    # Cycles.

    def _lower_cycle(self, start: CellRef) -> None:
        chain = [cell for cell in strongly_connected(self.graph, start) if cell in self._affected]
        if not self._iterate:
            raise CircularReferenceError(
                Problem(
                    str(start),
                    f"the cells {', '.join(str(cell) for cell in chain[:8])}"
                    f"{' and more' if len(chain) > 8 else ''} depend on each other in a circle, "
                    "and the workbook does not allow iterative calculation",
                    "switch on iterative calculation in the workbook, or add `iterate = true` under [model]",
                )
            )
        if self._in_loop or (len(chain) < 2 and start not in chain):
            raise UnlowerableError("a circular chain through computed references")
        formulas = [formula for cell in chain if (formula := self.graph.formula(cell)) is not None]
        inside = {formula.cell for formula in formulas}
        for formula in formulas:
            for precedent in self._open_precedents(formula):
                if precedent not in inside:
                    self.cell(precedent)
        self._loops.append(tuple(chain))
        self._emit_loop(formulas, inside)

    def _emit_loop(self, formulas: list[Formula], inside: set[CellRef]) -> None:
        feedback = self._read_early(formulas, inside)
        carried = {cell: self.builder.new_register() for cell in feedback}
        for cell, register in carried.items():
            self._lowered[cell] = Numeric(register)
        self.builder.open_loop()
        self._in_loop = True
        try:
            for formula in formulas:
                for place, value in self._formula_values(formula):
                    self._lowered[place] = value
            results = tuple(self._loop_result(self._lowered[cell]) for cell in carried)
        except _CycleFoundError:
            raise UnlowerableError("a circular chain through computed references") from None
        finally:
            self._in_loop = False
            body = self.builder.close_loop()
        needed = {operand.number for operand in results if isinstance(operand, Register)}
        body = eliminate_dead_code(body, needed)
        for formula in formulas:
            for place in [formula.cell] if formula.area is None else formula.area.cells():
                self._lowered.pop(place, None)
        for cell, register in carried.items():
            self._lowered[cell] = Numeric(register)
        loop = Loop(
            carried=tuple(register.number for register in carried.values()),
            start=tuple(self._start_value(cell) for cell in carried),
            body=body,
            results=results,
            passes=self.graph.workbook.iteration.passes,
            cells=tuple(formula.cell for formula in formulas),
        )
        self.builder.emit_loop(loop, _read_from_outside(loop))

    def _read_early(self, formulas: list[Formula], inside: set[CellRef]) -> list[CellRef]:
        """The cells of a chain that are read before their turn comes in a pass."""
        done: set[CellRef] = set()
        early: dict[CellRef, None] = {}
        for formula in formulas:
            for area in self.graph.precedents(formula):
                for cell in self.varying_in(self.graph.resolver.clip(area)):
                    source = self.graph.source_of(cell) or cell
                    if source in inside and source not in done:
                        early[cell] = None
            done.add(formula.cell)
        return list(early)

    def _loop_result(self, value: Lowered) -> Operand:
        if isinstance(value, Numeric) or (
            isinstance(value, Known) and isinstance(value.value, float)
        ):
            return self.emitter.exact_number(value)
        raise UnlowerableError("a circular chain through text or logicals")

    def _start_value(self, cell: CellRef) -> float:
        value = self.base.cell_value(*cell)
        return value if isinstance(value, float) else 0.0

    def _with_members(self) -> frozenset[CellRef]:
        """The inputs, the affected formula cells, and the cells inside their arrays."""
        varying = set(self._affected) | self._inputs
        for cell in self._affected:
            formula = self.graph.formula(cell)
            if formula is not None and formula.area is not None:
                members = self.graph.members[cell.sheet]
                position = (cell.row, cell.column)
                varying.update(
                    member
                    for member in formula.area.cells()
                    if members.get((member.row, member.column)) == position
                    and member not in self._inputs
                )
        return frozenset(varying)


def _target_cells(graph: Graph, outputs: Sequence[Target]) -> list[CellRef]:
    cells: list[CellRef] = []
    for target in outputs:
        if isinstance(target, CellRef):
            cells.append(target)
            continue
        for area in graph.areas_of(target.tree, target.cell):
            clipped = graph.resolver.clip(area)
            cells += graph.formula_cells_in(clipped)
        if graph.facts(target.tree).dynamic:
            cells += [formula.cell for formula in graph.all_formulas()]
    return cells


def _shown(value: Lowered) -> Lowered:
    """What a cell shows of a value: zero for a blank."""
    if isinstance(value, Known):
        if value.value is None:
            return Known(0.0)
        if isinstance(value.value, Reference):
            raise UnlowerableError("a reference to several areas")
    return value


def _spread(block: Block, row: int, column: int) -> Lowered:
    row = 0 if block.rows == 1 else row
    column = 0 if block.columns == 1 else column
    if row >= block.rows or column >= block.columns:
        raise UnlowerableError("an array smaller than its area")
    return block.items[row * block.columns + column]


def _column_index(cells: frozenset[CellRef]) -> Mapping[str, Mapping[int, list[int]]]:
    index: dict[str, dict[int, list[int]]] = {}
    for cell in cells:
        index.setdefault(cell.sheet, {}).setdefault(cell.column, []).append(cell.row)
    for columns in index.values():
        for rows in columns.values():
            rows.sort()
    return index


def _cells_in(index: Mapping[str, Mapping[int, list[int]]], area: RangeRef) -> Iterator[CellRef]:
    columns = index.get(area.sheet)
    if not columns:
        return
    for column in sorted(columns):
        if area.first_column <= column <= area.last_column:
            rows = columns[column]
            start = bisect.bisect_left(rows, area.first_row)
            end = bisect.bisect_right(rows, area.last_row)
            for row in rows[start:end]:
                yield CellRef(area.sheet, row, column)


def _read_from_outside(loop: Loop) -> tuple[Operand, ...]:
    """The registers that a loop's body reads and neither writes nor carries."""
    inside = set(loop.carried)
    outside: dict[Operand, None] = {}
    for instruction in loop.body:
        for operand in instruction.operands:
            if isinstance(operand, Register) and operand.number not in inside:
                outside[operand] = None
        inside.add(instruction.target)
    for operand in loop.results:
        if isinstance(operand, Register) and operand.number not in inside:
            outside[operand] = None
    return tuple(outside)


def instruction_count(instructions: Sequence[Instruction]) -> int:
    """How many instructions a program has, those inside loops included."""
    return sum(
        1 + (len(instruction.detail.body) if instruction.op is Op.LOOP else 0)
        for instruction in instructions
    )
