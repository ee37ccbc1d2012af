"""The instruction set: a flat program over draws, in single-assignment form.

Each instruction writes one register and reads earlier ones. A register is either numbers (float64,
a spreadsheet error being a NaN whose payload names it), flags (logicals), or objects (any scalar,
only where text can occur). Guarantees:

- a register is written once, before it is read;
- the first `len(inputs)` registers are the inputs, in order;
- constants are operands, never instructions;
- two instructions never compute the same thing (`Builder` shares them).
"""

from __future__ import annotations

import enum
import struct
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, TypeAlias

from cellsim.cells import CellRef
from cellsim.formula.tree import Node


class Kind(enum.Enum):
    """What a register holds."""

    NUMBER = "number"
    FLAG = "flag"
    OBJECT = "object"


class Op(enum.Enum):
    """The operations; the operands' kinds are in brackets."""

    ADD = "add"
    SUBTRACT = "subtract"
    MULTIPLY = "multiply"
    DIVIDE = "divide"
    POWER = "power"
    NEGATE = "negate"
    ABSOLUTE = "absolute"
    EXP = "exp"
    LN = "ln"
    SQRT = "sqrt"
    MINIMUM = "minimum"
    MAXIMUM = "maximum"
    CANCEL = "cancel"  # [sum or difference, its left operand] zero where the two operands cancel
    EQUAL = "equal"  # the comparisons give flags
    NOT_EQUAL = "not equal"
    LESS = "less"
    LESS_EQUAL = "less or equal"
    GREATER = "greater"
    GREATER_EQUAL = "greater or equal"
    AND = "and"  # [flag, flag]
    OR = "or"  # [flag, flag]
    NOT = "not"  # [flag]
    IS_TRUE = "is true"  # [number] flag: the number is not zero
    AS_NUMBER = "as number"  # [flag] 1 and 0
    SELECT = "select"  # [flag, number, number]
    SELECT_FLAG = "select flag"  # [flag, flag, flag]
    IF_ERROR = "if error"  # [number, number]
    IF_NA = "if n/a"  # [number, number]
    IS_ERROR = "is error"  # [number] flag
    IS_NA = "is n/a"  # [number] flag
    CALL = "call"  # a kernel over draws; arguments in `detail`
    INTERPRET = "interpret"  # an expression taken draw by draw; `detail` is an Expression
    TO_NUMBER = "to number"  # [object] coerced as an operator does
    LOOP = "loop"  # a circular chain; `detail` is a Loop


FLAG_OPS = frozenset(
    {
        Op.EQUAL, Op.NOT_EQUAL, Op.LESS, Op.LESS_EQUAL, Op.GREATER, Op.GREATER_EQUAL,
        Op.AND, Op.OR, Op.NOT, Op.IS_TRUE, Op.SELECT_FLAG, Op.IS_ERROR, Op.IS_NA,
    }
)  # fmt: skip
"""Operations that give flags."""

COMMUTATIVE = frozenset({Op.MULTIPLY, Op.ADD})


@dataclass(frozen=True, slots=True)
class Register:
    """A register as an operand."""

    number: int


@dataclass(frozen=True, slots=True)
class Constant:
    """A number known when compiling; an error is its NaN, flags are 1.0 and 0.0.

    Attributes:
        bits: The bits of the number, so that equal NaNs are equal constants.
    """

    bits: int

    @property
    def value(self) -> float:
        """The number."""
        return float(struct.unpack("<d", struct.pack("<Q", self.bits))[0])


def constant(value: float) -> Constant:
    """The constant for a number."""
    return Constant(struct.unpack("<Q", struct.pack("<d", value))[0])


Operand: TypeAlias = Register | Constant


@dataclass(frozen=True, slots=True)
class StackOperand:
    """A rectangle of operands, row by row, as an argument of a kernel over draws.

    Attributes:
        rows: Number of rows.
        columns: Number of columns.
        items: The operands, `rows * columns` of them.
        plain: Whether the kernel gets the bare array of shape (items, draws) and not a `Stack`.
    """

    rows: int
    columns: int
    items: tuple[Operand, ...]
    plain: bool


