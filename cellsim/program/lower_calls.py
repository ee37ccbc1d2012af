"""Calls of functions for which there is a kernel over draws."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Protocol

from cellsim.cells import CellRef, RangeRef
from cellsim.formula.tree import Call, Node
from cellsim.functions.dispatch import Argument, call_function
from cellsim.functions.registry import (
    ArgumentKind,
    FunctionRecord,
    find_over_draws,
)
from cellsim.graph.build import Graph
from cellsim.program.emit import Emitter
from cellsim.program.interpret import Frame
from cellsim.program.ir import Constant, KernelCall, Operand, StackOperand, constant
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
from cellsim.values import Array, ErrorValue, Reference, Scalar, Value, encode_error


class Model(Protocol):
    """The model's cells, as far as function rules need them."""

    @property
    def graph(self) -> Graph:
        """The formulas."""

    def frame(self, cell: CellRef) -> Frame:
        """A cell's surroundings in the base case."""

    def varying_in(self, area: RangeRef) -> Sequence[CellRef]:
        """The cells of an area that change from draw to draw."""

    def cell(self, cell: CellRef) -> Lowered:
        """The value of a cell."""

    def area_block(self, area: RangeRef) -> Block:
        """The values of a rectangle."""


class Lowering(Protocol):
    """The lowering of one formula, as far as function rules need it."""

    cell: CellRef
    emitter: Emitter

    @property
    def cells(self) -> Model:
        """The model's cells."""

    def lower(self, node: Node, *, whole: bool) -> Lowered:
        """An expression; references stay known references."""

    def operand(self, node: Node, *, whole: bool) -> Lowered:
        """An expression in a place for single values."""

    def dereference(self, value: Lowered, *, whole: bool) -> Lowered:
        """What a known reference refers to."""


@dataclass(frozen=True, slots=True)
class Arguments:
    """A call whose arguments are lowered.

    Attributes:
        lowering: The formula's lowering.
        node: The call.
        function: What is called.
        values: The lowered arguments.
        whole: Whether ranges are taken item by item.
    """

    lowering: Lowering
    node: Call
    function: FunctionRecord
    values: list[Lowered]
    whole: bool

    @property
    def emitter(self) -> Emitter:
        """Where instructions go."""
        return self.lowering.emitter

    def block(self, position: int) -> Block:
        """An argument as an array: the cells of a reference, a single value as one item."""
        value = self.lowering.dereference(self.values[position], whole=True)
        return value if isinstance(value, Block) else Block(1, 1, (value,))

    def is_range(self, position: int) -> bool:
        """Whether an argument is a range or array and not a single value."""
        value = self.values[position]
        return isinstance(value, Block) or (
            isinstance(value, Known) and isinstance(value.value, Reference)
        )

    def all_static(self) -> bool:
        """Whether every argument is the same in all draws."""
        return all(static_argument(self.lowering, value) is not None for value in self.values)


def static_argument(lowering: Lowering, value: Lowered) -> Argument | tuple[()] | None:
    """An argument that is the same in all draws as a function takes it; None if it varies.

    A blank is given as an empty tuple, to tell it from None.
    """
    if isinstance(value, Known):
        if isinstance(value.value, Reference):
            if any(lowering.cells.varying_in(area) for area in value.value.areas):
                return None
            return value.value
        return () if value.value is None else value.value
    if isinstance(value, Block) and all(isinstance(item, Known) for item in value.items):
        items: list[Scalar] = []
        for item in value.items:
            content = item.value if isinstance(item, Known) else None
            if isinstance(content, Reference) or callable(getattr(content, "call", None)):
                return None
            items.append(content)  # type: ignore[arg-type]
        return Array(value.rows, value.columns, items)
    return None


def fold_call(given: Arguments, positions: Sequence[int] | None = None) -> Value:
    """Call the function when compiling.

    Args:
        given: The call.
        positions: The arguments to give, all of them by default.

    Raises:
        UnlowerableError: One of them varies.
    """
    arguments: list[Argument] = []
    for position in range(len(given.values)) if positions is None else positions:
        static = static_argument(given.lowering, given.values[position])
        if static is None:
            raise UnlowerableError("an argument varies")
        arguments.append(None if static == () else static)  # type: ignore[arg-type]
    frame = given.lowering.cells.frame(given.lowering.cell)
    return call_function(given.function, arguments, frame, whole_arrays=given.whole)


def as_lowered(value: Value) -> Lowered:
    """A value found when compiling, as a lowered value."""
    if isinstance(value, Array):
        return Block(value.rows, value.columns, tuple(Known(item) for item in value.items))
    return Known(value)


