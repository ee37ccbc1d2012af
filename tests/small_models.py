"""Small models in memory: cells by address, no file."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from pathlib import Path

from cellsim.cells import CellRef, RangeRef, parse_address, range_of
from cellsim.graph.build import Graph, build_graph
from cellsim.program.calculation import Calculation
from cellsim.values import Scalar
from cellsim.workbook.model import FormulaCell, Iteration, Position, Sheet, Workbook

TITLE = "Sheet1"
AS_OF = dt.datetime(2026, 1, 15)  # noqa: DTZ001  (a model has no time zone)


def place(address: str) -> CellRef:
    """The cell of an address on the one sheet."""
    position = parse_address(address)
    assert position is not None
    return CellRef(TITLE, *position)


def model_of(
    cells: Mapping[str, Scalar], *, iterate: bool = False, array: tuple[str, ...] = ()
) -> Graph:
    """The graph of a one-sheet model; text that starts with `=` is a formula.

    Args:
        cells: Values and formulas by address.
        iterate: Whether circular chains are solved.
        array: Array formulas, by address, or by area (`C1:D3`) for those that fill several cells.
    """
    areas = {area.partition(":")[0]: _area(area) for area in array}
    constants: dict[Position, Scalar] = {}
    formulas: dict[Position, FormulaCell] = {}
    for address, value in cells.items():
        cell = place(address)
        position = (cell.row, cell.column)
        if isinstance(value, str) and value.startswith("="):
            formulas[position] = FormulaCell(
                value[1:], position, None, areas.get(address), False, None, False
            )
        else:
            constants[position] = value if isinstance(value, bool) else _as_float(value)
    sheet = Sheet(TITLE, "visible", constants, formulas, {}, last_row=200, last_column=60)
    settings = Iteration(enabled=iterate, passes=100, change=0.001)
    return build_graph(Workbook(path=Path("model.xlsx"), sheets=(sheet,), iteration=settings))


def _area(text: str) -> RangeRef:
    first, _, last = text.partition(":")
    corner = place(last or first)
    return range_of(place(first))._replace(last_row=corner.row, last_column=corner.column)


def _as_float(value: object) -> Scalar:
    return float(value) if isinstance(value, int) else value  # type: ignore[return-value]


def calculate(graph: Graph, overrides: Mapping[CellRef, Scalar] | None = None) -> Calculation:
    """One draw of a model."""
    return Calculation(graph, as_of=AS_OF, overrides=overrides)
