"""What lies between inputs and outputs: the cells that change with an input and matter to an output."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable

from cellsim.cells import CellRef, RangeRef
from cellsim.graph.build import Formula, Graph

_Node = CellRef | RangeRef


def affected_cells(
    graph: Graph,
    inputs: Iterable[CellRef],
    outputs: Iterable[CellRef],
    *,
    count_dynamic: bool = True,
) -> frozenset[CellRef]:
    """The formula cells upstream of the outputs that depend on an input.

    A formula that reads cells which its references do not name (OFFSET, INDIRECT, a data table)
    counts as reading every formula of the workbook and as depending on every input, so the set may
    hold some cells too many, never one too few; unless `count_dynamic` is false, and only named
    references are followed. Input cells themselves are not in it.
    """
    wanted = frozenset(inputs)
    readers, dynamic = _readers(graph, outputs, wanted)
    affected: set[_Node] = set()
    if not count_dynamic:
        dynamic = []
    frontier: list[_Node] = [*wanted, *dynamic]
    affected.update(dynamic)
    while frontier:
        node = frontier.pop()
        for reader in readers.get(node, ()):
            if reader not in affected:
                affected.add(reader)
                frontier.append(reader)
    return frozenset(node for node in affected if isinstance(node, CellRef) and node not in wanted)


def _readers(  # noqa: C901  (one walk over the graph with its two kinds of node)
    graph: Graph, outputs: Iterable[CellRef], inputs: frozenset[CellRef]
) -> tuple[dict[_Node, list[_Node]], list[CellRef]]:
    """Who reads each cell and range upstream of the outputs, and the cells that read unnamed ones."""
    readers: dict[_Node, list[_Node]] = defaultdict(list)
    inputs_by_sheet: dict[str, list[CellRef]] = defaultdict(list)
    for cell in inputs:
        inputs_by_sheet[cell.sheet].append(cell)
    dynamic: list[CellRef] = []
    seen_areas: set[RangeRef] = set()
    seen: set[CellRef] = set()
    frontier: list[CellRef] = []

    def visit(cell: CellRef) -> None:
        if cell not in seen:
            seen.add(cell)
            frontier.append(cell)

    def visit_area(area: RangeRef, reader: CellRef) -> None:
        if area.first_row == area.last_row and area.first_column == area.last_column:
            source = graph.source_of(area.first) or area.first
            readers[source].append(reader)
            if source != area.first:
                readers[area.first].append(reader)
            visit(source)
            return
        readers[area].append(reader)
        if area in seen_areas:
            return
        seen_areas.add(area)
        for cell in graph.formula_cells_in(graph.resolver.clip(area)):
            readers[cell].append(area)
            visit(cell)
        for cell in inputs_by_sheet.get(area.sheet, ()):
            if area.holds(*cell):
                readers[cell].append(area)

    for output in outputs:
        visit(graph.source_of(output) or output)
    everything_visited = False
    while frontier:
        cell = frontier.pop()
        if cell in inputs:
            continue
        formula = graph.formula(cell)
        if formula is None:
            continue
        if graph.is_dynamic(formula):
            dynamic.append(cell)
            if not everything_visited and _reads_anything(formula, graph):
                everything_visited = True
                for other in graph.all_formulas():
                    visit(other.cell)
        for area in graph.precedents(formula):
            visit_area(area, cell)
    return readers, dynamic


def _reads_anything(formula: Formula, graph: Graph) -> bool:
    """Whether a formula may read cells far from those that its references name."""
    return formula.data_table is not None or not graph.functions_of(formula).isdisjoint(
        {"OFFSET", "INDIRECT", "INDEX", "CHOOSE", "XLOOKUP", "IF"}
    )
