"""Expressions without a form over draws: the reference evaluator takes them one draw at a time.

Draws in which all cells that the expression reads are equal are evaluated once.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from cellsim.cells import CellRef, RangeRef
from cellsim.functions.dispatch import item_at
from cellsim.graph.build import Graph
from cellsim.program.calculation import Calculation
from cellsim.program.interpret import (
    Frame,
    UnsupportedFunctionError,
    dereference,
    evaluate,
    evaluate_formula,
)
from cellsim.program.ir import Expression, Kind, MixedChoice
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

    def __init__(
        self, base: Calculation, inputs: Sequence[CellRef], unread: frozenset[CellRef]
    ) -> None:
        self._base = base
        self._inputs = inputs
        self._unread = unread
        self._varying: dict[CellRef, Scalar] = {}
        self._calculation: Calculation | None = None

    def begin(self, varying: dict[CellRef, Scalar]) -> None:
        """Begin a draw with the values of the cells that are in registers."""
        self._varying = varying
        self._calculation = None

    def _calculated(self, cell: CellRef) -> Scalar:
        """A cell for which there is no register: calculated from the inputs of this draw."""
        if self._calculation is None:
            inputs = {cell: self._varying[cell] for cell in self._inputs}
            self._calculation = Calculation(
                self._base.graph, as_of=self._base.as_of, overrides=inputs
            )
        return self._calculation.cell_value(*cell)

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
        if cell in self._varying:
            return self._varying[cell]
        if cell in self._unread:
            return self._calculated(cell)
        return self._base.cell_value(sheet, row, column)

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle in this draw."""
        array = self._base.area_values(area)
        hits = [cell for cell in (*self._varying, *self._unread) if area.holds(*cell)]
        if not hits:
            return array
        items = list(array.items)
        for cell in hits:
            row, column = cell.row - area.first_row, cell.column - area.first_column
            if row < array.rows and column < array.columns:
                items[row * array.columns + column] = self.cell_value(*cell)
        return Array(array.rows, array.columns, items)

    def spill_of(self, cell: CellRef) -> Value:
        """The whole array that a cell's formula gives in the base case."""
        return self._base.spill_of(cell)

    def stream_for(self, cell: CellRef) -> Callable[[], float]:
        """A fixed stream of random numbers for a cell."""
        return self._base.stream_for(cell)


class ExpressionEvaluator:
    """Evaluates one expression for each draw of a block."""

    def __init__(self, expression: Expression, base: Calculation) -> None:
        self._expression = expression
        self._base = base
        self._grid = DrawGrid(base, expression.inputs, expression.unread)
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
            cell: scalar_of(column[draw] if isinstance(column, np.ndarray) else column, kind)
            for cell, column, kind in zip(self._cells, columns, self._kinds, strict=True)
        }
        expression = self._expression
        if expression.recalculate:
            calculation = Calculation(self._base.graph, as_of=self._base.as_of, overrides=varying)
            return _evaluate(expression, Frame(calculation, expression.cell))
        self._grid.begin(varying)
        return _evaluate(expression, Frame(self._grid, expression.cell))


def _evaluate(expression: Expression, frame: Frame) -> Scalar:
    try:
        entry = evaluate_formula if expression.shown else evaluate
        value = entry(expression.tree, frame, whole=expression.whole)
        value = dereference(value, frame, whole=expression.whole)
    except Fault as fault:
        return fault.error
    except UnsupportedFunctionError:
        return ErrorValue.NAME
    if isinstance(value, Array):
        row, column = expression.item
        value = item_at(value, row, column)
    return 0.0 if value is None and expression.shown else value


def choice_runner(
    choice: MixedChoice,
    flags: npt.NDArray[np.generic],
    sides: Sequence[npt.NDArray[np.generic] | None],
    out: npt.NDArray[np.object_],
) -> Callable[[], None]:
    """A function that puts one of two values of different types into each draw's object.

    Args:
        choice: The choice.
        flags: 1 for the first, 0 for the second, or an error; shape (draws,) or ().
        sides: The values of both, None for one that is the same in all draws.
        out: Where the values go.
    """
    parts = tuple(zip((choice.then, choice.otherwise), sides, strict=True))

    def step() -> None:
        for draw, flag in enumerate(np.broadcast_to(flags, out.shape)):
            if flag != flag:
                out[draw] = decode_error(float(flag))
                continue
            part, values = parts[0] if flag else parts[1]
            out[draw] = part.fixed if values is None else scalar_of(values[draw], part.kind)

    return step


def scalar_of(content: object, kind: Kind) -> Scalar:
    """What a register holds in one draw, as a value; errors are decoded."""
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
