"""One model twice: compiled and evaluated over draws, and recalculated one draw at a time.

The compiled side is read before a cell becomes a number in the results, so that text, logicals and
blanks are compared as what they are.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from small_models import calculate, model_of, place

from cellsim.cells import CellRef, column_letters
from cellsim.graph.build import Graph
from cellsim.program.calculation import Calculation
from cellsim.program.ir import Expression, Kind, Operand, Program, Register, eliminate_dead_code
from cellsim.program.lower import _ModelLowering
from cellsim.program.lowered import (
    Block,
    Choice,
    Flagged,
    Known,
    Lowered,
    UnlowerableError,
    Varied,
)
from cellsim.program.numpy_backend import BlockEvaluator
from cellsim.values import ErrorValue, LambdaValue, Reference, Scalar, decode_error

Draws = Sequence[npt.NDArray[np.float64]]
Columns = Sequence[npt.NDArray[np.generic]]
Reader = Callable[[Columns, int], Scalar]

RELATIVE = 1e-12


@dataclass(frozen=True)
class Compiled:
    """A model compiled for some cells.

    Attributes:
        program: The program; its outputs are whatever the readers need.
        readers: For each wanted cell, what gives its value in a draw.
        slow: What is left to the reference evaluator.
    """

    program: Program
    readers: list[Reader]
    slow: tuple[Expression, ...]


ALONE = 4
"""So many draws are also evaluated in blocks of one, in which no other draw can make the block fail."""


def compile_cells(
    base: Calculation, inputs: Sequence[CellRef], wanted: Sequence[CellRef]
) -> Compiled:
    """Compile a model so that the wanted cells can be read with their types."""
    lowering = _ModelLowering(base, inputs, list(wanted), iterate=False)
    made = _Readers(lowering)
    readers = [made.of_cell(cell) for cell in wanted]
    outputs = made.outputs
    needed = {operand.number for operand, _ in outputs if isinstance(operand, Register)}
    builder = lowering.builder
    instructions = eliminate_dead_code(builder.instructions, needed)
    program = Program(builder.inputs, instructions, tuple(outputs), builder.registers)
    return Compiled(program, readers, program.slow)


class _Readers:
    """Makes readers of a model's cells and collects the registers that they look into."""

    def __init__(self, lowering: _ModelLowering) -> None:
        self.lowering = lowering
        self.outputs: list[tuple[Operand, Kind]] = []

    def _slot(self, operand: Operand, kind: Kind) -> int:
        self.outputs.append((operand, kind))
        return len(self.outputs) - 1

    def of_cell(self, cell: CellRef) -> Reader:
        """What gives the value of a cell in a draw."""
        try:
            value = self.lowering.cell(cell)
            typed = self._typed(value)
            result, _ = self.lowering._as_output(value)
        except UnlowerableError as problem:
            operand = self.lowering._recalculated(cell, problem.reason)
            number = self._slot(operand, Kind.NUMBER)
            return lambda columns, draw: _AsResult(_number(columns[number], draw))  # type: ignore[return-value]
        shown = self._slot(result, Kind.NUMBER)

        def both(columns: Columns, draw: int) -> Scalar:
            exact, number = typed(columns, draw), _number(columns[shown], draw)
            if isinstance(exact, (float, ErrorValue)):
                assert identical(number, exact), f"shown as {number!r}, held as {exact!r}"
            return exact

        return both

    def _typed(self, value: Lowered) -> Reader:
        emitter = self.lowering.emitter
        if isinstance(value, Block):
            return self._typed(value.items[0])
        if isinstance(value, Known):
            content = value.value
            if isinstance(content, (Reference, LambdaValue)):
                raise UnlowerableError("no single value")
            return lambda _columns, _draw: content
        if isinstance(value, Choice):
            return self._chosen(value)
        if isinstance(value, Flagged):
            flag = self._slot(emitter.number(value), Kind.NUMBER)
            return lambda columns, draw: _logical(columns[flag], draw)
        if isinstance(value, Varied):
            thing = self._slot(value.operand, Kind.OBJECT)
            return lambda columns, draw: columns[thing][draw]  # type: ignore[return-value]
        number = self._slot(emitter.settled(value), Kind.NUMBER)
        return lambda columns, draw: _number(columns[number], draw)

    def _chosen(self, value: Choice) -> Reader:
        flag = self.lowering.emitter.number(Flagged(value.flag))
        which = self._slot(flag, Kind.NUMBER)
        then, otherwise = self._typed(value.then), self._typed(value.otherwise)

        def chosen(columns: Columns, draw: int) -> Scalar:
            taken = _logical(columns[which], draw)
            if isinstance(taken, ErrorValue):
                return taken
            return (then if taken else otherwise)(columns, draw)

        return chosen


class _AsResult:
    """A result of which only the number is known: the whole model was recalculated."""

    def __init__(self, number: Scalar) -> None:
        self.number = number

    def __repr__(self) -> str:
        return f"result {self.number!r}"


def _number(column: npt.NDArray[np.generic], draw: int) -> Scalar:
    value = float(column[draw] if column.ndim else column)  # type: ignore[arg-type]
    return value if value == value else decode_error(value)


def _logical(column: npt.NDArray[np.generic], draw: int) -> Scalar:
    value = _number(column, draw)
    return bool(value) if isinstance(value, float) else value


