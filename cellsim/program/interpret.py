"""The reference evaluator: one formula, one draw, straight from the syntax tree.

It is slow, obvious and lazy: a branch that is not taken is not looked at. It shares nothing with the
compiled program but the functions and operators on single values, so that the two can be compared.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
import threading
from collections.abc import Callable, Mapping, Sequence
from typing import Any, Protocol

from cellsim.cells import CellRef, RangeRef
from cellsim.errors import FormulaSyntaxError
from cellsim.formula.tree import (
    ArrayLiteral,
    Binary,
    Call,
    CellReference,
    ErrorLiteral,
    Invocation,
    LogicalLiteral,
    MissingArgument,
    NameReference,
    Node,
    NumberLiteral,
    Postfix,
    RangeReference,
    SheetPrefix,
    StructuredReference,
    TextLiteral,
    Unary,
)
from cellsim.formula.unparse import unparse
from cellsim.functions.borrowed import BorrowedFunction
from cellsim.functions.dispatch import Argument, call_function
from cellsim.functions.operators import binary, binary_scalar, cancels, negate, percent
from cellsim.functions.registry import (
    LIFTED,
    MAC_ROMAN,
    WHOLE_ARRAY,
    ArgumentKind,
    FunctionRecord,
    find_function,
)
from cellsim.graph.build import Graph
from cellsim.values import Array, ErrorValue, Fault, LambdaValue, Reference, Scalar, Value

UNKNOWN_LINK = "a link without kept values"
"""What stands in place of a function's name where a linked sheet's values are not in the file."""
REFERENCE_OPERATORS = frozenset({":", " ", ","})
_MOST_NESTED_CALLS = 1_000
_nesting = threading.local()  # how many LAMBDAs are being called in each other


class UnsupportedFunctionError(Exception):
    """A formula calls a function that is not in the registry; the caller decides what stands in."""

    def __init__(self, name: str) -> None:
        super().__init__(name)
        self.name = name


class Grid(Protocol):
    """The cells that a formula reads, with the value that each has in this draw."""

    @property
    def graph(self) -> Graph:
        """The formulas of the workbook."""

    @property
    def date_1904(self) -> bool:
        """Whether serial number 0 is 1 January 1904."""

    @property
    def as_of(self) -> dt.datetime:
        """What NOW() returns."""

    def cell_value(self, sheet: str, row: int, column: int) -> Scalar:
        """The value of one cell."""

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle."""

    def spill_of(self, cell: CellRef) -> Value:
        """The whole array that a cell's formula gives."""

    def stream_for(self, cell: CellRef) -> Callable[[], float]:
        """A fixed stream of random numbers in [0, 1) for a cell's volatile functions."""

    def borrowed(self, name: str, cell: CellRef) -> BorrowedFunction | None:
        """A function outside the registry, for a cell whose stored value cannot stand in."""


