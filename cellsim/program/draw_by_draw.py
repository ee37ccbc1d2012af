"""Expressions without a form over draws: the reference evaluator takes them one draw at a time.

Draws in which all cells that the expression reads are equal are evaluated once.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from cellsim.cells import CellRef, RangeRef
from cellsim.graph.build import Graph
from cellsim.program.calculation import Calculation
from cellsim.program.interpret import (
    Frame,
    UnsupportedFunctionError,
    dereference,
    evaluate,
    evaluate_formula,
)
from cellsim.program.ir import Expression, Kind
from cellsim.program.spill_areas import item_shown
from cellsim.values import (
    Array,
    ErrorValue,
    Fault,
    Scalar,
    Value,
    decode_error,
    encode_error,
)

FloatArray = npt.NDArray[np.float64]
_MOST_READS_COMPARED = 8
"""Draws are compared for equal reads only where an expression reads so few varying cells."""


class DrawGrid:
    """The cells of a workbook in one draw: those that vary from registers, others from the base case."""

    def __init__(self, base: Calculation) -> None:
        self._base = base
        self.varying: dict[CellRef, Scalar] = {}

    @property
    def graph(self) -> Graph:
        """The formulas."""
        return self._base.graph

    @property
    def date_1904(self) -> bool:
        """Whether serial number 0 is 1 January 1904."""
        return self._base.date_1904

    @property
    def as_of(self) -> dt.datetime:
        """What NOW() returns."""
        return self._base.as_of

    def cell_value(self, sheet: str, row: int, column: int) -> Scalar:
        """The value of one cell in this draw."""
        cell = CellRef(sheet, row, column)
        if cell in self.varying:
            return self.varying[cell]
        return self._base.cell_value(sheet, row, column)

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle in this draw."""
        array = self._base.area_values(area)
        hits = [cell for cell in self.varying if area.holds(*cell)]
        if not hits:
            return array
        items = list(array.items)
        for cell in hits:
            row, column = cell.row - area.first_row, cell.column - area.first_column
            if row < array.rows and column < array.columns:
                items[row * array.columns + column] = self.varying[cell]
        return Array(array.rows, array.columns, items)

    def spill_of(self, cell: CellRef) -> Value:
        """The array that a cell's formula gives: that of this draw if it spills, else the base case's."""
        formula = self._base.graph.formula(cell)
        if formula is None or not formula.dynamic or formula.tree is None:
            return self._base.spill_of(cell)
        frame = Frame(self, cell)
        value = dereference(evaluate_formula(formula.tree, frame, whole=True), frame, whole=True)
        return value if isinstance(value, (Array, ErrorValue)) else Array(1, 1, [value])

    def stream_for(self, cell: CellRef) -> Callable[[], float]:
        """A fixed stream of random numbers for a cell."""
        return self._base.stream_for(cell)


class ExpressionEvaluator:
    """Evaluates one expression for each draw of a block."""

    def __init__(self, expression: Expression, base: Calculation) -> None:
        self._expression = expression
        self._base = base
        self._grid = DrawGrid(base)
        self._cells = [cell for cell, _, _ in expression.reads]
        self._kinds = [kind for _, _, kind in expression.reads]

    def evaluate(
        self, columns: Sequence[npt.NDArray[np.generic] | float], draws: int
    ) -> list[Scalar]:
        """The value in each draw.

        Args:
            columns: The values of the cells that the expression reads: arrays of shape (draws,), or
                one number for all draws.
            draws: Number of draws.
        """
        representatives, places = _distinct(columns, draws)
        with self._base.lock:
            if representatives is None:
                return [self._value(columns, draw) for draw in range(draws)]
            values = [self._value(columns, int(draw)) for draw in representatives]
        return [values[place] for place in places]

    def _value(self, columns: Sequence[npt.NDArray[np.generic] | float], draw: int) -> Scalar:
        varying = {
            cell: _scalar(column[draw] if isinstance(column, np.ndarray) else column, kind)
            for cell, column, kind in zip(self._cells, columns, self._kinds, strict=True)
        }
        expression = self._expression
        if expression.recalculate:
            calculation = Calculation(self._base.graph, as_of=self._base.as_of, overrides=varying)
            return _evaluate(expression, Frame(calculation, expression.cell))
        self._grid.varying = varying
        return _evaluate(expression, Frame(self._grid, expression.cell))


def _evaluate(expression: Expression, frame: Frame) -> Scalar:
    try:
        value = evaluate(expression.tree, frame, whole=expression.whole)
        value = dereference(value, frame, whole=expression.whole)
    except Fault as fault:
        return fault.error
    except UnsupportedFunctionError:
        return ErrorValue.NAME
    if isinstance(value, Array):
        row, column = expression.item
        return item_shown(value, row, column, spilled=expression.spilled)
    return value


def _scalar(content: object, kind: Kind) -> Scalar:
    if kind is Kind.OBJECT:
        return content  # type: ignore[return-value]
    number = float(content)  # type: ignore[arg-type]
    if number != number:
        return decode_error(number)
    return bool(number) if kind is Kind.FLAG else number


def _distinct(
    columns: Sequence[npt.NDArray[np.generic] | float], draws: int
) -> tuple[npt.NDArray[np.intp] | None, npt.NDArray[np.intp]]:
    """Draws with distinct reads, and for each draw which of them it equals; None if not worth it."""
    arrays = [column for column in columns if isinstance(column, np.ndarray)]
    nothing = np.zeros(0, dtype=np.intp)
    if len(arrays) > _MOST_READS_COMPARED or any(array.dtype == object for array in arrays):
        return None, nothing
    if not arrays:
        return np.zeros(1, dtype=np.intp), np.zeros(draws, dtype=np.intp)
    bits = np.stack(
        [array.astype(np.float64, copy=False).view(np.uint64) for array in arrays], axis=1
    )
    _, first, inverse = np.unique(bits, axis=0, return_index=True, return_inverse=True)
    if len(first) * 2 > draws:
        return None, nothing
    return first, inverse.reshape(-1)


def as_numbers(values: Sequence[Scalar]) -> FloatArray:
    """Values as numbers, errors and anything that is no number encoded as errors."""
    return np.array([_as_number(value) for value in values], dtype=np.float64)


def _as_number(value: Scalar) -> float:
    if isinstance(value, bool):
        return float(value)
    if isinstance(value, float):
        return value
    if isinstance(value, ErrorValue):
        return encode_error(value)
    return 0.0 if value is None else encode_error(ErrorValue.VALUE)
