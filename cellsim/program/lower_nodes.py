"""From syntax trees to the instruction set: one expression at a time."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Protocol

from cellsim.cells import CellRef, RangeRef
from cellsim.formula.tree import (
    ArrayLiteral,
    Binary,
    Call,
    CellReference,
    ErrorLiteral,
    LogicalLiteral,
    MissingArgument,
    NameReference,
    Node,
    NumberLiteral,
    Postfix,
    RangeReference,
    StructuredReference,
    TextLiteral,
    Unary,
)
from cellsim.functions.registry import (
    LIFTED,
    WHOLE_ARRAY,
    ArgumentKind,
    FunctionRecord,
    find_function,
)
from cellsim.graph.build import Graph
from cellsim.program.emit import Emitter
from cellsim.program.interpret import REFERENCE_OPERATORS, Frame, combine_references, evaluate
from cellsim.program.ir import Expression, Kind
from cellsim.program.lower_branches import LAZY_RULES, block_item
from cellsim.program.lower_calls import Arguments, call_over_draws
from cellsim.program.lower_functions import RULES
from cellsim.program.lowered import (
    Block,
    Flagged,
    Known,
    Lowered,
    Numeric,
    UnlowerableError,
    Varied,
)
from cellsim.values import Array, ErrorValue, Reference, Value

_LARGEST_BLOCK = 2_000_000
_MOST_NESTED_NAMES = 64


class Cells(Protocol):
    """What lowering needs to know of the cells of the model."""

    @property
    def graph(self) -> Graph:
        """The formulas."""

    @property
    def emitter(self) -> Emitter:
        """Where instructions go."""

    def frame(self, cell: CellRef) -> Frame:
        """A cell's surroundings in the base case."""

    def varies(self, cell: CellRef) -> bool:
        """Whether a cell changes from draw to draw."""

    def varying_in(self, area: RangeRef) -> Sequence[CellRef]:
        """The cells of an area that change from draw to draw."""

    def cell(self, cell: CellRef) -> Lowered:
        """The value of a cell."""

    def area_block(self, area: RangeRef) -> Block:
        """The values of a rectangle."""

    def has_fixed_shape(self, cell: CellRef) -> bool:
        """Whether the array of a formula cell fills the same cells in every draw."""

    def all_varying(self, reader: CellRef) -> Sequence[CellRef]:
        """All varying cells that do not depend on a cell: what a computed reference may name."""


