"""Fast steps: plain array operations for blocks in which no draw has failed so far.

NumPy raises a fault as soon as an operation divides by zero, overflows or leaves its domain; steps
that can give an error without such a fault raise the given exception themselves.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from functools import partial
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.cells import CellRef
from cellsim.functions.coercion import to_number
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import (
    ArgumentKind,
    FunctionRecord,
    Stack,
    find_function,
    find_over_draws,
)
from cellsim.program.buffers import Buffers
from cellsim.program.calculation import Calculation
from cellsim.program.comparisons import compare_over_draws, settle_cancellation
from cellsim.program.draw_by_draw import ExpressionEvaluator, as_numbers, choice_runner
from cellsim.program.emit import is_error
from cellsim.program.interpret import Frame
from cellsim.program.ir import (
    Constant,
    Instruction,
    KernelCall,
    Kind,
    MixedChoice,
    Op,
    Operand,
    StackOperand,
)
from cellsim.values import Array, Fault, Scalar, Value, decode_error, encode_error

Step = Callable[[], Any]
AnyArray = npt.NDArray[Any]

UFUNCS: dict[Op, np.ufunc] = {
    Op.ADD: np.add,
    Op.SUBTRACT: np.subtract,
    Op.MULTIPLY: np.multiply,
    Op.DIVIDE: np.divide,
    Op.NEGATE: np.negative,
    Op.ABSOLUTE: np.absolute,
    Op.EXP: np.exp,
    Op.LN: np.log,
    Op.SQRT: np.sqrt,
    Op.MINIMUM: np.minimum,
    Op.MAXIMUM: np.maximum,
    Op.AND: np.logical_and,
    Op.OR: np.logical_or,
    Op.NOT: np.logical_not,
}


def fast_step(
    instruction: Instruction, buffers: Buffers, base: Calculation, go_carefully: type[Exception]
) -> Step:
    """The fast step of an instruction, bound to its buffers.

    Args:
        instruction: Any instruction but LOOP.
        buffers: Where its operands and its target live.
        base: The base case.
        go_carefully: What a step raises when a draw has failed without a floating-point fault.
    """
    op = instruction.op
    out = buffers.array(instruction.target)
    if op is Op.CALL:
        return _call(instruction.detail, buffers, base, out, go_carefully)
    operands = [buffers.operand(operand) for operand in instruction.operands]
    if op is Op.INTERPRET:
        return _interpret(instruction, operands, base, out, go_carefully)
    if op is Op.CHOICE:
        return choice_step(instruction.detail, buffers, out)
    if op is Op.TO_NUMBER:
        convert = object_converter(operands[0], out, date_1904=base.date_1904)
        return partial(_check_after, convert, out, go_carefully)
    ufunc = UFUNCS.get(op)
    if ufunc is not None:
        return partial(ufunc, *operands, out=out)
    constant_error = any(
        isinstance(operand, Constant) and operand.value != operand.value
        for operand in instruction.operands
    )
    if constant_error:
        return partial(_check_after, _OTHERS[op](operands, out), out, go_carefully)
    return _OTHERS[op](operands, out)


def _check_after(step: Step, out: AnyArray, go_carefully: type[Exception]) -> None:
    step()
    if out.dtype != bool and np.isnan(out).any():
        raise go_carefully
    if out.dtype == bool:
        raise go_carefully  # which flags are errors is only known to the careful step


def _power(operands: list[AnyArray], out: AnyArray) -> Step:
    base, exponent = operands

    def step() -> None:
        if not exponent.ndim and exponent != 0:
            np.power(base, exponent, out)
            return
        if np.any((base == 0) & (exponent == 0)):
            raise FloatingPointError
        np.power(base, exponent, out)

    return step


def _select(operands: list[AnyArray], out: AnyArray) -> Step:
    flag, then, otherwise = operands

    def step() -> None:
        out[:] = np.where(flag, then, otherwise)

    return step


def _select_flag(operands: list[AnyArray], out: AnyArray) -> Step:
    flag, then, otherwise = (
        operand.astype(bool) if operand.dtype != bool else operand for operand in operands
    )

    def step() -> None:
        out[:] = np.where(flag, then, otherwise)

    return step


def _copy(operands: list[AnyArray], out: AnyArray) -> Step:
    return partial(np.copyto, out, operands[0], casting="unsafe")


def _none_fails(_operands: list[AnyArray], out: AnyArray) -> Step:
    return partial(out.fill, False)


def _is_true(operands: list[AnyArray], out: AnyArray) -> Step:
    return partial(np.not_equal, operands[0], 0.0, out=out)


def _compare(op: Op) -> Callable[[list[AnyArray], AnyArray], Step]:
    return lambda operands, out: partial(compare_over_draws, op, operands[0], operands[1], out)


def _cancel(operands: list[AnyArray], out: AnyArray) -> Step:
    return partial(settle_cancellation, operands[0], operands[1], out)


_OTHERS: dict[Op, Callable[[list[AnyArray], AnyArray], Step]] = {
    Op.POWER: _power,
    Op.SELECT: _select,
    Op.SELECT_FLAG: _select_flag,
    Op.IF_ERROR: _copy,
    Op.IF_NA: _copy,
    Op.IS_ERROR: _none_fails,
    Op.IS_NA: _none_fails,
    Op.SAME_ERROR: _none_fails,
    Op.IS_TRUE: _is_true,
    Op.AS_NUMBER: _copy,
    Op.CANCEL: _cancel,
    **{
        op: _compare(op)
        for op in (Op.EQUAL, Op.NOT_EQUAL, Op.LESS, Op.LESS_EQUAL, Op.GREATER, Op.GREATER_EQUAL)
    },
}


def _call(
    call: KernelCall,
    buffers: Buffers,
    base: Calculation,
    out: AnyArray,
    go_carefully: type[Exception],
) -> Step:
    if any(
        isinstance(argument, StackOperand) and any(map(is_error, argument.items))
        for argument in call.arguments
    ):
        return partial(_refuse, go_carefully)
    run = kernel_runner(call, buffers, base, careful=False)

    def step() -> None:
        result = run()
        out[:] = result
        if not np.isfinite(out).all():
            raise go_carefully

    return step


def _refuse(go_carefully: type[Exception]) -> None:
    raise go_carefully


def kernel_runner(
    call: KernelCall, buffers: Buffers, base: Calculation, *, careful: bool
) -> Callable[[], AnyArray]:
    """A function that calls a kernel over draws on the buffers of its arguments.

    Args:
        call: What to call.
        buffers: Where its arguments live.
        base: The base case.
        careful: Whether arguments may hold errors. Draws in which a rectangle does are then left to
            the kernel for single draws.
    """
    kernel = find_over_draws(call.function)
    if kernel is None:
        raise LookupError(call.function)
    function = _function_of(call)
    kinds = argument_kinds(call)
    gather = [
        _argument(argument, buffers, whole=kinds[place] is ArgumentKind.WHOLE)
        for place, argument in enumerate(call.arguments)
    ]
    looked_into = [
        place
        for place, argument in enumerate(call.arguments)
        if looks_into_errors(kinds[place], argument)
    ]

    def run() -> AnyArray:
        arguments = [argument() for argument in gather]
        with np.errstate(all="ignore"):
            result = kernel(*arguments)
        if result is None:
            return _one_by_one(function, arguments, range(buffers.block), base)
        if careful and looked_into:
            failing = np.flatnonzero(
                _holding_errors([arguments[p] for p in looked_into], buffers.block)
            )
            if failing.size:
                result = np.array(np.broadcast_to(result, buffers.block))
                result[failing] = _one_by_one(function, arguments, failing, base)
        return result

    return run


def _function_of(call: KernelCall) -> FunctionRecord:
    function = find_function(call.function)
    if function is None:
        raise LookupError(call.function)
    return function


def argument_kinds(call: KernelCall) -> list[ArgumentKind]:
    """How each argument of a call reaches its kernel."""
    function = _function_of(call)
    return [function.parameter(place).kind for place in range(len(call.arguments))]


def looks_into_errors(kind: ArgumentKind, argument: Operand | StackOperand) -> bool:
    """Whether it is for the function to say what an error in an argument means.

    Where only numbers count, an error is the result; a lookup passes over errors beside the key.
    """
    return kind is ArgumentKind.ANY_SCALAR or (
        isinstance(argument, StackOperand) and not argument.plain
    )


def _holding_errors(arguments: Sequence[Any], draws: int) -> AnyArray:
    """The draws in which an argument is an error or holds one."""
    failing = np.zeros(draws, dtype=bool)
    for argument in arguments:
        if isinstance(argument, Stack):
            failing |= np.isnan(argument.data).any(axis=0)
        else:
            failing |= np.isnan(argument)
    return failing


def _one_by_one(
    function: FunctionRecord, arguments: list[Any], draws: Iterable[int], base: Calculation
) -> AnyArray:
    """A function's kernel for single draws, where that over draws does not serve."""
    frame = Frame(base, CellRef(base.graph.resolver.titles()[0], 1, 1))
    with base.lock:
        values = [
            call_function(
                function,
                [_of_draw(argument, draw) for argument in arguments],
                frame,
                whole_arrays=True,
            )
            for draw in draws
        ]
    return as_numbers([value.items[0] if isinstance(value, Array) else value for value in values])  # type: ignore[misc]


