"""Careful steps: the same operations for blocks in which draws have failed.

An error is a NaN whose payload names it. Arithmetic would lose or mix payloads, comparisons would
turn errors into FALSE, and a division by zero would become infinity and then a plausible zero; here
each operation puts the error of its leftmost failing operand into the draw's result. Flags cannot
hold a NaN, so the errors of a flag register are kept beside it, in `poison`.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.program.buffers import Buffers
from cellsim.program.calculation import Calculation
from cellsim.program.comparisons import COMPARISONS, compare_over_draws, settle_cancellation
from cellsim.program.fast import (
    UFUNCS,
    argument_kinds,
    choice_step,
    expression_runner,
    kernel_runner,
    looks_into_errors,
    object_converter,
)
from cellsim.program.ir import Constant, Instruction, Op, Operand, StackOperand
from cellsim.values import ErrorValue, encode_error

Step = Callable[[], Any]
AnyArray = npt.NDArray[Any]
Poison = dict[int, npt.NDArray[np.float64] | None]

_DIV0 = encode_error(ErrorValue.DIV0)
_NUM = encode_error(ErrorValue.NUM)
_NA_CODE = np.array(encode_error(ErrorValue.NA)).view(np.uint64) & np.uint64(0xFF)


def careful_step(
    instruction: Instruction, buffers: Buffers, base: Calculation, poison: Poison
) -> Step:
    """The careful step of an instruction, bound to its buffers.

    Args:
        instruction: Any instruction but LOOP.
        buffers: Where its operands and its target live.
        base: The base case.
        poison: Errors of flag registers, by register, filled by the steps.
    """
    operands = [buffers.operand(operand) for operand in instruction.operands]
    out = buffers.array(instruction.target)
    bound = _Bound(instruction, operands, out, poison)
    op = instruction.op
    if op is Op.CALL:
        run = kernel_runner(instruction.detail, buffers, base, careful=True)
        call = instruction.detail
        passed = [
            buffers.operand(operand)
            for argument, kind in zip(call.arguments, argument_kinds(call), strict=True)
            if not looks_into_errors(kind, argument)
            for operand in (argument.items if isinstance(argument, StackOperand) else (argument,))
        ]
        return lambda: _call(out, run, passed)
    if op is Op.INTERPRET:
        evaluate = expression_runner(instruction, operands, base, out)
        return lambda: _interpret(bound, evaluate)
    if op is Op.CHOICE:
        return choice_step(instruction.detail, buffers, out)
    if op is Op.TO_NUMBER:
        return object_converter(operands[0], out, date_1904=base.date_1904)
    step = _STEPS[op]
    return lambda: step(bound)


class _Bound:
    """An instruction with its buffers."""

    __slots__ = ("instruction", "operands", "out", "poison", "registers")

    def __init__(
        self, instruction: Instruction, operands: Sequence[AnyArray], out: AnyArray, poison: Poison
    ) -> None:
        self.instruction = instruction
        self.operands = operands
        self.out = out
        self.poison = poison
        self.registers = instruction.operands

    def errors_of_flag(self, place: int) -> AnyArray | None:
        """The errors of a flag operand: NaN where it is one; None if it has none."""
        operand: Operand = self.registers[place]
        if isinstance(operand, Constant):
            return np.full(len(self.out), operand.value) if operand.value != operand.value else None
        return self.poison.get(operand.number)

    def set_errors(self, errors: AnyArray | None) -> None:
        """Record the errors of the flag that the instruction writes."""
        self.poison[self.instruction.target] = errors


def _put_errors(out: AnyArray, operands: Sequence[AnyArray]) -> None:
    """Put the error of the leftmost failing operand into each draw."""
    for operand in reversed(operands):
        failing = np.isnan(operand)
        if failing.any():
            np.copyto(out, operand, where=failing)


def _arithmetic(bound: _Bound) -> None:
    out, operands = bound.out, bound.operands
    UFUNCS[bound.instruction.op](*operands, out=out)
    out[~np.isfinite(out)] = _NUM
    if bound.instruction.op is Op.DIVIDE:
        np.copyto(out, _DIV0, where=operands[1] == 0)
    _put_errors(out, operands)


def _power(bound: _Bound) -> None:
    base, exponent = bound.operands
    np.power(base, exponent, bound.out)
    bound.out[~np.isfinite(bound.out)] = _NUM
    np.copyto(bound.out, _NUM, where=(base == 0) & (exponent == 0))
    np.copyto(bound.out, _DIV0, where=(base == 0) & (exponent < 0))
    _put_errors(bound.out, bound.operands)


def _cancel(bound: _Bound) -> None:
    settle_cancellation(bound.operands[0], bound.operands[1], bound.out)
    _put_errors(bound.out, bound.operands[:1])


def _first_errors(operands: Sequence[AnyArray], size: int) -> AnyArray | None:
    """The error of the leftmost failing operand by draw, zero elsewhere; None if none fails."""
    errors: AnyArray | None = None
    for operand in reversed(operands):
        failing = np.isnan(operand)
        if failing.any():
            if errors is None:
                errors = np.zeros(size)
            np.copyto(errors, operand, where=failing)
    return errors


def _compare(bound: _Bound) -> None:
    left, right = bound.operands
    compare_over_draws(bound.instruction.op, left, right, bound.out)
    bound.set_errors(_first_errors((left, right), len(bound.out)))


def _is_true(bound: _Bound) -> None:
    np.not_equal(bound.operands[0], 0.0, bound.out)
    bound.set_errors(_first_errors(bound.operands, len(bound.out)))


def _connect(bound: _Bound) -> None:
    UFUNCS[bound.instruction.op](*bound.operands, out=bound.out)
    errors = [bound.errors_of_flag(place) for place in range(len(bound.operands))]
    bound.set_errors(_first_errors([e for e in errors if e is not None], len(bound.out)))


def _as_number(bound: _Bound) -> None:
    np.copyto(bound.out, bound.operands[0], casting="unsafe")
    errors = bound.errors_of_flag(0)
    if errors is not None:
        _put_errors(bound.out, [errors])


def _select(bound: _Bound) -> None:
    flag, then, otherwise = bound.operands
    bound.out[:] = np.where(flag, then, otherwise)
    errors = bound.errors_of_flag(0)
    if errors is not None:
        _put_errors(bound.out, [errors])


def _select_flag(bound: _Bound) -> None:
    flag, then, otherwise = bound.operands
    bound.out[:] = np.where(flag, then.astype(bool), otherwise.astype(bool))
    size = len(bound.out)
    branches = [bound.errors_of_flag(place) for place in (1, 2)]
    chosen: AnyArray | None = None
    if branches[0] is not None or branches[1] is not None:
        zeros = np.zeros(size)
        a, b = (zeros if branch is None else branch for branch in branches)
        chosen = np.where(flag, a, b)
    errors = [e for e in (bound.errors_of_flag(0), chosen) if e is not None]
    bound.set_errors(_first_errors(errors, size))


def _is_error(bound: _Bound) -> None:
    np.isnan(bound.operands[0], bound.out)
    bound.set_errors(None)


def is_na(values: AnyArray) -> npt.NDArray[np.bool_]:
    """Where numbers over draws are the error #N/A."""
    codes = np.ascontiguousarray(values).view(np.uint64) & np.uint64(0xFF)
    return np.asarray(np.isnan(values) & (codes == _NA_CODE))