class NodeLowering:
    """Lowers the formula of one cell.

    Attributes:
        cells: The model's cells.
        cell: The formula's cell.
        emitter: Where instructions go.
        scope: Variables of LET in force.
    """

    def __init__(
        self,
        cells: Cells,
        cell: CellRef,
        scope: Mapping[str, Lowered] | None = None,
        depth: int = 0,
    ) -> None:
        self.cells = cells
        self.cell = cell
        self.emitter = cells.emitter
        self.scope = scope
        self.depth = depth

    def formula(self, tree: Node, *, whole: bool) -> Lowered:
        """A whole formula: a last sum or difference may cancel to zero.

        Raises:
            UnlowerableError: There is no form over draws for the whole of it.
        """
        if isinstance(tree, Binary) and tree.operator in {"+", "-"}:
            left = self.operand(tree.left, whole=whole)
            right = self.operand(tree.right, whole=whole)
            result = self._binary_values(tree, left, right)
            if isinstance(result, Numeric) and not isinstance(left, (Block, Varied)):
                return Numeric(result.operand, self.emitter.number(left))
            return result
        return self.lower(tree, whole=whole)

    def lower(self, node: Node, *, whole: bool) -> Lowered:
        """An expression; references stay known references.

        Raises:
            UnlowerableError: There is no form over draws for it.
        """
        return _LOWERINGS[type(node)](self, node, whole)

    def operand(self, node: Node, *, whole: bool) -> Lowered:
        """An expression in a place for single values; several cells intersect unless `whole`.

        Where there is no form over draws for it and it gives a single value, it is left to the
        reference evaluator, draw by draw.
        """
        try:
            return self.dereference(self.lower(node, whole=whole), whole=whole)
        except UnlowerableError as problem:
            if self.scope is not None or whole:
                raise  # variables or arrays are not there for the reference evaluator: it takes more
            return self.interpreted(node, whole=whole, reason=problem.reason)

    def dereference(self, value: Lowered, *, whole: bool) -> Lowered:
        """What a known reference refers to, other values as they are."""
        if not isinstance(value, Known) or not isinstance(value.value, Reference):
            return value
        reference = value.value
        if len(reference.areas) != 1:
            return Known(ErrorValue.VALUE)
        area = reference.areas[0]
        if area.size == 1:
            return self.cells.cell(area.first)
        if whole:
            return self.cells.area_block(area)
        row = area.first_row if area.rows == 1 else self.cell.row
        column = area.first_column if area.columns == 1 else self.cell.column
        if not area.holds(area.sheet, row, column):
            return Known(ErrorValue.VALUE)
        return self.cells.cell(CellRef(area.sheet, row, column))

    def is_static(self, node: Node) -> bool:
        """Whether an expression is the same in all draws, judged by the cells that it names."""
        facts = self.cells.graph.facts(node)
        if facts.dynamic or self.depth > _MOST_NESTED_NAMES:
            return False
        resolver = self.cells.graph.resolver
        for reference in facts.references:
            if reference.prefix is not None and reference.prefix.workbook is not None:
                continue
            found = resolver.area(reference, self.cell)
            if isinstance(found, Reference) and any(
                self.cells.varying_in(area) for area in found.areas
            ):
                return False
        return all(self._static_name(name) for name in facts.names)

    def _static_name(self, name: NameReference | StructuredReference) -> bool:
        resolver = self.cells.graph.resolver
        if isinstance(name, StructuredReference):
            found = resolver.structured(name, self.cell)
        else:
            if self.scope is not None and name.name.casefold() in self.scope:
                return False
            record = resolver.name(name.name, name.prefix, self.cell.sheet)
            if record is not None:
                inner = NodeLowering(self.cells, self.cell, None, self.depth + 1)
                return record.tree is None or inner.is_static(record.tree)
            table = resolver.table(name.name)
            if table is None:
                return True
            found = Reference((table.area,))
        return not isinstance(found, Reference) or not any(
            self.cells.varying_in(a) for a in found.areas
        )

    def static_value(self, node: Node, *, whole: bool) -> Lowered:
        """The value of a static expression, from the base case."""
        return known_from_value(evaluate(node, self.cells.frame(self.cell), whole=whole))

    def interpreted(
        self,
        node: Node,
        *,
        whole: bool,
        reason: str,
        item: tuple[int, int] = (0, 0),
        spilled: bool = False,
    ) -> Lowered:
        """An expression left to the reference evaluator, draw by draw.

        Args:
            node: The expression.
            whole: Whether ranges are taken item by item.
            reason: Why there is no faster form.
            item: Which item of an array result is wanted: row and column from 0.
            spilled: Whether cells beyond the end of an array result are blank.

        Raises:
            UnlowerableError: It reads a cell for which there is no register.
        """
        facts = self.cells.graph.facts(node)
        reads: dict[CellRef, None] = {}
        if facts.dynamic or facts.names:
            reads.update(dict.fromkeys(self.cells.all_varying(self.cell)))
        resolver = self.cells.graph.resolver
        for reference in facts.references:
            if reference.prefix is not None and reference.prefix.workbook is not None:
                continue
            found = resolver.area(reference, self.cell)
            for area in found.areas if isinstance(found, Reference) else ():
                reads.update(dict.fromkeys(self.cells.varying_in(area)))
        prepared = tuple((cell, *self._readable(self.cells.cell(cell))) for cell in reads)
        expression = Expression(node, self.cell, whole, prepared, reason, item, spilled=spilled)
        function = find_function(node.name) if isinstance(node, Call) else None
        kind = Kind.NUMBER if function is not None and function.result == "number" else Kind.OBJECT
        register = self.emitter.builder.emit_expression(expression, kind)
        return Numeric(register) if kind is Kind.NUMBER else Varied(register)

    def _readable(self, value: Lowered) -> tuple[Any, Kind]:
        """The operand and kind under which the reference evaluator reads a varying cell."""
        if isinstance(value, Flagged):
            return self.emitter.number(value), Kind.FLAG  # as 0 and 1, so that it can be an error
        if isinstance(value, Varied):
            return value.operand, Kind.OBJECT
        if isinstance(value, Numeric):
            return self.emitter.settled(value), Kind.NUMBER
        raise UnlowerableError("it reads a cell that is text in some draws")

    # The kinds of node, one method each.

    def literal(self, node: Any, _whole: bool) -> Lowered:
        """A number, text, logical or error as written."""
        return Known(node.value)

    def array_literal(self, node: ArrayLiteral, _whole: bool) -> Lowered:
        """An array constant."""
        return known_from_value(Array.from_rows(node.rows))

    def missing(self, _node: MissingArgument, _whole: bool) -> Lowered:
        """An argument left out."""
        return Known(None)

    def reference(self, node: CellReference | RangeReference, whole: bool) -> Lowered:
        """A plain reference."""
        if node.prefix is not None and node.prefix.workbook is not None:
            return self.static_value(node, whole=whole)
        return Known(self.cells.graph.resolver.area(node, self.cell))

    def name(self, node: NameReference, whole: bool) -> Lowered:
        """A variable of LET, a defined name or a table."""
        if self.scope is not None and node.prefix is None and node.name.casefold() in self.scope:
            return self.scope[node.name.casefold()]
        resolver = self.cells.graph.resolver
        record = resolver.name(node.name, node.prefix, self.cell.sheet)
        if record is None or record.tree is None or self.is_static(node):
            return self.static_value(node, whole=whole)
        inner = NodeLowering(self.cells, self.cell, None, self.depth + 1)
        return inner.lower(record.tree, whole=True)

    def structured(self, node: StructuredReference, _whole: bool) -> Lowered:
        """A reference into a table."""
        return Known(self.cells.graph.resolver.structured(node, self.cell))

    def unary(self, node: Unary, whole: bool) -> Lowered:
        """A prefix operator."""
        if node.operator == "@":
            value = self.lower(node.operand, whole=True)
            if isinstance(value, Block):
                return value.items[0]
            return self.dereference(value, whole=False)
        if node.operator == "+":
            return self.lower(node.operand, whole=whole)
        value = self.operand(node.operand, whole=whole)
        return self._each(value, self.emitter.negate)

    def postfix(self, node: Postfix, whole: bool) -> Lowered:
        """`%`; a spill range is left to the reference evaluator unless it is static."""
        if node.operator == "#":
            value = self.lower(node.operand, whole=True)
            return self._spill(node, value)
        value = self.operand(node.operand, whole=whole)
        return self._each(value, lambda item: self.emitter.arithmetic("/", item, Known(100.0)))

    def _spill(self, node: Postfix, value: Lowered) -> Lowered:
        if isinstance(value, Known) and isinstance(value.value, Reference):
            cell = value.value.areas[0].first
            formula = self.cells.graph.formula(cell)
            if formula is None or not self.cells.varies(cell):
                return self.static_value(node, whole=True)
            if formula.area is not None and self.cells.has_fixed_shape(cell):
                return Known(Reference((formula.area,)))
        raise UnlowerableError("a spill range that varies")

    def binary(self, node: Binary, whole: bool) -> Lowered:
        """An infix operator."""
        if node.operator in REFERENCE_OPERATORS:
            parts = [self.lower(part, whole=True) for part in (node.left, node.right)]
            return combine_known_references(node.operator, parts)
        left = self.operand(node.left, whole=whole)
        right = self.operand(node.right, whole=whole)
        return self._binary_values(node, left, right)

    def _binary_values(self, node: Binary, left: Lowered, right: Lowered) -> Lowered:
        if isinstance(left, Block) or isinstance(right, Block):
            return by_item(lambda a, b: self._binary_scalars(node, a, b), left, right)
        return self._binary_scalars(node, left, right)

    def _binary_scalars(self, node: Binary, left: Lowered, right: Lowered) -> Lowered:
        if isinstance(left, Known) and isinstance(right, Known):
            return self.emitter.arithmetic(node.operator, left, right)
        if node.operator in {"+", "-", "*", "/", "^"}:
            return self.emitter.arithmetic(node.operator, left, right)
        if node.operator == "&":
            raise UnlowerableError("text that varies from draw to draw")
        return self.emitter.compare(node.operator, left, right)

    def _each(self, value: Lowered, apply: Callable[[Lowered], Lowered]) -> Lowered:
        if isinstance(value, Block):
            return Block(value.rows, value.columns, tuple(apply(item) for item in value.items))
        return apply(value)

    def call(self, node: Call, whole: bool) -> Lowered:
        """A call of a function."""
        lazy = LAZY_RULES.get(node.name)
        if lazy is not None:
            return lazy(self, node, whole)
        function = find_function(node.name)
        if function is None:
            if node.name == "LET":
                return self._let(node, whole)
            if self.scope is None and self.is_static(node):
                return self.static_value(node, whole=whole)
            raise UnlowerableError(f"{node.name} has no form over draws")
        if self.scope is None and self.is_static(node):
            return self.static_value(node, whole=whole)
        arguments = self._arguments(node, function, whole)
        lifted = [
            position
            for position, value in enumerate(arguments)
            if isinstance(value, Block) and function.parameter(position).kind in LIFTED
        ]
        if lifted:
            return self._call_by_item(node, function, arguments, lifted, whole)
        return self._call_with(node, function, arguments, whole)

    def _arguments(self, node: Call, function: FunctionRecord, whole: bool) -> list[Lowered]:
        if not function.least <= len(node.arguments) <= function.most:
            raise UnlowerableError(f"{node.name} with a wrong number of arguments")
        arguments: list[Lowered] = []
        for position, argument in enumerate(node.arguments):
            kind = function.parameter(position).kind
            if kind in LIFTED:
                arguments.append(self.operand(argument, whole=whole))
            elif kind in {ArgumentKind.LAZY, ArgumentKind.FUNCTION}:
                raise UnlowerableError(f"{node.name} has no form over draws")
            else:
                arguments.append(self.lower(argument, whole=whole or kind in WHOLE_ARRAY))
        return arguments

    def _call_with(
        self, node: Call, function: FunctionRecord, arguments: list[Lowered], whole: bool
    ) -> Lowered:
        given = Arguments(self, node, function, arguments, whole)
        rule = RULES.get(node.name)
        if rule is not None:
            result = rule(given)
            if result is not None:
                return result
        return call_over_draws(given)

    def _call_by_item(
        self,
        node: Call,
        function: FunctionRecord,
        arguments: list[Lowered],
        lifted: list[int],
        whole: bool,
    ) -> Lowered:
        blocks = [block for p in lifted if isinstance(block := arguments[p], Block)]
        rows, columns = max(b.rows for b in blocks), max(b.columns for b in blocks)
        items: list[Lowered] = []
        for row in range(rows):
            for column in range(columns):
                for position, block in zip(lifted, blocks, strict=True):
                    arguments[position] = block_item(block, row, column)
                items.append(
                    self.dereference(
                        self._call_with(node, function, list(arguments), whole), whole=True
                    )
                )
        if any(isinstance(item, Block) for item in items):
            raise UnlowerableError("arrays inside an array")
        return Block(rows, columns, tuple(items))

    def _let(self, node: Call, whole: bool) -> Lowered:
        arguments = node.arguments
        if self.scope is None and self.is_static(node):
            return self.static_value(node, whole=whole)
        if len(arguments) < 3 or len(arguments) % 2 == 0:
            return Known(ErrorValue.VALUE)
        scope: dict[str, Lowered] = dict(self.scope or {})
        inner = NodeLowering(self.cells, self.cell, scope, self.depth)
        for position in range(0, len(arguments) - 1, 2):
            variable = arguments[position]
            if not isinstance(variable, NameReference):
                return Known(ErrorValue.VALUE)
            scope[variable.name.casefold()] = inner.lower(arguments[position + 1], whole=whole)
        return inner.lower(arguments[-1], whole=whole)


