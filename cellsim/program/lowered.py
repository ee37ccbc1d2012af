"""What an expression is while compiling: known now, or a register of the program."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from cellsim.program.ir import Operand, Register
from cellsim.values import LambdaValue, Reference, Scalar


@dataclass(frozen=True, slots=True)
class Known:
    """A single value, a reference or a function that is the same in all draws.

    The cells that a known reference names may well vary.
    """

    value: Scalar | Reference | LambdaValue


@dataclass(frozen=True, slots=True)
class Numeric:
    """A number in a register.

    Attributes:
        operand: The register.
    """

    operand: Register


@dataclass(frozen=True, slots=True)
class Flagged:
    """A logical in a register."""

    operand: Register


@dataclass(frozen=True, slots=True)
class Choice:
    """One of two values of different types, such as `IF(x > 0, x, "")`.

    Attributes:
        flag: Which: a flag register.
        then: The value where the flag is true.
        otherwise: The value elsewhere.
    """

    flag: Operand
    then: Lowered
    otherwise: Lowered


@dataclass(frozen=True, slots=True)
class Varied:
    """Any scalar, in an object register."""

    operand: Register


@dataclass(frozen=True, slots=True)
class Block:
    """An array, row by row; the items are single values."""

    rows: int
    columns: int
    items: tuple[Lowered, ...]


Lowered: TypeAlias = Known | Numeric | Flagged | Choice | Varied | Block
"""Any expression while compiling."""


class UnlowerableError(Exception):
    """There is no form over draws for an expression; it is taken draw by draw instead."""

    def __init__(self, reason: str) -> None:
        super().__init__(reason)
        self.reason = reason