def _of_draw(argument: Any, draw: int) -> Value:
    if isinstance(argument, Stack):
        return Array(
            argument.rows, argument.columns, [number_of(x) for x in argument.data[:, draw]]
        )
    if isinstance(argument, float):
        return number_of(argument)
    if argument.ndim == 2:
        return Array(len(argument), 1, [number_of(x) for x in argument[:, draw]])
    return number_of(argument[draw])


def number_of(number: float) -> Scalar:
    """A number over draws in one draw: itself, or the error that it encodes."""
    value = float(number)
    return value if value == value else decode_error(value)


def _argument(argument: Any, buffers: Buffers, *, whole: bool) -> Callable[[], Any]:
    if not isinstance(argument, StackOperand):
        array = buffers.operand(argument)
        if array.ndim:
            return (lambda: np.trunc(array)) if whole else lambda: array
        number = float(np.trunc(array)) if whole else float(array)
        return lambda: number
    rows = [buffers.operand(item) for item in argument.items]
    data = np.empty((len(rows), buffers.block))
    varying = [(place, row) for place, row in enumerate(rows) if row.ndim]
    for place, row in enumerate(rows):
        if not row.ndim:
            data[place] = row

    def gather() -> Any:
        for place, row in varying:
            data[place] = row
        return data if argument.plain else Stack(argument.rows, argument.columns, data)

    return gather