def _same_error(bound: _Bound) -> None:
    left, right = np.broadcast_arrays(*bound.operands)
    codes = [np.ascontiguousarray(side).view(np.uint64) & np.uint64(0xFF) for side in (left, right)]
    bound.out[:] = np.isnan(left) & np.isnan(right) & (codes[0] == codes[1])
    bound.set_errors(None)


def _is_na(bound: _Bound) -> None:
    bound.out[:] = is_na(bound.operands[0])
    bound.set_errors(None)


def _if_error(bound: _Bound) -> None:
    value, instead = bound.operands
    bound.out[:] = np.where(np.isnan(value), instead, value)


def _if_na(bound: _Bound) -> None:
    value, instead = bound.operands
    bound.out[:] = np.where(is_na(value), instead, value)


def _call(out: AnyArray, run: Callable[[], AnyArray], passed: Sequence[AnyArray]) -> None:
    """Call a kernel; the operands whose errors become the result's are given apart."""
    out[:] = run()
    infinite = np.isinf(out)
    if infinite.any():
        out[infinite] = _NUM
    _put_errors(out, passed)


def _interpret(_bound: _Bound, evaluate: Step) -> None:
    evaluate()


_STEPS: dict[Op, Callable[[_Bound], None]] = {
    **dict.fromkeys(
        (
            Op.ADD, Op.SUBTRACT, Op.MULTIPLY, Op.DIVIDE, Op.NEGATE, Op.ABSOLUTE, Op.EXP, Op.LN, Op.SQRT,
            Op.MINIMUM, Op.MAXIMUM,
        ),
        _arithmetic,
    ),
    **dict.fromkeys(COMPARISONS, _compare),
    Op.POWER: _power,
    Op.CANCEL: _cancel,
    Op.AND: _connect,
    Op.OR: _connect,
    Op.NOT: _connect,
    Op.IS_TRUE: _is_true,
    Op.AS_NUMBER: _as_number,
    Op.SELECT: _select,
    Op.SELECT_FLAG: _select_flag,
    Op.IS_ERROR: _is_error,
    Op.IS_NA: _is_na,
    Op.SAME_ERROR: _same_error,
    Op.IF_ERROR: _if_error,
    Op.IF_NA: _if_na,
}  # fmt: skip
