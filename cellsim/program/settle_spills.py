"""Spilled arrays as large as they are now, not as they were when the file was saved."""

from __future__ import annotations

import dataclasses
import datetime as dt

from cellsim.cells import CellRef, RangeRef
from cellsim.graph.build import Graph, build_graph
from cellsim.program.calculation import Calculation
from cellsim.workbook.model import Sheet, Workbook

_MOST_ROUNDS = 20
"""Arrays whose sizes still move each other after so many rounds keep the last."""


def settle_spills(graph: Graph, *, as_of: dt.datetime) -> Graph:
    """The graph in which each spilled array fills the cells that it needs in the base case.

    A file may have been written by a program that does not calculate, or its constants may have changed
    since: the area that it names then is not that of the result. Cells that an array no longer fills
    become blank; of two arrays that want the same cells, the one that stands first in the file has
    them, and the other is #SPILL!.

    Args:
        graph: The formulas as read.
        as_of: What NOW() returns.
    """
    for _ in range(_MOST_ROUNDS):
        spilling = [f for f in graph.all_formulas() if f.dynamic and f.area is not None]
        if not spilling:
            return graph
        calculation = Calculation(graph, as_of=as_of)
        changed: dict[CellRef, RangeRef] = {}
        taken: list[RangeRef] = []
        for formula in spilling:
            area = calculation.spill_area(formula)
            if area != formula.area:
                if any(area.intersection(other) for other in taken):
                    area = RangeRef(
                        area.sheet, area.first_row, area.first_column, *formula.cell[1:]
                    )
                changed[formula.cell] = area
                taken.append(area)
        if not changed:
            return graph
        graph = build_graph(_with_areas(graph.workbook, changed))
    return graph


def _with_areas(workbook: Workbook, areas: dict[CellRef, RangeRef]) -> Workbook:
    sheets = tuple(
        _sheet_with_areas(sheet, {c: a for c, a in areas.items() if c.sheet == sheet.title})
        for sheet in workbook.sheets
    )
    return dataclasses.replace(workbook, sheets=sheets)


def _sheet_with_areas(sheet: Sheet, areas: dict[CellRef, RangeRef]) -> Sheet:
    if not areas:
        return sheet
    constants, formulas = dict(sheet.constants), dict(sheet.formulas)
    last_row, last_column = sheet.last_row, sheet.last_column
    for cell, area in areas.items():
        position = (cell.row, cell.column)
        source = formulas[position]
        if source.array_area is not None:
            for member in source.array_area.cells():
                if not area.holds(*member):
                    constants.pop((member.row, member.column), None)
        formulas[position] = dataclasses.replace(source, array_area=area)
        last_row, last_column = max(last_row, area.last_row), max(last_column, area.last_column)
    return dataclasses.replace(
        sheet,
        constants=constants,
        formulas=formulas,
        last_row=last_row,
        last_column=last_column,
    )
