"""Failed draws: counted by error, and some of them replayed to find where their error arose."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from cellsim.api.model import Model
from cellsim.cells import CellRef
from cellsim.formula.unparse import unparse
from cellsim.graph.build import Graph
from cellsim.program.calculation import Calculation
from cellsim.program.lower import OutputFormula, Target
from cellsim.results import FailedDraw, Failures
from cellsim.values import ErrorValue, decode_error

FloatArray = npt.NDArray[np.float64]

_EXAMPLES = 40
_EXAMPLES_A_KIND = 8
_LONGEST_CHAIN = 10_000


def trace_failures(
    model: Model,
    inputs: Sequence[tuple[str, CellRef]],
    outputs: Sequence[tuple[str, Target]],
    input_draws: FloatArray,
    output_draws: FloatArray,
) -> Failures:
    """Count the failed draws and trace some.

    Args:
        model: The model.
        inputs: Name and cell of each input.
        outputs: Name and target of each output.
        input_draws: Shape (inputs, draws).
        output_draws: Shape (outputs, draws), NaN in failed draws.
    """
    failed = np.isnan(output_draws)
    counts: dict[tuple[str, str], int] = {}
    examples: list[FailedDraw] = []
    for (name, target), row, values in zip(outputs, failed, output_draws, strict=True):
        draws = np.flatnonzero(row)
        if not len(draws):
            continue
        codes = np.ascontiguousarray(values[draws]).view(np.uint64)
        for code in np.unique(codes):
            places = draws[codes == code]
            error = decode_error(float(values[places[0]]))
            key = (name, str(error))
            counts[key] = counts.get(key, 0) + len(places)
            for draw in places[:_EXAMPLES_A_KIND]:
                if len(examples) < _EXAMPLES:
                    examples.append(
                        _replay(model, inputs, name, target, error, input_draws, int(draw))
                    )
    return Failures(int(failed.any(axis=0).sum()), counts, tuple(examples))


def _replay(
    model: Model,
    inputs: Sequence[tuple[str, CellRef]],
    name: str,
    target: Target,
    error: ErrorValue,
    input_draws: FloatArray,
    draw: int,
) -> FailedDraw:
    values = {cell: float(input_draws[k, draw]) for k, (_, cell) in enumerate(inputs)}
    calculation = Calculation(model.graph, as_of=model.base.as_of, overrides=values)
    origin = _origin(calculation, target)
    formula = model.graph.formula(origin) if origin is not None else None
    text = ""
    if formula is not None and formula.tree is not None:
        text = "=" + unparse(formula.tree, formula.cell.row, formula.cell.column)
    return FailedDraw(
        draw=draw + 1,
        output=name,
        error=str(error),
        place=str(origin) if origin is not None else "",
        formula=text,
        inputs={
            input_name: float(input_draws[k, draw]) for k, (input_name, _) in enumerate(inputs)
        },
    )


def _origin(calculation: Calculation, target: Target) -> CellRef | None:
    """The cell upstream of an output that is an error although none that it reads is one."""
    graph = calculation.graph
    cell: CellRef | None
    if isinstance(target, OutputFormula):
        areas = graph.areas_of(target.tree, target.cell)
        cell = _failing(calculation, [c for area in areas for c in graph.formula_cells_in(area)])
    else:
        cell = target
    if cell is None or not isinstance(calculation.cell_value(*cell), ErrorValue):
        return None
    seen: set[CellRef] = set()
    while cell not in seen and len(seen) < _LONGEST_CHAIN:
        seen.add(cell)
        earlier = _failing(calculation, _precedents(graph, cell))
        if earlier is None:
            return cell
        cell = earlier
    return cell


def _precedents(graph: Graph, cell: CellRef) -> list[CellRef]:
    formula = graph.formula(cell)
    if formula is None:
        return []
    return [
        source
        for area in graph.precedents(formula)
        for source in graph.formula_cells_in(graph.resolver.clip(area))
    ]


def _failing(calculation: Calculation, cells: Sequence[CellRef]) -> CellRef | None:
    for cell in cells:
        if isinstance(calculation.cell_value(*cell), ErrorValue):
            return cell
    return None