def _interpret(
    instruction: Instruction,
    operands: list[AnyArray],
    base: Calculation,
    out: AnyArray,
    go_carefully: type[Exception],
) -> Step:
    run = expression_runner(instruction, operands, base, out)

    def step() -> None:
        run()
        if instruction.kind is Kind.NUMBER and np.isnan(out).any():
            raise go_carefully

    return step


def expression_runner(
    instruction: Instruction, operands: list[AnyArray], base: Calculation, out: AnyArray
) -> Step:
    """A function that evaluates an expression draw by draw into its buffer."""
    evaluator = ExpressionEvaluator(instruction.detail, base)
    columns = [operand if operand.ndim else float(operand) for operand in operands]

    def run() -> None:
        with np.errstate(all="ignore"):
            values = evaluator.evaluate(columns, len(out))
        if instruction.kind is Kind.NUMBER:
            out[:] = as_numbers(values)
        else:
            for place, value in enumerate(values):
                out[place] = value

    return run


def choice_step(choice: MixedChoice, buffers: Buffers, out: AnyArray) -> Step:
    """The step of a choice between values of different types; errors need no care among objects."""
    sides = [
        None if part.operand is None else buffers.operand(part.operand)
        for part in (choice.then, choice.otherwise)
    ]
    return choice_runner(choice, buffers.operand(choice.flag), sides, out)


def object_converter(values: AnyArray, out: AnyArray, *, date_1904: bool) -> Step:
    """A function that turns objects into numbers by the rule of operators, errors encoded."""

    def number(value: Scalar) -> float:
        try:
            return to_number(value, date_1904=date_1904)
        except Fault as fault:
            return encode_error(fault.error)

    def step() -> None:
        out[:] = [number(value) for value in values]

    return step