@dataclass(frozen=True, slots=True)
class KernelCall:
    """A call of a kernel over draws.

    Attributes:
        function: Name of the spreadsheet function.
        arguments: Its arguments in order.
    """

    function: str
    arguments: tuple[Operand | StackOperand, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Expression:
    """An expression that is evaluated draw by draw by the reference evaluator.

    Attributes:
        tree: The expression.
        cell: The formula's cell.
        whole: Whether ranges are taken item by item.
        reads: The cells that it may read which vary, each with its operand and kind.
        reason: Why there is no faster form.
        item: Which item of an array result is wanted: row and column from 0.
        recalculate: Whether the whole model is calculated again and not just the expression; the
            cells that it reads are then the inputs.
        spilled: Whether cells beyond the end of an array result are blank (and not #N/A).
    """

    tree: Node
    cell: CellRef
    whole: bool
    reads: tuple[tuple[CellRef, Operand, Kind], ...]
    reason: str
    item: tuple[int, int]
    recalculate: bool = False
    spilled: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Loop:
    """A circular chain, solved by passes per draw.

    Attributes:
        carried: Registers that hold the values of the last pass when a pass begins.
        start: Values of the carried registers before the first pass.
        body: The instructions of one pass.
        results: For each carried register, the operand that holds its new value.
        passes: The most passes.
        cells: The cells of the chain.
    """

    carried: tuple[int, ...]
    start: tuple[float, ...]
    body: tuple[Instruction, ...]
    results: tuple[Operand, ...]
    passes: int
    cells: tuple[CellRef, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Instruction:
    """One instruction.

    Attributes:
        target: The register that it writes.
        kind: What that register holds.
        op: The operation.
        operands: What it reads; for CALL, INTERPRET and LOOP all registers that it reads.
        detail: KernelCall, Expression or Loop.
    """

    target: int
    kind: Kind
    op: Op
    operands: tuple[Operand, ...]
    detail: Any = None


@dataclass(frozen=True, slots=True, eq=False)
class Program:
    """A compiled model.

    Attributes:
        inputs: The input cells, whose values are the first registers.
        instructions: In order.
        outputs: Operand and kind of each output.
        registers: How many registers there are.
    """

    inputs: tuple[CellRef, ...]
    instructions: tuple[Instruction, ...]
    outputs: tuple[tuple[Operand, Kind], ...]
    registers: int

    @property
    def slow(self) -> tuple[Expression, ...]:
        """The expressions that are evaluated draw by draw."""
        found: list[Expression] = []
        for instruction in self.instructions:
            found += slow_expressions(instruction)
        return tuple(found)


def slow_expressions(instruction: Instruction) -> list[Expression]:
    """The expressions evaluated draw by draw in an instruction, those inside loops included."""
    if instruction.op is Op.INTERPRET:
        return [instruction.detail]
    if instruction.op is Op.LOOP:
        return [found for inner in instruction.detail.body for found in slow_expressions(inner)]
    return []


class Builder:
    """Emits instructions; what was emitted before is shared."""

    def __init__(self, inputs: Sequence[CellRef]) -> None:
        self.inputs = tuple(inputs)
        self.instructions: list[Instruction] = []
        self.registers = len(self.inputs)
        self._known: dict[object, Register] = {}
        self._outer: list[tuple[list[Instruction], dict[object, Register]]] = []

    def emit(self, op: Op, *operands: Operand, kind: Kind | None = None) -> Register:
        """Emit an operation, or give the register that already holds its result."""
        if op in COMMUTATIVE and isinstance(operands[0], Constant):
            operands = (operands[1], operands[0])  # a NaN constant never stands here
        if kind is None:
            kind = Kind.FLAG if op in FLAG_OPS else Kind.NUMBER
        return self._shared((op, operands), kind, op, operands, None)

    def emit_call(self, call: KernelCall) -> Register:
        """Emit a call of a kernel over draws."""
        operands: list[Operand] = []
        for argument in call.arguments:
            operands += argument.items if isinstance(argument, StackOperand) else [argument]
        return self._shared(call, Kind.NUMBER, Op.CALL, tuple(operands), call)

    def emit_expression(self, expression: Expression, kind: Kind) -> Register:
        """Emit an expression that is evaluated draw by draw."""
        operands = tuple(operand for _, operand, _ in expression.reads)
        key = (id(expression.tree), expression.cell, expression.whole, expression.item, kind)
        return self._shared(key, kind, Op.INTERPRET, operands, expression)

    def _shared(
        self, key: object, kind: Kind, op: Op, operands: tuple[Operand, ...], detail: Any
    ) -> Register:
        register = self._known.get(key)
        if register is None:
            register = self.new_register()
            self.instructions.append(Instruction(register.number, kind, op, operands, detail))
            self._known[key] = register
        return register

    def new_register(self) -> Register:
        """A register that nothing writes yet."""
        register = Register(self.registers)
        self.registers += 1
        return register

    def open_loop(self) -> None:
        """Begin the body of a loop: what follows is kept apart until it is closed."""
        self._outer.append((self.instructions, self._known))
        self.instructions = []
        self._known = dict(self._known)

    def close_loop(self) -> tuple[Instruction, ...]:
        """End the body of a loop and give its instructions."""
        body = tuple(self.instructions)
        self.instructions, self._known = self._outer.pop()
        return body

    def emit_loop(self, loop: Loop, operands: tuple[Operand, ...]) -> Register:
        """Emit a loop; its carried registers hold the solution afterwards."""
        register = self.new_register()
        self.instructions.append(Instruction(register.number, Kind.NUMBER, Op.LOOP, operands, loop))
        return register


def eliminate_dead_code(
    instructions: Sequence[Instruction], needed: set[int]
) -> tuple[Instruction, ...]:
    """The instructions that the needed registers depend on, in order; `needed` grows to all read."""
    kept: list[Instruction] = []
    for instruction in reversed(instructions):
        written = {instruction.target}
        if instruction.op is Op.LOOP:
            written |= set(instruction.detail.carried)
        if written.isdisjoint(needed):
            continue
        kept.append(instruction)
        needed.update(o.number for o in instruction.operands if isinstance(o, Register))
    return tuple(reversed(kept))