def call_over_draws(given: Arguments) -> Lowered:
    """A call with its kernel over draws; folded when compiling where all arguments are static.

    Raises:
        UnlowerableError: It has no such kernel, or takes what such a kernel cannot.
    """
    if given.all_static() and not given.function.volatile:
        return as_lowered(fold_call(given))
    name = given.function.name
    if find_over_draws(name) is None:
        raise UnlowerableError(f"{name} has no form over draws")
    arguments: list[Operand | StackOperand] = []
    for position, value in enumerate(given.values):
        parameter = given.function.parameter(position)
        prepare = _PREPARATIONS.get(parameter.kind)
        if prepare is None:
            raise UnlowerableError(f"{name} takes an argument that has no form over draws")
        operand = prepare(given, position, value)
        error = _constant_error(operand)
        if error is not None and all(isinstance(argument, Constant) for argument in arguments):
            return Known(error)
        arguments.append(operand)
    if all(isinstance(a, StackOperand) and not a.items for a in arguments if _is_plain(a)) and any(
        map(_is_plain, arguments)
    ):
        raise UnlowerableError("ranges without a number")
    register = given.emitter.builder.emit_call(KernelCall(name, tuple(arguments)))
    if given.function.result == "logical":
        from_number = given.emitter.flag(Numeric(register))
        return given.emitter.flag_as_lowered(from_number)
    return Numeric(register)


def _is_plain(argument: Operand | StackOperand) -> bool:
    return isinstance(argument, StackOperand) and argument.plain


def strictly_single(emitter: Emitter, value: Lowered) -> Lowered:
    """An argument of a strict function: #VALUE! where it is a logical.

    Raises:
        UnlowerableError: What it is differs from draw to draw in more ways than a choice.
    """
    if isinstance(value, Known):
        return Known(ErrorValue.VALUE) if isinstance(value.value, bool) else value
    if isinstance(value, Flagged):
        return emitter.as_lowered(
            emitter.error_after(emitter.number(value), constant(encode_error(ErrorValue.VALUE)))
        )
    if isinstance(value, Choice):
        then = strictly_single(emitter, value.then)
        return emitter.select(value.flag, then, strictly_single(emitter, value.otherwise))
    if isinstance(value, Varied):
        raise UnlowerableError("a value that may be a logical in some draws")
    return value


def _constant_error(operand: Operand | StackOperand) -> ErrorValue | None:
    if isinstance(operand, Constant):
        value = operand.value
        if value != value:
            for error in ErrorValue:
                if constant(encode_error(error)) == operand:
                    return error
    return None


def _number_argument(given: Arguments, _position: int, value: Lowered) -> Operand:
    return given.emitter.exact_number(value)


def _scalar_argument(given: Arguments, _position: int, value: Lowered) -> Operand:
    if isinstance(value, Numeric) or (isinstance(value, Known) and isinstance(value.value, float)):
        return given.emitter.exact_number(value)
    raise UnlowerableError("a value that is no number in all draws")


def _logical_argument(given: Arguments, _position: int, value: Lowered) -> Operand:
    return given.emitter.number(given.emitter.flag_as_lowered(given.emitter.flag(value)))


def _items_argument(given: Arguments, position: int, value: Lowered) -> StackOperand:
    """The numbers of an argument by the rule of SUM: in ranges, only numbers count."""
    if not given.is_range(position):
        return StackOperand(1, 1, (given.emitter.number(value),), plain=True)
    operands: list[Operand] = []
    for item in given.block(position).items:
        operands += item_operands(given.emitter, item)
    return StackOperand(len(operands), 1, tuple(operands), plain=True)


def item_operands(emitter: Emitter, item: Lowered) -> list[Operand]:
    """The operand of an item of a range that counts as a number; none for text, logicals, blanks.

    Raises:
        UnlowerableError: It is a number in some draws only.
    """
    if isinstance(item, Numeric):
        return [item.operand]
    if isinstance(item, Known):
        if isinstance(item.value, (float, ErrorValue)):
            return [emitter.number(item)]
        return []
    if isinstance(item, Flagged):
        raise UnlowerableError("a range with logicals that may be errors in some draws")
    raise UnlowerableError("a range with cells that are numbers in some draws only")


def _stack_argument(given: Arguments, position: int, _value: Lowered) -> StackOperand:
    block = given.block(position)
    operands: list[Operand] = []
    for item in block.items:
        found = item_operands(given.emitter, item)
        if not found:
            raise UnlowerableError("a range with cells that are no numbers")
        operands += found
    return StackOperand(block.rows, block.columns, tuple(operands), plain=False)


_PREPARATIONS: dict[ArgumentKind, Callable[[Arguments, int, Lowered], Operand | StackOperand]] = {
    ArgumentKind.NUMBER: _number_argument,
    ArgumentKind.WHOLE: _number_argument,
    ArgumentKind.SCALAR: _scalar_argument,
    ArgumentKind.LOGICAL: _logical_argument,
    ArgumentKind.NUMBER_ITEMS: _items_argument,
    ArgumentKind.VALUES: _stack_argument,
    ArgumentKind.ARRAY_VALUES: _stack_argument,
    ArgumentKind.MATRIX: _stack_argument,
    ArgumentKind.OPERAND: _stack_argument,
}