def over_draws(
    compiled: Compiled, base: Calculation, draws: Draws, block: int
) -> list[list[Scalar]]:
    """Every wanted cell in every draw, evaluated in blocks of so many draws."""
    evaluator = BlockEvaluator(compiled.program, base, block)
    columns = evaluator._outputs
    evaluator._outputs = []  # objects have no place among numbers: they are read from the buffers
    count = len(draws[0])
    found: list[list[Scalar]] = [[] for _ in compiled.readers]
    for start in range(0, count, block):
        size = min(block, count - start)
        evaluator.evaluate([values[start : start + size] for values in draws], np.empty((0, size)))
        for draw in range(size):
            for values, reader in zip(found, compiled.readers, strict=True):
                values.append(reader(columns, draw))
    return found


def one_at_a_time(
    graph: Graph, inputs: Sequence[CellRef], wanted: Sequence[CellRef], draws: Draws
) -> list[list[Scalar]]:
    """Every wanted cell in every draw, the whole model recalculated for each."""
    found: list[list[Scalar]] = [[] for _ in wanted]
    for draw in range(len(draws[0])):
        one = calculate(
            graph, {cell: float(v[draw]) for cell, v in zip(inputs, draws, strict=True)}
        )
        for values, cell in zip(found, wanted, strict=True):
            values.append(one.cell_value(*cell))
    return found


def identical(found: Scalar, wanted: Scalar) -> bool:
    """The same value of the same type, numbers bit for bit; the sign of a zero does not count."""
    return type(found) is type(wanted) and found == wanted


def agree(found: object, wanted: Scalar, *, scale: float = 0.0) -> bool:
    """The same value of the same type, numbers to 1e-12 relative, of a scale where one is given."""
    if isinstance(found, _AsResult):
        if isinstance(wanted, (bool, str)) or wanted is None:
            return True  # a result shows numbers only
        found = found.number
    if type(found) is not type(wanted):
        return False
    if isinstance(found, float) and isinstance(wanted, float):
        return found == wanted or math.isclose(
            found, wanted, rel_tol=RELATIVE, abs_tol=RELATIVE * scale
        )
    return found == wanted


INPUTS = [place(address) for address in ("A1", "A2", "A3", "A4")]
ORDINARY = [1.0, 0.0, -1.0, 0.5, 0.75, 1.5, 2.5, -0.3, 3.25, 0.2]
WHOLE = [2.0, 0.0, -4.0, 3.0, -1.0, 4.0, 0.0, 7.0, 1.0, 2.0]
WILD = [
    3.0,
    0.0,
    -2.5,
    1e300,
    -1e300,
    1e-300,
    45123.25,
    1e15,
    -1e-9,
    0.1,
    123456789.5,
    1e9,
    -1.0,
    0.5,
]
SMALL = [0.25, 0.0, 0.5, 0.125, -0.25, 1.0, 0.0, 0.375]


def draws_for(count: int) -> list[np.ndarray]:
    rng = np.random.default_rng(11)
    listed = max(len(ORDINARY), len(WHOLE), len(WILD), len(SMALL))
    columns = [np.resize(values, listed) for values in (ORDINARY, WHOLE, WILD, SMALL)]
    more = max(0, count - listed)
    drawn = [
        np.round(rng.normal(0.5, 1.5, more), 2),
        rng.integers(-3, 9, more).astype(float),
        rng.choice(WILD, more) * rng.choice([1.0, 0.5], more),
        rng.uniform(0, 1, more),
    ]
    return [np.concatenate(pair) for pair in zip(columns, drawn, strict=True)]


def mismatches(
    cells: dict[str, object],
    formulas: Sequence[tuple[str, str, tuple[int, int] | None]],
    draws: Draws,
    *,
    exactly: bool = False,
) -> list[str]:
    """What differs between the two ways of evaluating formulas beside some cells.

    Args:
        cells: The cells that the formulas read.
        formulas: A label, the formula, and rows and columns of an array formula.
        draws: The values of A1 to A4.
        exactly: Whether numbers must agree bit for bit.
    """
    cells = dict(cells)
    wanted: list[tuple[str, str, str]] = []
    arrays: list[str] = []
    column = 26
    for row, (label, formula, area) in enumerate(formulas, start=1):
        rows, columns = area or (1, 1)
        if area is None:
            cells[f"Z{row}"] = formula
            wanted.append((f"Z{row}", label, formula))
            continue
        corner = f"{column_letters(column + 1)}1"
        cells[corner] = formula
        arrays.append(f"{corner}:{column_letters(column + columns)}{rows}")
        for down in range(rows):
            for right in range(columns):
                address = f"{column_letters(column + 1 + right)}{down + 1}"
                wanted.append((address, f"{label}, item {down + 1},{right + 1}", formula))
        column += columns
    graph = model_of(cells, array=tuple(arrays))  # type: ignore[arg-type]
    base = calculate(graph)
    places = [place(address) for address, _, _ in wanted]
    singles = one_at_a_time(graph, INPUTS, places, draws)
    compiled = compile_cells(base, INPUTS, places)
    problems: list[str] = []
    same = identical if exactly else agree
    first = [values[:ALONE] for values in draws]
    for block, given in ((len(draws[0]), draws), (1, first)):
        found = over_draws(compiled, base, given, block)
        for (_, label, formula), over, single in zip(wanted, found, singles, strict=True):
            for draw, (value, alone) in enumerate(zip(over, single, strict=False)):
                if not same(value, alone):
                    inputs = ", ".join(repr(float(v[draw])) for v in draws)
                    problems.append(
                        f"{formula} [{label}] blocks of {block}, draw {draw} ({inputs}): "
                        f"{value!r} over draws, {alone!r} alone"
                    )
                    break
    return problems