class Frame:
    """A formula being evaluated: its place, its variables, and the calculation it belongs to.

    It is what functions see as their `Context`.
    """

    __slots__ = ("_stream", "calculation", "cell", "depth", "scope")

    def __init__(
        self,
        calculation: Grid,
        cell: CellRef,
        scope: Mapping[str, Value] | None = None,
        depth: int = 0,
    ) -> None:
        self.calculation = calculation
        self.cell = cell
        self.scope = scope
        self.depth = depth
        self._stream: Callable[[], float] | None = None

    def inner(self, scope: Mapping[str, Value]) -> Frame:
        """The same place with further variables.

        Raises:
            Fault: Functions call each other too deeply (#NUM!).
        """
        if self.depth >= _MOST_NESTED_CALLS:
            raise Fault(ErrorValue.NUM)
        merged = {**self.scope, **scope} if self.scope else scope
        return Frame(self.calculation, self.cell, merged, self.depth + 1)

    @property
    def date_1904(self) -> bool:
        """Whether serial number 0 is 1 January 1904."""
        return self.calculation.date_1904

    @property
    def character_set(self) -> str:
        """The Python name of the character set of CHAR and CODE."""
        application = self.calculation.graph.workbook.application
        return MAC_ROMAN if "Macintosh" in application else "cp1252"

    @property
    def now(self) -> dt.datetime:
        """What NOW() returns."""
        return self.calculation.as_of

    def cell_value(self, sheet: str, row: int, column: int) -> Scalar:
        """The value of one cell."""
        return self.calculation.cell_value(sheet, row, column)

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle."""
        return self.calculation.area_values(area)

    def intersect(self, reference: Reference) -> Scalar:
        """Implicit intersection with the formula's row or column."""
        if len(reference.areas) != 1:
            return ErrorValue.VALUE
        area = reference.areas[0]
        row, column = self.cell.row, self.cell.column
        if area.first_row == area.last_row:
            row = area.first_row
        if area.first_column == area.last_column:
            column = area.first_column
        if not (
            area.first_row <= row <= area.last_row
            and area.first_column <= column <= area.last_column
        ):
            return ErrorValue.VALUE
        return self.calculation.cell_value(area.sheet, row, column)

    def parse_reference(self, text: str) -> Value:
        """The reference, name or table that a text in A1 notation names; #REF! if none."""
        try:
            node = self.calculation.graph.cache.parse(text, self.cell.row, self.cell.column, "")
        except FormulaSyntaxError:
            return ErrorValue.REF
        if isinstance(
            node, (CellReference, RangeReference, NameReference, StructuredReference)
        ) or (isinstance(node, Binary) and node.operator in REFERENCE_OPERATORS):
            value = evaluate(node, self, whole=True)
            return ErrorValue.REF if value is ErrorValue.NAME else value
        return ErrorValue.REF

    def formula_text(self, sheet: str, row: int, column: int) -> str | None:
        """The formula of a cell with its `=`, None if it holds none."""
        formula = self.calculation.graph.formula(CellRef(sheet, row, column))
        if formula is None or formula.tree is None:
            return None
        text = "=" + unparse(formula.tree, row, column)
        return f"{{{text}}}" if formula.whole_arrays and not formula.dynamic else text

    def number_format(self, sheet: str, row: int, column: int) -> str:
        """The number format code of a cell."""
        return self.calculation.graph.sheets[sheet].number_formats.get((row, column), "General")

    def row_hidden(self, sheet: str, row: int) -> bool:
        """Whether a row is hidden by hand or by a filter."""
        return row in self.calculation.graph.sheets[sheet].hidden_rows

    def row_filtered(self, sheet: str, row: int) -> bool:
        """Whether a row is hidden by a filter."""
        return row in self.calculation.graph.sheets[sheet].filtered_rows

    def holds_subtotal(self, sheet: str, row: int, column: int) -> bool:
        """Whether a cell's formula calls SUBTOTAL or AGGREGATE."""
        formula = self.calculation.graph.formula(CellRef(sheet, row, column))
        if formula is None or formula.tree is None:
            return False
        return not self.calculation.graph.facts(formula.tree).functions.isdisjoint(
            {"SUBTOTAL", "AGGREGATE"}
        )

    def sheet_titles(self) -> Sequence[str]:
        """The titles of all sheets in order."""
        return self.calculation.graph.resolver.titles()

    def random(self) -> float:
        """The next number in [0, 1) of the cell's own fixed stream."""
        if self._stream is None:
            self._stream = self.calculation.stream_for(self.cell)
        return self._stream()


def evaluate_formula(tree: Node, frame: Frame, *, whole: bool) -> Value:
    """The value of a whole formula: as `evaluate`, and a last sum or difference may cancel to zero.

    Args:
        tree: The formula.
        frame: Its place.
        whole: Whether it is an array formula.

    Raises:
        UnsupportedFunctionError: It calls a function that is not in the registry.
    """
    if isinstance(tree, Binary) and tree.operator in {"+", "-"}:
        left = operand(tree.left, frame, whole=whole)
        right = operand(tree.right, frame, whole=whole)
        result = binary(tree.operator, left, right, date_1904=frame.date_1904)
        if type(result) is float and type(left) is float and result != 0 and cancels(result, left):
            return 0.0
        return result
    return evaluate(tree, frame, whole=whole)


def evaluate(node: Node, frame: Frame, *, whole: bool) -> Value:
    """The value of an expression; references stay references."""
    return _EVALUATORS[type(node)](node, frame, whole)


