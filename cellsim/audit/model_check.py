"""The model check: every formula recalculated and compared with the value that the file stores."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence

from cellsim.cells import CellRef
from cellsim.formula.unparse import unparse
from cellsim.functions.catalogue.unsupported import unsupported_reason
from cellsim.functions.registry import find_function
from cellsim.graph.build import Formula, Graph
from cellsim.graph.slicing import affected_cells
from cellsim.program.calculation import Calculation, Cycle
from cellsim.program.interpret import UNKNOWN_LINK
from cellsim.results import Disagreement, ModelCheck
from cellsim.values import Scalar
from cellsim.workbook.model import Workbook

TOLERANCE = 1e-9
"""Numbers agree within this, relative, absolute below 1."""


def check_model(calculation: Calculation) -> ModelCheck:
    """Compare a finished calculation with the stored values.

    Left out are formulas that are volatile or depend on a volatile one, those for which the file stores
    no value, and those that are not calculated because of a function that is not supported: they are
    counted by function.
    """
    graph = calculation.graph
    volatile = volatile_cells(graph)
    stood_in = calculation.findings.unsupported
    compared = agreeing = without_value = 0
    wrong: dict[CellRef, tuple[Formula, Scalar]] = {}
    for formula in graph.all_formulas():
        cell = formula.cell
        if cell in volatile:
            continue
        if cell in stood_in:
            continue  # a copy of the stored value proves nothing
        if not formula.has_stored:
            without_value += 1
            continue
        compared += 1
        found = calculation.cell_value(*cell)
        if agrees(formula.stored, found):
            agreeing += 1
        else:
            wrong[cell] = formula, found
    return ModelCheck(
        compared=compared,
        agreeing=agreeing,
        volatile=len(volatile),
        without_value=without_value,
        disagreements=tuple(_disagreements(graph, wrong)),
        unsupported=_unsupported(calculation.findings.unsupported.values()),
        notes=tuple(_notes(graph, calculation)),
    )


def agrees(stored: Scalar, found: Scalar) -> bool:
    """Whether a recalculated value is the stored one: numbers within the tolerance, others equal."""
    if isinstance(stored, float) and isinstance(found, float):
        return abs(stored - found) <= TOLERANCE * max(1.0, abs(stored))
    if stored in (None, "") and (found in (None, "") or (isinstance(found, float) and found == 0)):
        return True
    return type(stored) is type(found) and stored == found


def volatile_cells(graph: Graph) -> frozenset[CellRef]:
    """The formula cells that call a volatile function, and those that depend on one."""
    sources: list[CellRef] = []
    everything: list[CellRef] = []
    for formula in graph.all_formulas():
        everything.append(formula.cell)
        if any(_changes_by_itself(name) for name in graph.functions_of(formula)):
            sources.append(formula.cell)
    if not sources:
        return frozenset()
    return affected_cells(graph, sources, everything, count_dynamic=False) | frozenset(sources)


def _changes_by_itself(name: str) -> bool:
    """Whether a function's value changes without its arguments; OFFSET and INDIRECT only look so."""
    function = find_function(name)
    return function is not None and function.volatile and not function.gives_reference


def _disagreements(
    graph: Graph, wrong: dict[CellRef, tuple[Formula, Scalar]]
) -> Iterable[Disagreement]:
    """Roots first: the cells that read no other cell that disagrees."""
    rows = []
    for cell, (formula, found) in wrong.items():
        reads = (
            source
            for area in graph.precedents(formula)
            for source in graph.formula_cells_in(graph.resolver.clip(area))
        )
        root = not any(source in wrong and source != cell for source in reads)
        text = "=" + (
            unparse(formula.tree, cell.row, cell.column)
            if formula.tree is not None
            else formula.source.text
        )
        rows.append(Disagreement(str(cell), text, formula.stored, found, root))
    return sorted(rows, key=lambda row: not row.root)


def _unsupported(names: Iterable[str]) -> tuple[tuple[str, int, str], ...]:
    counts = Counter(names)
    return tuple((name, count, reason_for(name)) for name, count in counts.most_common())


def reason_for(name: str) -> str:
    """Why a function is not calculated, for the user."""
    if not name:
        return "the formula could not be read"
    if name == UNKNOWN_LINK:
        return "the file keeps no values of the linked workbook's sheet"
    return (
        unsupported_reason(name) or "no such function is known: a macro or an add-in may define it"
    )


def _notes(graph: Graph, calculation: Calculation) -> Iterable[str]:
    workbook: Workbook = graph.workbook
    if workbook.has_macros:
        yield "The workbook carries macros; they are not run."
    if workbook.external:
        yield (
            f"The workbook links to {len(workbook.external)} other workbook"
            f"{'s' if len(workbook.external) > 1 else ''}; the values kept in the file are used."
        )
    if not workbook.full_precision:
        yield "The workbook is set to calculate with numbers as displayed; full precision is used here."
    for problem in graph.problems:
        yield f"A formula could not be read, its stored value is used: {problem}"
    allowed = "" if workbook.iteration.enabled else ", although iterative calculation is off"
    for settled in (True, False):
        cycles = [c for c in calculation.findings.cycles if c.settled == settled]
        if cycles:
            yield f"{_circles(cycles)}{allowed}."


def _circles(cycles: Sequence[Cycle]) -> str:
    """What is said of circular chains that all settled, or all did not."""
    first = cycles[0].cells[0]
    passes = max(cycle.passes for cycle in cycles)
    most = "" if len(cycles) == 1 else "at most "
    state = "settled after" if cycles[0].settled else "had not settled after"
    how = f"iteration, which {state} {most}{passes} pass{'es' if passes != 1 else ''}"
    if len(cycles) == 1:
        count = len(cycles[0].cells)
        return f"{count} cells from {first} on depend on each other in a circle; solved by {how}"
    longest = max(len(cycle.cells) for cycle in cycles)
    return (
        f"{len(cycles):,} groups of up to {longest} cells, the first from {first} on, depend on each other in a "
        f"circle; solved by {how}"
    )
