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
from small_models import calculate

from cellsim.cells import CellRef
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
    Numeric,
    UnlowerableError,
    Varied,
)
from cellsim.program.numpy_backend import BlockEvaluator
from cellsim.values import ErrorValue, LambdaValue, Reference, Scalar, decode_error

Draws = Sequence[npt.NDArray[np.float64]]
Reader = Callable[[Sequence[npt.NDArray[np.generic]], int], Scalar]

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


def compile_cells(
    base: Calculation, inputs: Sequence[CellRef], wanted: Sequence[CellRef]
) -> Compiled:
    """Compile a model so that the wanted cells can be read with their types."""
    lowering = _ModelLowering(base, inputs, list(wanted), iterate=False)
    outputs: list[tuple[Operand, Kind]] = []
    readers = [_cell_reader(lowering, cell, outputs) for cell in wanted]
    needed = {operand.number for operand, _ in outputs if isinstance(operand, Register)}
    builder = lowering.builder
    instructions = eliminate_dead_code(builder.instructions, needed)
    program = Program(builder.inputs, instructions, tuple(outputs), builder.registers)
    return Compiled(program, readers, program.slow)


def _cell_reader(  # noqa: C901 - one case for each kind of lowered value
    lowering: _ModelLowering, cell: CellRef, outputs: list[tuple[Operand, Kind]]
) -> Reader:
    def slot(operand: Operand, kind: Kind) -> int:
        outputs.append((operand, kind))
        return len(outputs) - 1

    def reader(value: Lowered) -> Reader:
        emitter = lowering.emitter
        if isinstance(value, Known):
            content = value.value
            if isinstance(content, (Reference, LambdaValue)):
                raise UnlowerableError("no single value")
            return lambda _columns, _draw: content
        if isinstance(value, Numeric):
            number = slot(value.operand, Kind.NUMBER)
            return lambda columns, draw: _number(columns[number], draw)
        if isinstance(value, Flagged):
            flag = slot(emitter.number(value), Kind.NUMBER)
            return lambda columns, draw: _logical(columns[flag], draw)
        if isinstance(value, Choice):
            which = slot(emitter.number(Flagged(value.flag)), Kind.NUMBER)  # type: ignore[arg-type]
            then, otherwise = reader(value.then), reader(value.otherwise)

            def chosen(columns: Sequence[npt.NDArray[np.generic]], draw: int) -> Scalar:
                taken = _logical(columns[which], draw)
                if isinstance(taken, ErrorValue):
                    return taken
                return (then if taken else otherwise)(columns, draw)

            return chosen
        if isinstance(value, Varied):
            thing = slot(value.operand, Kind.OBJECT)
            return lambda columns, draw: columns[thing][draw]  # type: ignore[return-value]
        assert isinstance(value, Block)
        return reader(value.items[0])

    try:
        value = lowering.cell(cell)
        typed = reader(value)
        result, _ = lowering._as_output(value)
    except UnlowerableError as problem:
        number = slot(lowering._recalculated(cell, problem.reason), Kind.NUMBER)
        return lambda columns, draw: _AsResult(_number(columns[number], draw))  # type: ignore[return-value]
    number = slot(result, Kind.NUMBER)

    def both(columns: Sequence[npt.NDArray[np.generic]], draw: int) -> Scalar:
        exact, shown = typed(columns, draw), _number(columns[number], draw)
        if isinstance(exact, float):
            assert identical(shown, exact), f"shown as {shown!r}, held as {exact!r}"
        if isinstance(exact, ErrorValue):
            assert shown is exact, f"shown as {shown!r}, held as {exact!r}"
        return exact

    return both


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
            return True  # a result shows numbers only; test_results covers how others are shown
        found = found.number
    if type(found) is not type(wanted):
        return False
    if isinstance(found, float) and isinstance(wanted, float):
        return found == wanted or math.isclose(
            found, wanted, rel_tol=RELATIVE, abs_tol=RELATIVE * scale
        )
    return found == wanted
