"""Why a recalculated value is not the stored one: where a difference starts, and what it may come from.

A formula is taken alone, on the stored values of the cells that it reads. If it then gives its own
stored value, the difference has come in with them; else it starts here, and either the stored value is
not what the formula gives (stale), or the recalculation is wrong. A formula whose functions all give
the stored value elsewhere in the workbook speaks for the first.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from cellsim.cells import CellRef
from cellsim.functions.dispatch import item_at
from cellsim.graph.build import Formula, Graph
from cellsim.program.calculation import Calculation
from cellsim.program.interpret import (
    Frame,
    UnsupportedFunctionError,
    dereference,
    evaluate_formula,
)
from cellsim.values import Array, ErrorValue, Fault, Scalar

FOLLOWS = "follows from other cells"
PRECISION = "precision"
LINK = "external link"
CIRCLE = "circle that had not settled in the file"
STALE = "stale stored value suspected"
RECALCULATION = "recalculation suspected"

_PRECISION = 1e-6
"""Numbers that differ by less, relatively, differ by the precision of a method, not by its rule."""


@dataclass(slots=True)
class Evidence:
    """What agrees in a workbook.

    Attributes:
        shapes: The trees of formulas that give their stored value, by identity.
        functions: The functions that they call.
    """

    shapes: set[int] = field(default_factory=set)
    functions: set[str] = field(default_factory=set)

    def record(self, graph: Graph, formula: Formula) -> None:
        """Take note of a formula that agrees."""
        if formula.tree is not None and id(formula.tree) not in self.shapes:
            self.shapes.add(id(formula.tree))
            self.functions |= graph.functions_of(formula)


class Causes:
    """Finds the cause of each disagreement.

    Args:
        calculation: The finished calculation.
        stored: The stored value of each formula cell.
        evidence: What agrees.
    """

    def __init__(
        self, calculation: Calculation, stored: Mapping[CellRef, Scalar], evidence: Evidence
    ) -> None:
        self._graph = calculation.graph
        self._evidence = evidence
        self._in_circles = {cell for cycle in calculation.findings.cycles for cell in cycle.cells}
        self._as_stored = Calculation(
            self._graph,
            as_of=calculation.as_of,
            overrides={**stored, **dict(_inside_arrays(self._graph))},
        )

    def cause(self, formula: Formula, stored: Scalar, found: Scalar) -> str:
        """The cause, one of the names above."""
        if agrees(stored, self._alone(formula)):
            return FOLLOWS
        if (
            isinstance(stored, float)
            and isinstance(found, float)
            and abs(stored - found) <= _PRECISION * max(1.0, abs(stored))
        ):
            return PRECISION
        if self._reads_link(formula):
            return LINK
        if formula.cell in self._in_circles:
            return CIRCLE
        known = id(formula.tree) in self._evidence.shapes or (
            self._graph.functions_of(formula) <= self._evidence.functions
        )
        return STALE if known else RECALCULATION

    def _alone(self, formula: Formula) -> Scalar:
        """What a formula gives on the stored values of the cells that it reads."""
        if formula.tree is None:
            return formula.stored
        frame = Frame(self._as_stored, formula.cell)
        try:
            value = dereference(
                evaluate_formula(formula.tree, frame, whole=formula.whole_arrays),
                frame,
                whole=formula.whole_arrays,
            )
        except Fault as fault:
            return fault.error
        except UnsupportedFunctionError:
            return ErrorValue.NAME
        if isinstance(value, Array):
            value = item_at(value, 0, 0)
        return 0.0 if value is None else value

    def _reads_link(self, formula: Formula) -> bool:
        if formula.tree is None:
            return False
        facts = self._graph.facts(formula.tree)
        return any(
            reference.prefix is not None and reference.prefix.workbook is not None
            for reference in facts.references
        )


def _inside_arrays(graph: Graph) -> Iterable[tuple[CellRef, Scalar]]:
    """The stored values of the cells that array formulas fill, their first cells left out."""
    for title, members in graph.members.items():
        constants = graph.sheets[title].constants
        formulas = graph.formulas[title]
        for position in members:
            if position not in formulas:
                yield CellRef(title, *position), constants.get(position)


TOLERANCE = 1e-9
"""Numbers agree within this, relative, absolute below 1."""


def agrees(stored: Scalar, found: Scalar) -> bool:
    """Whether a recalculated value is the stored one: numbers within the tolerance, others equal."""
    if isinstance(stored, float) and isinstance(found, float):
        return abs(stored - found) <= TOLERANCE * max(1.0, abs(stored))
    if stored in (None, "") and (found in (None, "") or (isinstance(found, float) and found == 0)):
        return True
    return type(stored) is type(found) and stored == found
