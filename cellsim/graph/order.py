"""Cycles in the formula graph: the cells that depend on each other through a given one."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from cellsim.cells import CellRef
from cellsim.graph.build import Graph


def precedent_cells(graph: Graph, cell: CellRef) -> Iterator[CellRef]:
    """The formula cells that a formula cell's references name."""
    formula = graph.formula(cell)
    if formula is None:
        return
    for area in graph.precedents(formula):
        yield from graph.formula_cells_in(graph.resolver.clip(area))


def strongly_connected(
    graph: Graph, start: CellRef, is_known: Callable[[CellRef], bool]
) -> tuple[CellRef, ...]:
    """All cells that both feed a cell and are fed by it, itself included, feeders first.

    Tarjan's algorithm (1972), without recursion, from the one cell.

    Args:
        graph: The formulas.
        start: The cell.
        is_known: Whether a cell's value is known, so that nothing is to be looked for behind it.
    """
    index: dict[CellRef, int] = {start: 0}
    low: dict[CellRef, int] = {start: 0}
    component: list[CellRef] = [start]
    on_stack = {start}
    work: list[tuple[CellRef, Iterator[CellRef]]] = [(start, precedent_cells(graph, start))]
    finished: list[CellRef] = []
    while work:
        cell, precedents = work[-1]
        for precedent in precedents:
            if is_known(precedent):
                continue
            if precedent not in index:
                index[precedent] = low[precedent] = len(index)
                component.append(precedent)
                on_stack.add(precedent)
                work.append((precedent, precedent_cells(graph, precedent)))
                break
            if precedent in on_stack:
                low[cell] = min(low[cell], index[precedent])
        else:
            work.pop()
            finished.append(cell)
            if work:
                parent = work[-1][0]
                low[parent] = min(low[parent], low[cell])
            if low[cell] == index[cell]:
                members = set()
                while True:
                    member = component.pop()
                    on_stack.discard(member)
                    members.add(member)
                    if member == cell:
                        break
                if cell == start:
                    return tuple(done for done in finished if done in members)
    return (start,)
