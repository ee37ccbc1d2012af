"""A formula's last sum or difference is zero where its operands cancel: when that has to be looked at.

Looking at every one of them in every draw costs as much as the arithmetic itself. It matters only where
something can tell a tiny number from zero: a denominator, a comparison, a kernel that is not continuous.
So a block may run without looking, if no such operand comes near the noise that unlooked-at
cancellations can have left in it. That noise is carried through the program to first order, from the
magnitudes that the registers had in an earlier block. A block in doubt runs again, looking at
each of them.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.functions.operators import CANCELLATION
from cellsim.program.ir import Constant, Instruction, Op, Operand, Program, Register

AnyArray = npt.NDArray[Any]

PLAIN_OPS = {Op.ADD_LAST: Op.ADD, Op.SUBTRACT_LAST: Op.SUBTRACT}
"""Last sums and differences, and the operations that they are but for cancellation."""

_UFUNCS: dict[Op, np.ufunc] = {Op.ADD_LAST: np.add, Op.SUBTRACT_LAST: np.subtract}
_SAFETY = 1e4
"""How far above the noise an operand must be: room for many noises that add up, and for magnitudes
larger than the earlier block's."""

_LINEAR = frozenset({Op.ADD, Op.SUBTRACT, Op.ADD_LAST, Op.SUBTRACT_LAST})
_CHOOSING = frozenset(
    {Op.NEGATE, Op.ABSOLUTE, Op.MINIMUM, Op.MAXIMUM, Op.SELECT, Op.IF_ERROR, Op.IF_NA, Op.AS_NUMBER}
)
_CONTINUOUS = _LINEAR | _CHOOSING | {Op.MULTIPLY, Op.EXP}
_CONTINUOUS_FUNCTIONS = frozenset({"SUM", "AVERAGE", "SUMPRODUCT", "NPV", "MIN", "MAX", "MEDIAN"})


def add_last(op: Op, left: AnyArray, right: AnyArray, out: AnyArray) -> None:
    """A formula's last sum or difference: zero where it is tiny beside its left operand.

    Args:
        op: ADD_LAST or SUBTRACT_LAST.
        left: Numbers, shape (draws,) or ().
        right: Numbers, likewise.
        out: Where the result goes, shape (draws,).
    """
    _UFUNCS[op](left, right, out=out)
    least, most = np.minimum.reduce(out), np.maximum.reduce(out)
    if least > 0 or most < 0:  # far from zero in all draws: most blocks end here
        largest = max(
            abs(np.minimum.reduce(left, axis=None)), abs(np.maximum.reduce(left, axis=None))
        )
        if min(abs(least), abs(most)) > largest * CANCELLATION:
            return
    tiny = np.absolute(out) <= np.absolute(left) * CANCELLATION
    if tiny.any():
        out[tiny] = 0.0


def is_doubtful(values: AnyArray, noise: float) -> bool:
    """Whether some number is not zero, but no larger than the noise."""
    if np.minimum.reduce(values) > noise or np.maximum.reduce(values) < -noise:
        return False
    return bool(((np.absolute(values) <= noise) & (values != 0)).any())


def relax_cancellation(
    instructions: Sequence[Instruction], outputs: set[int]
) -> tuple[Instruction, ...]:
    """The instructions, without cancellation where nothing later can tell a tiny number from zero.

    Args:
        instructions: In order.
        outputs: The registers that are given out.
    """
    telling: set[int] = set()
    relaxed: list[Instruction] = []
    for instruction in reversed(instructions):
        plain = PLAIN_OPS.get(instruction.op)
        target = instruction.target
        if plain is not None and target not in telling and target not in outputs:
            instruction = dataclasses.replace(instruction, op=plain)  # noqa: PLW2901
        relaxed.append(instruction)
        telling.update(
            operand.number
            for place, operand in enumerate(instruction.operands)
            if isinstance(operand, Register) and (target in telling or _tells(instruction, place))
        )
    return tuple(reversed(relaxed))


def _tells(instruction: Instruction, place: int) -> bool:
    """Whether an instruction can by itself tell a tiny operand from zero."""
    op = instruction.op
    if op is Op.DIVIDE:
        return place == 1
    if op is Op.CALL:
        return instruction.detail.function not in _CONTINUOUS_FUNCTIONS
    return op not in _CONTINUOUS


@dataclasses.dataclass(slots=True)
class Magnitudes:
    """The largest absolute values that registers had in a block."""

    largest: dict[int, float] = dataclasses.field(default_factory=dict)

    def record(self, register: int, values: AnyArray) -> None:
        """Take note of a register's values; draws that failed are passed over."""
        sizes = np.absolute(values[~np.isnan(values)])
        if sizes.size:
            self.largest[register] = float(sizes.max())


def doubt_limits(program: Program, magnitudes: Magnitudes) -> dict[int, float]:
    """The registers to watch if cancellation is not looked at, and how near zero they may come.

    Args:
        program: The program.
        magnitudes: What its registers of numbers held in a block without errors.
    """
    # a register that was zero in that block may hold anything in another
    unknown = max(magnitudes.largest.values(), default=0.0) or 1.0
    sizes = {register: size or unknown for register, size in magnitudes.largest.items()}
    noise: dict[int, float] = {}
    limits: dict[int, float] = {}
    for instruction in program.instructions:
        operands = instruction.operands
        for place, operand in enumerate(operands):
            if (
                isinstance(operand, Register)
                and noise.get(operand.number)
                and _tells(instruction, place)
            ):
                limits[operand.number] = _SAFETY * noise[operand.number]
        own = _noise_of(instruction, noise, sizes)
        if own:
            noise[instruction.target] = own
    return limits


def _noise_of(
    instruction: Instruction,
    noise: Mapping[int, float],
    sizes: Mapping[int, float],
) -> float:
    """What unlooked-at cancellations can change a result by, to first order."""

    def noise_in(operand: Operand) -> float:
        return noise.get(operand.number, 0.0) if isinstance(operand, Register) else 0.0

    def size(operand: Operand) -> float:
        if isinstance(operand, Constant):
            return abs(operand.value)
        return sizes.get(operand.number, 1.0)

    op, operands = instruction.op, instruction.operands
    noises = [noise_in(operand) for operand in operands]
    own = CANCELLATION * size(operands[0]) if op in PLAIN_OPS else 0.0
    result = 0.0
    if op in _LINEAR:
        # not the sum: along a chain of balances the same noise comes in by both operands
        result = max(own, *noises)
    elif op in _CHOOSING:
        result = max(noises)
    elif op is Op.MULTIPLY:
        result = noises[0] * size(operands[1]) + noises[1] * size(operands[0])
    elif op is Op.DIVIDE:  # relative noises add up
        relative = sum(n / size(operand) for n, operand in zip(noises, operands, strict=True) if n)
        result = relative * size(Register(instruction.target))
    elif op is Op.EXP:
        result = noises[0] * size(Register(instruction.target))
    elif op is Op.CALL and instruction.detail.function in _CONTINUOUS_FUNCTIONS:
        result = sum(noises) * max(1.0, *(size(operand) for operand in operands))
    return result
