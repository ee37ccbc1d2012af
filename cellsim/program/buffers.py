"""Which buffer each register of a program lives in: buffers are reused when their register is done."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cellsim.program.ir import Constant, Instruction, Kind, Op, Operand, Program, Register

_ALIGNMENT = 64


@dataclass(frozen=True, slots=True)
class BufferPlan:
    """A place for each register.

    Attributes:
        places: Kind and number of the buffer of each register.
        counts: How many buffers of each kind there are.
    """

    places: dict[int, tuple[Kind, int]]
    counts: dict[Kind, int]


def plan_buffers(program: Program) -> BufferPlan:
    """Give each register a buffer by the last time that it is read (linear scan).

    An instruction never writes into a buffer that it reads: what it read must still be there when an
    error is looked into afterwards.
    """
    last_read = _last_reads(program)
    places: dict[int, tuple[Kind, int]] = {}
    free: dict[Kind, list[int]] = {kind: [] for kind in Kind}
    counts: dict[Kind, int] = dict.fromkeys(Kind, 0)

    def take(register: int, kind: Kind) -> None:
        if free[kind]:
            number = free[kind].pop()
        else:
            number = counts[kind]
            counts[kind] += 1
        places[register] = (kind, number)

    for number in range(len(program.inputs)):
        take(number, Kind.NUMBER)
    released: set[int] = set()
    for position, instruction in enumerate(program.instructions):
        for register, kind in _written(instruction):
            take(register, kind)
        for register in {*_read(instruction), *(r for r, _ in _written(instruction))}:
            if last_read.get(register, -1) <= position and register not in released:
                released.add(register)
                if register >= len(program.inputs):
                    kind, number = places[register]
                    free[kind].append(number)
    return BufferPlan(places, counts)


def _last_reads(program: Program) -> dict[int, int]:
    last: dict[int, int] = {}
    end = len(program.instructions)
    for position, instruction in enumerate(program.instructions):
        for register in _read(instruction):
            last[register] = position
    for operand, _ in program.outputs:
        if isinstance(operand, Register):
            last[operand.number] = end
    return last


def _read(instruction: Instruction) -> list[int]:
    return [operand.number for operand in instruction.operands if isinstance(operand, Register)]


def _written(instruction: Instruction) -> list[tuple[int, Kind]]:
    """The registers that an instruction writes; those inside a loop live as long as the loop runs."""
    written = [(instruction.target, instruction.kind)]
    if instruction.op is Op.LOOP:
        written += [(number, Kind.NUMBER) for number in instruction.detail.carried]
        for inner in instruction.detail.body:
            written += _written(inner)
    return written


class Buffers:
    """The arrays of one evaluator."""

    def __init__(self, plan: BufferPlan, block: int) -> None:
        self.block = block
        self._places = plan.places
        self._arrays: dict[Kind, Sequence[npt.NDArray[Any]]] = {
            Kind.NUMBER: _aligned_rows(plan.counts[Kind.NUMBER], block),
            Kind.FLAG: list(np.zeros((plan.counts[Kind.FLAG], block), dtype=bool)),
            Kind.OBJECT: [np.empty(block, dtype=object) for _ in range(plan.counts[Kind.OBJECT])],
        }
        self._constants: dict[Constant, npt.NDArray[np.float64]] = {}

    def array(self, register: int) -> npt.NDArray[Any]:
        """The buffer of a register."""
        kind, number = self._places[register]
        return self._arrays[kind][number]

    def operand(self, operand: Operand) -> npt.NDArray[Any]:
        """The buffer of an operand, or its constant as an array without dimensions."""
        if isinstance(operand, Register):
            return self.array(operand.number)
        array = self._constants.get(operand)
        if array is None:
            array = self._constants[operand] = np.array(operand.bits, dtype=np.uint64).view(
                np.float64
            )
        return array


def _aligned_rows(rows: int, block: int) -> list[npt.NDArray[np.float64]]:
    """Rows of float64 that begin at multiples of 64 bytes, so that every block is treated alike."""
    width = -(-block * 8 // _ALIGNMENT) * _ALIGNMENT
    raw = np.zeros(rows * width + _ALIGNMENT, dtype=np.uint8)
    start = -raw.ctypes.data % _ALIGNMENT
    return [
        raw[start + row * width : start + row * width + block * 8].view(np.float64)
        for row in range(rows)
    ]