def by_item(apply: Callable[[Lowered, Lowered], Lowered], left: Lowered, right: Lowered) -> Block:
    """An operation on two values of which at least one is a block, item by item."""
    a = left if isinstance(left, Block) else Block(1, 1, (left,))
    b = right if isinstance(right, Block) else Block(1, 1, (right,))
    rows, columns = max(a.rows, b.rows), max(a.columns, b.columns)
    if rows * columns > _LARGEST_BLOCK:
        raise UnlowerableError("an array too large to unroll")
    items = tuple(
        apply(block_item(a, row, column), block_item(b, row, column))
        for row in range(rows)
        for column in range(columns)
    )
    return Block(rows, columns, items)


def known_from_value(value: Value) -> Lowered:
    """A value found when compiling, as a lowered value."""
    if isinstance(value, Array):
        return Block(value.rows, value.columns, tuple(Known(item) for item in value.items))
    return Known(value)


def combine_known_references(operator: str, parts: Sequence[Lowered]) -> Lowered:
    """A reference operator on known references."""
    references: list[Reference] = []
    for part in parts:
        if isinstance(part, Known) and isinstance(part.value, ErrorValue):
            return part
        if isinstance(part, Known) and isinstance(part.value, Reference):
            references.append(part.value)
    if len(references) != len(parts):
        raise UnlowerableError("a reference computed from uncertain cells")
    return Known(combine_references(operator, *references))


_LOWERINGS: dict[type, Callable[[NodeLowering, Any, bool], Lowered]] = {
    NumberLiteral: NodeLowering.literal,
    TextLiteral: NodeLowering.literal,
    LogicalLiteral: NodeLowering.literal,
    ErrorLiteral: NodeLowering.literal,
    ArrayLiteral: NodeLowering.array_literal,
    MissingArgument: NodeLowering.missing,
    CellReference: NodeLowering.reference,
    RangeReference: NodeLowering.reference,
    NameReference: NodeLowering.name,
    StructuredReference: NodeLowering.structured,
    Unary: NodeLowering.unary,
    Postfix: NodeLowering.postfix,
    Binary: NodeLowering.binary,
    Call: NodeLowering.call,
}