def operand(node: Node, frame: Frame, *, whole: bool) -> Scalar | Array:
    """The value of an expression in a place for single values.

    A reference to several cells is taken whole in an array formula, else by implicit intersection.
    """
    if type(node) is CellReference and node.prefix is None:
        row, column = node.row, node.column
        cell = frame.cell
        if node.row_relative:
            row += cell.row
        if node.column_relative:
            column += cell.column
        if row > 0 and column > 0:
            return frame.calculation.cell_value(cell.sheet, row, column)
    return dereference(_EVALUATORS[type(node)](node, frame, whole), frame, whole=whole)


def dereference(value: Value, frame: Frame, *, whole: bool) -> Scalar | Array:
    """What a reference refers to, other values as they are."""
    if isinstance(value, Reference):
        if len(value.areas) != 1:
            return ErrorValue.VALUE
        area = value.areas[0]
        if area.first_row == area.last_row and area.first_column == area.last_column:
            return frame.calculation.cell_value(area.sheet, area.first_row, area.first_column)
        return frame.calculation.area_values(area) if whole else frame.intersect(value)
    if isinstance(value, LambdaValue):
        return ErrorValue.CALC
    return value


def _literal(node: Any, _frame: Frame, _whole: bool) -> Value:
    return node.value  # type: ignore[no-any-return]


def _array_literal(node: ArrayLiteral, _frame: Frame, _whole: bool) -> Value:
    return Array.from_rows(node.rows)


def _missing(_node: MissingArgument, _frame: Frame, _whole: bool) -> Value:
    return None


def _reference(node: CellReference | RangeReference, frame: Frame, _whole: bool) -> Value:
    resolver = frame.calculation.graph.resolver
    if node.prefix is not None and node.prefix.workbook is not None:
        if not resolver.keeps_values(node.prefix):
            raise UnsupportedFunctionError(UNKNOWN_LINK)
        value = resolver.external(node, frame.cell)
        # text and logicals of a linked cell count as those of a range: SUM passes over them
        return Array(1, 1, [value]) if isinstance(value, (str, bool)) else value
    return resolver.area(node, frame.cell)


def _name(node: NameReference, frame: Frame, _whole: bool) -> Value:
    if frame.scope is not None and node.prefix is None:
        value = frame.scope.get(node.name.casefold(), frame)
        if value is not frame:
            return value  # type: ignore[return-value]
    resolver = frame.calculation.graph.resolver
    if node.prefix is not None and node.prefix.workbook is not None:
        return _external_name(node, frame)
    record = resolver.name(node.name, node.prefix, frame.cell.sheet)
    if record is not None:
        if record.tree is None:
            return ErrorValue.NAME
        if frame.depth >= _MOST_NESTED_CALLS:
            return ErrorValue.NAME
        return evaluate(
            record.tree, Frame(frame.calculation, frame.cell, None, frame.depth + 1), whole=True
        )
    table = resolver.table(node.name)
    if table is not None:
        return resolver.structured(StructuredReference(node.name, (), None, None), frame.cell)
    return ErrorValue.NAME


def _external_name(node: NameReference, frame: Frame) -> Value:
    graph = frame.calculation.graph
    link = graph.resolver.external_link(node.prefix)
    text = None if link is None else link.names.get(node.name)
    if link is None or not text:
        return ErrorValue.REF
    try:
        tree = graph.cache.parse(text.removeprefix("="), 1, 1, node.name)
    except FormulaSyntaxError:
        return ErrorValue.REF
    if isinstance(tree, (CellReference, RangeReference)) and tree.prefix is not None:
        prefix = SheetPrefix(str(link.number), tree.prefix.first, tree.prefix.last)
        return graph.resolver.external(dataclasses.replace(tree, prefix=prefix), frame.cell)
    return ErrorValue.REF


def _structured(node: StructuredReference, frame: Frame, _whole: bool) -> Value:
    return frame.calculation.graph.resolver.structured(node, frame.cell)


def _unary(node: Unary, frame: Frame, whole: bool) -> Value:
    if node.operator == "@":
        value = evaluate(node.operand, frame, whole=True)
        if isinstance(value, Reference):
            return frame.intersect(value) if value.areas[0].size > 1 else value
        return value.items[0] if isinstance(value, Array) else value
    if node.operator == "+":
        return evaluate(node.operand, frame, whole=whole)
    return negate(operand(node.operand, frame, whole=whole), date_1904=frame.date_1904)


