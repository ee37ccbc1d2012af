"""The model check: every formula recalculated and compared with the value that the file stores."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence

from cellsim.audit.causes import FOLLOWS, Causes, Evidence, agrees
from cellsim.cells import CellRef
from cellsim.formula.unparse import unparse
from cellsim.functions.catalogue.unsupported import unsupported_reason
from cellsim.functions.registry import find_function
from cellsim.graph.build import Formula, Graph
from cellsim.graph.slicing import affected_cells
from cellsim.program.calculation import Calculation, Cycle
from cellsim.program.interpret import UNKNOWN_LINK
from cellsim.results import Disagreement, ModelCheck, SheetAgreement
from cellsim.values import Scalar
from cellsim.workbook.model import Workbook


def check_model(calculation: Calculation, against: Workbook | None = None) -> ModelCheck:
    """Compare a finished calculation with stored values.

    Left out are formulas that are volatile or depend on a volatile one, those for which the file stores
    no value, and those that are not calculated because of a function that is not supported: they are
    counted by function.

    Args:
        calculation: The calculation.
        against: The workbook whose values are taken as stored; by default the model's own.
    """
    graph = calculation.graph
    stored = _stored_values(graph, against)
    volatile = volatile_cells(graph)
    stood_in = calculation.findings.unsupported
    without_value = 0
    counts: dict[str, list[int]] = {title: [0, 0] for title in graph.sheets}
    evidence = Evidence()
    wrong: list[tuple[Formula, Scalar]] = []
    for formula in graph.all_formulas():
        cell = formula.cell
        if cell in volatile or cell in stood_in:
            continue  # a copy of the stored value proves nothing
        if cell not in stored:
            without_value += 1
            continue
        found = calculation.cell_value(*cell)
        counts[cell.sheet][0] += 1
        if agrees(stored[cell], found):
            counts[cell.sheet][1] += 1
            evidence.record(graph, formula)
        else:
            wrong.append((formula, found))
    return ModelCheck(
        compared=sum(compared for compared, _ in counts.values()),
        agreeing=sum(agreeing for _, agreeing in counts.values()),
        volatile=len(volatile),
        without_value=without_value,
        disagreements=_disagreements(calculation, stored, evidence, wrong),
        unsupported=_unsupported(calculation.findings.unsupported.values()),
        notes=(*_notes(graph, calculation), *_differences(graph.workbook, against)),
        sheets=tuple(
            SheetAgreement(title, compared, agreeing)
            for title, (compared, agreeing) in counts.items()
            if compared
        ),
    )


def _stored_values(graph: Graph, against: Workbook | None) -> dict[CellRef, Scalar]:
    """By formula cell, the value that it is compared with; cells without one are left out."""
    if against is None:
        return {f.cell: f.stored for f in graph.all_formulas() if f.has_stored}
    values: dict[CellRef, Scalar] = {}
    sheets = {sheet.title: sheet for sheet in against.sheets}
    for formula in graph.all_formulas():
        cell = formula.cell
        sheet = sheets.get(cell.sheet)
        if sheet is None:
            continue
        position = (cell.row, cell.column)
        other = sheet.formulas.get(position)
        if other is not None and other.has_stored:
            values[cell] = other.stored
        elif other is None and position in sheet.constants:
            values[cell] = sheet.constants[position]
    return values


def _differences(workbook: Workbook, against: Workbook | None) -> Iterable[str]:
    """What else is not the same in the workbook compared with: sheets and constants."""
    if against is None:
        return
    others = {sheet.title: sheet for sheet in against.sheets}
    missing = [sheet.title for sheet in workbook.sheets if sheet.title not in others]
    if missing:
        yield f"{against.path.name} has no sheet {', '.join(repr(title) for title in missing)}."
    changed = [
        CellRef(sheet.title, *position)
        for sheet in workbook.sheets
        if sheet.title in others
        for position, value in sheet.constants.items()
        if position not in others[sheet.title].formulas
        and others[sheet.title].constants.get(position) != value
    ]
    if changed:
        examples = ", ".join(str(cell) for cell in changed[:5])
        yield (
            f"{len(changed):,} constant{'s differ' if len(changed) > 1 else ' differs'} from {against.path.name}, "
            f"such as {examples}; their values here are those of the model."
        )


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
    calculation: Calculation,
    stored: Mapping[CellRef, Scalar],
    evidence: Evidence,
    wrong: Sequence[tuple[Formula, Scalar]],
) -> tuple[Disagreement, ...]:
    """The disagreements, those where a difference starts first."""
    if not wrong:
        return ()
    causes = Causes(calculation, stored, evidence)
    rows = []
    for formula, found in wrong:
        cell = formula.cell
        cause = causes.cause(formula, stored[cell], found)
        text = "=" + (
            unparse(formula.tree, cell.row, cell.column)
            if formula.tree is not None
            else formula.source.text
        )
        root = cause != FOLLOWS
        rows.append(Disagreement(str(cell), text, stored[cell], found, root, cause))
    return tuple(sorted(rows, key=lambda row: not row.root))


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
