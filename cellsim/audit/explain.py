"""How a cell's value came about: what it reads, and the value of each part of its formula."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from cellsim.cells import CellRef, RangeRef
from cellsim.formula.tree import (
    ArrayLiteral,
    Binary,
    Call,
    CellReference,
    ErrorLiteral,
    LogicalLiteral,
    MissingArgument,
    Node,
    NumberLiteral,
    Postfix,
    TextLiteral,
    Unary,
)
from cellsim.formula.unparse import unparse
from cellsim.functions.dispatch import Argument, call_function
from cellsim.functions.registry import WHOLE_ARRAY, ArgumentKind, FunctionRecord, find_function
from cellsim.graph.build import Formula
from cellsim.program.calculation import Calculation
from cellsim.program.interpret import (
    Frame,
    UnsupportedFunctionError,
    call_argument,
    dereference,
    evaluate,
)
from cellsim.values import Array, ErrorValue, Fault, Reference, Scalar, Value

Shown = Scalar | Array


@dataclass(frozen=True, slots=True)
class Precedent:
    """Cells that a formula reads.

    Attributes:
        area: The cells.
        label: The text beside or above the first of them, or "".
        value: Their values: one, or an array.
    """

    area: RangeRef
    label: str
    value: Shown


@dataclass(frozen=True, slots=True)
class Step:
    """A part of a formula.

    Attributes:
        expression: The part as it would be written in the cell.
        value: What it gives.
    """

    expression: str
    value: Shown


@dataclass(frozen=True, slots=True)
class Explanation:
    """How a cell's value came about.

    Attributes:
        cell: The cell.
        label: The text beside or above it, or "".
        formula: Its formula with `=`; None for a constant or blank.
        value: Its value in the base case.
        stored: The value in the file; None if there is none.
        has_stored: Whether the file holds a value.
        unsupported: The function for which the stored value stands in, or "".
        precedents: What its references name, in order.
        steps: The parts of the formula, each after the parts that it is made of; branches that were
            not taken are left out.
    """

    cell: CellRef
    label: str
    formula: str | None
    value: Scalar
    stored: Scalar
    has_stored: bool
    unsupported: str
    precedents: tuple[Precedent, ...]
    steps: tuple[Step, ...]


def explain_cell(
    calculation: Calculation, cell: CellRef, label_of: Callable[[CellRef], str]
) -> Explanation:
    """Explain a cell.

    Args:
        calculation: The base case or one draw.
        cell: The cell.
        label_of: The text beside or above a cell.
    """
    graph = calculation.graph
    value = calculation.cell_value(*cell)
    source = graph.source_of(cell)
    formula = graph.formula(source) if source is not None else None
    if formula is None or formula.tree is None:
        text = None if formula is None else "=" + formula.source.text
        stored = formula.stored if formula is not None else value
        has_stored = formula is None or formula.has_stored
        return Explanation(cell, label_of(cell), text, value, stored, has_stored, "", (), ())
    place = formula.cell
    text = "=" + unparse(formula.tree, place.row, place.column)
    if formula.whole_arrays and not formula.dynamic:
        text = f"{{{text}}}"
    return Explanation(
        cell=cell,
        label=label_of(cell),
        formula=text,
        value=value,
        stored=formula.stored if cell == place else None,
        has_stored=formula.has_stored and cell == place,
        unsupported=calculation.findings.unsupported.get(place, ""),
        precedents=tuple(_precedents(calculation, formula, label_of)),
        steps=tuple(_Tracer(calculation, formula).steps()),
    )


def _precedents(
    calculation: Calculation, formula: Formula, label_of: Callable[[CellRef], str]
) -> list[Precedent]:
    found: dict[RangeRef, None] = dict.fromkeys(calculation.graph.precedents(formula))
    rows: list[Precedent] = []
    for area in found:
        if area.size == 1:
            value: Shown = calculation.cell_value(*area.first)
        else:
            try:
                value = calculation.area_values(area)
            except Fault as fault:
                value = fault.error
        rows.append(Precedent(area, label_of(area.first), value))
    return rows


class _Tracer:
    """Evaluates the parts of a formula one by one, as the formula itself does."""

    def __init__(self, calculation: Calculation, formula: Formula) -> None:
        self._formula = formula
        self._frame = Frame(calculation, formula.cell)
        self._steps: dict[str, Shown] = {}

    def steps(self) -> list[Step]:
        """All parts but plain references and constants, the whole formula last."""
        tree = self._formula.tree
        if tree is not None:
            self._visit(tree, self._formula.whole_arrays)
        return [Step(expression, value) for expression, value in self._steps.items()]

    def _visit(self, node: Node, whole: bool) -> None:
        if isinstance(node, _LEAVES):
            return
        if isinstance(node, Binary):
            self._visit(node.left, whole)
            self._visit(node.right, whole)
        elif isinstance(node, (Unary, Postfix)):
            self._visit(node.operand, whole)
        elif isinstance(node, Call):
            self._visit_arguments(node, whole)
        cell = self._formula.cell
        self._steps[unparse(node, cell.row, cell.column)] = self._value(node, whole)

    def _visit_arguments(self, node: Call, whole: bool) -> None:
        function = find_function(node.name)
        if function is None or not function.parameters:
            return  # variables of LET and LAMBDA have no value outside
        lazy: list[Node] = []
        arguments: list[Argument] = []
        for position, argument in enumerate(node.arguments):
            kind = function.parameter(position).kind
            if kind is ArgumentKind.LAZY:
                arguments.append(self._recorder(argument, whole, lazy))
                continue
            if kind is not ArgumentKind.FUNCTION:
                self._visit(argument, whole or kind in WHOLE_ARRAY)
            arguments.append(self._argument(argument, function, position, whole))
        if any(parameter.kind is ArgumentKind.LAZY for parameter in function.parameters):
            try:
                call_function(function, arguments, self._frame, whole_arrays=whole)
            except UnsupportedFunctionError:
                return
            for argument in lazy:
                self._visit(argument, whole)

    def _argument(
        self, node: Node, function: FunctionRecord, position: int, whole: bool
    ) -> Argument:
        try:
            return call_argument(node, function, position, self._frame, whole)
        except UnsupportedFunctionError:
            return ErrorValue.NAME

    def _recorder(self, node: Node, whole: bool, taken: list[Node]) -> Callable[[], Value]:
        def run() -> Value:
            taken.append(node)
            return evaluate(node, self._frame, whole=whole)

        return run

    def _value(self, node: Node, whole: bool) -> Shown:
        try:
            value = evaluate(node, self._frame, whole=whole)
            if isinstance(value, Reference) and len(value.areas) == 1:
                return self._frame.area_values(value.areas[0])
            return dereference(value, self._frame, whole=whole)
        except Fault as fault:
            return fault.error
        except UnsupportedFunctionError:
            return ErrorValue.NAME


_LEAVES = (
    NumberLiteral,
    TextLiteral,
    LogicalLiteral,
    ErrorLiteral,
    ArrayLiteral,
    MissingArgument,
    CellReference,
)
