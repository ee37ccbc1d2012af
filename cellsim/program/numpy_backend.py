"""The NumPy evaluator: a program over blocks of draws, in fixed buffers.

Guarantees:
- the result of a draw depends on its inputs alone, not on its block, its neighbours or the thread;
- buffers are reused, so memory is bounded by the block's size times the registers alive at once;
- an error never turns into a number. As long as no draw of a block fails, the fast steps run with
  floating-point faults raised by NumPy; from the first fault on, the block goes on with the careful
  steps, which carry errors as NaNs whose payload names them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.program.buffers import Buffers, plan_buffers
from cellsim.program.calculation import Calculation
from cellsim.program.cancellation import (
    PLAIN_OPS,
    Magnitudes,
    doubt_limits,
    is_doubtful,
)
from cellsim.program.careful import careful_step
from cellsim.program.fast import fast_step
from cellsim.program.ir import Instruction, Kind, Loop, Op, Operand, Program, Register
from cellsim.values import ErrorValue, encode_error

FloatArray = npt.NDArray[np.float64]
Step = Callable[[], Any]
After = Callable[[int], None]

_SETTLED = 1e-14
_MORE_PASSES = 20
_FEWEST_MEASURED = 256
"""Magnitudes are taken from blocks of at least so many draws."""
_MOST_USELESS = 4
"""After so many blocks in a row that had to be run again, the shortcut is no longer tried."""


class GoCarefully(Exception):  # noqa: N818  (a change of pace, not a failure)
    """An error has come up in a block: go on with the careful steps."""


class _LookAgain(Exception):  # noqa: N818  (likewise)
    """A number may be what a cancellation has left: run the block again, looking at each."""


@dataclass(slots=True)
class _Steps:
    fast: list[Step]
    careful: list[Step]


@dataclass(slots=True)
class _Shortcut:
    """Fast steps that do not look at cancellation, see `cellsim.program.cancellation`.

    Attributes:
        steps: One for each instruction; those after which a number may be in doubt raise _LookAgain.
        limits: How near zero registers may come.
        useless: How many blocks in a row had to be run again.
    """

    steps: list[Step]
    limits: Mapping[int, float]
    useless: int = 0


class BlockEvaluator:
    """Evaluates a program over blocks of draws; one for each thread.

    Args:
        program: The program.
        base: The base case, for expressions that are taken draw by draw.
        block: Draws in a block.
    """

    def __init__(self, program: Program, base: Calculation, block: int) -> None:
        self._program = program
        self._base = base
        self.block = block
        self._buffers = Buffers(plan_buffers(program), block)
        self.poison: dict[int, FloatArray | None] = {}
        self.unsettled = 0
        self.draws = block
        self._steps = self._build(program.instructions)
        self._reads = [
            frozenset(o.number for o in i.operands if isinstance(o, Register))
            for i in program.instructions
        ]
        self._writes = [
            (i.target, *(i.detail.carried if i.op is Op.LOOP else ())) for i in program.instructions
        ]
        self._shortcut: _Shortcut | None = None
        self._may_cut = any(instruction.op in PLAIN_OPS for instruction in program.instructions)
        self._inputs = [self._buffers.array(number) for number in range(len(program.inputs))]
        self._outputs = [self._buffers.operand(operand) for operand, _ in program.outputs]

    def evaluate(self, draws: Sequence[FloatArray], out: FloatArray) -> None:
        """Evaluate one block.

        Args:
            draws: The inputs' values, each of shape (n,) with n at most the block's size.
            out: Where the outputs go, shape (outputs, n); failed draws are NaN, the payload names
                the error.
        """
        self.draws = count = out.shape[1]
        for buffer, values in zip(self._inputs, draws, strict=True):
            buffer[:count] = values
            if count < self.block:
                buffer[count:] = values[0]
        self._run()
        for row, array in enumerate(self._outputs):
            out[row] = array[:count] if array.ndim else array

    def _run(self) -> None:
        self.poison.clear()
        finite = all(np.isfinite(buffer).all() for buffer in self._inputs)
        if not finite:  # no cell can hold an infinity
            for buffer in self._inputs:
                buffer[np.isinf(buffer)] = encode_error(ErrorValue.NUM)
        with np.errstate(divide="raise", over="raise", invalid="raise", under="ignore"):
            shortcut = self._shortcut
            if shortcut is not None and shortcut.useless <= _MOST_USELESS:
                unsettled = self.unsettled
                try:
                    self._run_steps(shortcut.steps, finite, self._watch)
                except _LookAgain:
                    shortcut.useless += 1
                    self.poison.clear()
                    self.unsettled = unsettled  # circles are solved, and counted, once more
                else:
                    shortcut.useless = 0
                    return
            elif shortcut is None and self._may_cut and self.draws >= _FEWEST_MEASURED:
                self._run_measured(finite)
                return
            self._run_steps(self._steps.fast, finite)

    def _run_steps(self, steps: Sequence[Step], finite: bool, after: After | None = None) -> None:
        """Run fast steps up to the first fault, then carefully where an operand may hold an error."""
        done = _run_fast(steps) if finite else 0
        if done < len(steps):
            self._run_mixed(steps, done, finite, after)

    def _run_mixed(
        self, steps: Sequence[Step], start: int, finite: bool, after: After | None = None
    ) -> None:
        """Go on from a step: carefully where an operand may hold an error, fast elsewhere.

        Args:
            steps: The fast steps.
            start: The first instruction to run.
            finite: Whether no input holds an error.
            after: Called after each step that was run carefully, with its instruction's place.
        """
        failing = set() if finite else set(range(len(self._inputs)))
        for place in range(start, len(steps)):
            if failing.isdisjoint(self._reads[place]):
                try:
                    steps[place]()
                    continue
                except (FloatingPointError, GoCarefully):
                    pass  # this instruction is the first to fail on its own
            with np.errstate(all="ignore"):
                self._steps.careful[place]()
                if after is not None:
                    after(place)
            failing.update(self._writes[place])

    def _run_measured(self, finite: bool) -> None:
        """Run with every cancellation looked at; later blocks may take the shortcut."""
        magnitudes = Magnitudes()
        for number, buffer in enumerate(self._inputs):
            magnitudes.record(number, buffer)

        def record(place: int) -> None:
            if self._program.instructions[place].kind is Kind.NUMBER:
                for register in self._writes[place]:
                    magnitudes.record(register, self._buffers.array(register))

        def measured(place: int, step: Step) -> Step:
            def run() -> None:
                step()
                record(place)

            return run

        steps = [measured(place, step) for place, step in enumerate(self._steps.fast)]
        self._run_steps(steps, finite, record)
        limits = doubt_limits(self._program, magnitudes)
        self._shortcut = _Shortcut(self._shorter_steps(limits), limits)

    def _shorter_steps(self, limits: Mapping[int, float]) -> list[Step]:
        outputs = (operand for operand, _ in self._program.outputs)
        given_out = {operand.number for operand in outputs if isinstance(operand, Register)}
        steps: list[Step] = []
        for place, instruction in enumerate(self._program.instructions):
            step = self._steps.fast[place]
            plain = PLAIN_OPS.get(instruction.op)
            if plain is not None and instruction.target not in given_out:  # results show zeros
                relaxed = replace(instruction, op=plain)
                step = fast_step(relaxed, self._buffers, self._base, GoCarefully)
            watched = [register for register in self._writes[place] if register in limits]
            steps.append(self._watched(step, watched, limits) if watched else step)
        return steps

    def _watched(self, step: Step, registers: list[int], limits: Mapping[int, float]) -> Step:
        pairs = [(self._buffers.array(register), limits[register]) for register in registers]

        def run() -> None:
            step()
            if any(is_doubtful(values, limit) for values, limit in pairs):
                raise _LookAgain

        return run

    def _watch(self, place: int) -> None:
        """After a careful step on the shortcut: a number in doubt ends it."""
        limits = self._shortcut.limits if self._shortcut is not None else {}
        for register in self._writes[place]:
            if register in limits and is_doubtful(self._buffers.array(register), limits[register]):
                raise _LookAgain

    def _build(self, instructions: Sequence[Instruction]) -> _Steps:
        fast: list[Step] = []
        careful: list[Step] = []
        for instruction in instructions:
            if instruction.op is Op.LOOP:
                runner = _LoopRunner(self, instruction.detail, self._build(instruction.detail.body))
                fast.append(runner.run_fast)
                careful.append(runner.run_careful)
                continue
            fast.append(fast_step(instruction, self._buffers, self._base, GoCarefully))
            careful.append(careful_step(instruction, self._buffers, self._base, self.poison))
        return _Steps(fast, careful)

    def operand(self, operand: Operand) -> FloatArray:
        """The buffer of an operand, or its constant as an array without dimensions."""
        return self._buffers.operand(operand)

    def register(self, number: int) -> FloatArray:
        """The buffer of a register."""
        return self._buffers.array(number)


def _run_fast(steps: Sequence[Step]) -> int:
    """Run steps until the first fault; how many need not be run again."""
    done = 0
    try:
        for step in steps:
            step()
            done += 1
    except (FloatingPointError, GoCarefully):
        return done
    return done


class _LoopRunner:
    """Solves a circular chain by passes; a draw stands still as soon as a pass no longer moves it."""

    def __init__(self, evaluator: BlockEvaluator, loop: Loop, steps: _Steps) -> None:
        self._evaluator = evaluator
        self._loop = loop
        self._steps = steps
        self._carried = [evaluator.register(number) for number in loop.carried]
        self._results = [evaluator.operand(operand) for operand in loop.results]

    def run_fast(self) -> None:
        """All passes with faults raised."""
        moving = self._run(self._steps.fast)
        if any(np.isnan(buffer).any() for buffer in self._carried):
            raise GoCarefully
        self._count(moving)

    def run_careful(self) -> None:
        """All passes, errors carried."""
        self._count(self._run(self._steps.careful))

    def _count(self, moving: npt.NDArray[np.bool_]) -> None:
        """Count the draws that had not settled, those only filling up the block left out."""
        self._evaluator.unsettled += int(moving[: self._evaluator.draws].sum())

    def _run(self, steps: Sequence[Step]) -> npt.NDArray[np.bool_]:
        """Pass until no draw moves, or for as long as passes bring them nearer; who still moved."""
        for buffer, start in zip(self._carried, self._loop.start, strict=True):
            buffer.fill(start)
        size = self._evaluator.block
        moving = np.ones(size, dtype=bool)
        active = moving.copy()  # a draw that moves on without coming nearer is given up
        last = np.full(size, np.inf)
        limit = self._loop.passes
        for number in range(1, limit * _MORE_PASSES + 1):
            for step in steps:
                step()
            change = np.zeros(size)
            for buffer, result in zip(self._carried, self._results, strict=True):
                moved = np.abs(result - buffer) / np.maximum(1.0, np.abs(result))
                moved[np.isnan(moved)] = 0.0  # an error stays one
                np.maximum(change, moved, out=change)
                np.copyto(buffer, result, where=active)
            moving &= ~(active & (change <= _SETTLED))
            active &= change > _SETTLED
            if number >= limit:
                active &= change < last
            if not active.any():
                break
            last = change
        return moving