def _postfix(node: Postfix, frame: Frame, whole: bool) -> Value:
    if node.operator == "#":
        value = evaluate(node.operand, frame, whole=True)
        if isinstance(value, Reference) and value.areas[0].size == 1:
            return frame.calculation.spill_of(value.areas[0].first)
        return value if isinstance(value, ErrorValue) else ErrorValue.REF
    return percent(operand(node.operand, frame, whole=whole), date_1904=frame.date_1904)


def _binary(node: Binary, frame: Frame, whole: bool) -> Value:
    operator = node.operator
    if operator in REFERENCE_OPERATORS:
        return combine_references(
            operator,
            evaluate(node.left, frame, whole=True),
            evaluate(node.right, frame, whole=True),
        )
    left = operand(node.left, frame, whole=whole)
    right = operand(node.right, frame, whole=whole)
    if isinstance(left, Array) or isinstance(right, Array):
        return binary(operator, left, right, date_1904=frame.date_1904)
    return binary_scalar(operator, left, right, date_1904=frame.date_1904)


def combine_references(operator: str, left: Value, right: Value) -> Reference | ErrorValue:
    """A reference operator: `:` spans both operands, `,` joins them, a space intersects them."""
    for value in (left, right):
        if isinstance(value, ErrorValue):
            return value
    if not isinstance(left, Reference) or not isinstance(right, Reference):
        return ErrorValue.VALUE
    if operator == ",":
        return Reference(left.areas + right.areas)
    if operator == ":":
        areas = left.areas + right.areas
        if len({area.sheet for area in areas}) != 1:
            return ErrorValue.REF
        return Reference(
            (
                RangeRef(
                    areas[0].sheet,
                    min(area.first_row for area in areas),
                    min(area.first_column for area in areas),
                    max(area.last_row for area in areas),
                    max(area.last_column for area in areas),
                ),
            )
        )
    common = [a.intersection(b) for a in left.areas for b in right.areas]
    found = tuple(area for area in common if area is not None)
    return Reference(found) if found else ErrorValue.NULL


def _call(node: Call, frame: Frame, whole: bool) -> Value:
    name = node.name
    special = _SPECIAL_FORMS.get(name)
    if special is not None:
        return special(node, frame, whole)
    function = find_function(name)
    if function is None:
        return _call_by_name(node, frame, whole)
    arguments = [
        call_argument(argument, function, position, frame, whole)
        for position, argument in enumerate(node.arguments)
    ]
    return call_function(function, arguments, frame, whole_arrays=whole)


def call_argument(
    node: Node, function: FunctionRecord, position: int, frame: Frame, whole: bool
) -> Argument:
    """An argument as its function takes it: evaluated, or a function without arguments that does so."""
    if not function.parameters:
        return None
    kind = function.parameter(position).kind
    if kind is ArgumentKind.LAZY:
        return lambda: evaluate(node, frame, whole=whole)
    if kind in LIFTED:
        if type(node) is CellReference:
            return operand(node, frame, whole=whole)
        return evaluate(node, frame, whole=whole)
    if kind is ArgumentKind.FUNCTION and isinstance(node, NameReference):
        function_value = _built_in_as_value(node, frame)
        if function_value is not None:
            return function_value
    return evaluate(node, frame, whole=whole or kind in WHOLE_ARRAY)


def _built_in_as_value(node: NameReference, frame: Frame) -> LambdaValue | None:
    """A function given by its bare name, as in `BYROW(A1:C3, SUM)`."""
    name = node.name.upper()
    for prefix in ("_XLETA.", "_XLFN."):
        name = name.removeprefix(prefix)
    function = find_function(name)
    if function is None or frame.calculation.graph.resolver.name(
        node.name, node.prefix, frame.cell.sheet
    ):
        return None
    return LambdaValue(
        function.least,
        function.most,
        lambda arguments: call_function(function, list(arguments), frame, whole_arrays=True),
    )


def _call_by_name(node: Call, frame: Frame, whole: bool) -> Value:
    """A call of a variable or defined name that holds a LAMBDA."""
    key = node.name.casefold()
    callee: Value = None
    if frame.scope is not None and key in frame.scope:
        callee = frame.scope[key]
    elif frame.calculation.graph.resolver.name(node.name, None, frame.cell.sheet) is not None:
        callee = _name(NameReference(None, node.name), frame, whole)
    if callee is None:
        return _call_borrowed(node, frame, whole)
    if isinstance(callee, ErrorValue):
        return callee
    return _invoke(callee, node.arguments, frame, whole)


