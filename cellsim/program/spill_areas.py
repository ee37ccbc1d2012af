"""Where a formula's array goes: what each cell of its area shows, and what stands in its way."""

from __future__ import annotations

from itertools import chain

from cellsim.cells import LAST_COLUMN, LAST_ROW, CellRef, RangeRef
from cellsim.functions.dispatch import item_at
from cellsim.graph.build import Formula, Graph
from cellsim.values import Array, Scalar
from cellsim.workbook.model import Position


def item_shown(array: Array, row: int, column: int, *, spilled: bool) -> Scalar:
    """What a cell of the area that an array formula fills shows; row and column count from 0.

    A blank item shows as zero. An array entered over a fixed area repeats a single row or column and
    leaves #N/A beyond its end; a spilled one leaves the cells beyond its end blank.
    """
    if spilled and (row >= array.rows or column >= array.columns):
        return None
    item = item_at(array, row, column)
    return 0.0 if item is None else item


def spill_target(cell: CellRef, rows: int, columns: int) -> RangeRef:
    """The cells that an array spills over from its first cell on."""
    return RangeRef(
        cell.sheet, cell.row, cell.column, cell.row + rows - 1, cell.column + columns - 1
    )


def is_blocked(graph: Graph, formula: Formula, target: RangeRef) -> bool:
    """Whether a constant, a formula, another array or the sheet's edge is in a spill's way."""
    if target.last_row > LAST_ROW or target.last_column > LAST_COLUMN:
        return True
    title = formula.cell.sheet
    formulas, members = graph.formulas[title], graph.members[title]
    constants = graph.sheets[title].constants
    own = (formula.cell.row, formula.cell.column)

    def in_the_way(position: Position) -> bool:
        if position == own:
            return False
        if position in formulas:
            return True
        first = members.get(position)
        return first != own if first is not None else position in constants

    if target.size <= len(formulas) + len(members) + len(constants):
        return any(in_the_way((cell.row, cell.column)) for cell in target.cells())
    return any(
        target.holds(title, *position) and in_the_way(position)
        for position in chain(formulas, members, constants)
    )