def _call_borrowed(node: Call, frame: Frame, whole: bool) -> Value:
    borrowed = frame.calculation.borrowed(node.name, frame.cell)
    if borrowed is None:
        raise UnsupportedFunctionError(node.name)
    return borrowed(
        [
            dereference(evaluate(argument, frame, whole=whole), frame, whole=True)
            for argument in node.arguments
        ]
    )


def _invocation(node: Invocation, frame: Frame, whole: bool) -> Value:
    return _invoke(evaluate(node.function, frame, whole=whole), node.arguments, frame, whole)


def _invoke(callee: Value, arguments: tuple[Node, ...], frame: Frame, whole: bool) -> Value:
    if isinstance(callee, ErrorValue):
        return callee
    if not isinstance(callee, LambdaValue):
        return ErrorValue.VALUE
    if not callee.least <= len(arguments) <= callee.most:
        return ErrorValue.VALUE
    try:
        return callee.call([evaluate(argument, frame, whole=whole) for argument in arguments])
    except Fault as fault:
        return fault.error


def _let(node: Call, frame: Frame, whole: bool) -> Value:
    arguments = node.arguments
    if len(arguments) < 3 or len(arguments) % 2 == 0:
        return ErrorValue.VALUE
    try:
        for position in range(0, len(arguments) - 1, 2):
            variable = arguments[position]
            if not isinstance(variable, NameReference):
                return ErrorValue.VALUE
            value = evaluate(arguments[position + 1], frame, whole=whole)
            frame = frame.inner({variable.name.casefold(): value})
    except Fault as fault:
        return fault.error
    return evaluate(arguments[-1], frame, whole=whole)


def _lambda(node: Call, frame: Frame, whole: bool) -> Value:
    if not node.arguments:
        return ErrorValue.VALUE
    parameters: list[str] = []
    least = 0
    for position, parameter in enumerate(node.arguments[:-1]):
        optional = isinstance(parameter, StructuredReference) and parameter.table is None
        if isinstance(parameter, NameReference):
            parameters.append(parameter.name.casefold())
            least = position + 1
        elif optional and isinstance(parameter, StructuredReference):
            parameters.append((parameter.first_column or "").removeprefix("_xlpm.").casefold())
        else:
            return ErrorValue.VALUE
    body = node.arguments[-1]

    def call(arguments: Sequence[Value]) -> Value:
        scope: dict[str, Value] = dict.fromkeys(parameters)
        scope.update(zip(parameters, arguments, strict=False))
        for name in parameters[len(arguments) :]:
            scope[f"omitted {name}"] = True
        depth = getattr(_nesting, "calls", 0)
        if depth >= _MOST_NESTED_CALLS:
            raise Fault(ErrorValue.NUM)
        _nesting.calls = depth + 1
        try:
            return evaluate(body, frame.inner(scope), whole=whole)
        finally:
            _nesting.calls = depth

    return LambdaValue(least, len(parameters), call)


def _is_omitted(node: Call, frame: Frame, _whole: bool) -> Value:
    if len(node.arguments) != 1 or not isinstance(node.arguments[0], NameReference):
        return ErrorValue.VALUE
    return frame.scope is not None and f"omitted {node.arguments[0].name.casefold()}" in frame.scope


_SPECIAL_FORMS: dict[str, Callable[[Call, Frame, bool], Value]] = {
    "LET": _let,
    "LAMBDA": _lambda,
    "ISOMITTED": _is_omitted,
}

_EVALUATORS: dict[type, Callable[[Any, Frame, bool], Value]] = {
    NumberLiteral: _literal,
    TextLiteral: _literal,
    LogicalLiteral: _literal,
    ErrorLiteral: _literal,
    ArrayLiteral: _array_literal,
    MissingArgument: _missing,
    CellReference: _reference,
    RangeReference: _reference,
    NameReference: _name,
    StructuredReference: _structured,
    Unary: _unary,
    Postfix: _postfix,
    Binary: _binary,
    Call: _call,
    Invocation: _invocation,
}
