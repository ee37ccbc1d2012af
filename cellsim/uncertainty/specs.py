"""What a side-car says: frozen records that carry the line of every key."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TypeAlias

DEFAULT_DRAWS = 10_000
DEFAULT_SEED = 1
LATIN_HYPERCUBE = "latin-hypercube"
RANDOM = "random"


@dataclass(frozen=True, slots=True)
class Formula:
    """A spreadsheet formula that stands where a number could.

    Attributes:
        text: The formula without its `=`.
        line: Its line in the side-car, counted from 1.
    """

    text: str
    line: int


Number: TypeAlias = float | Formula
"""A number, or the formula that gives it."""

Parameter: TypeAlias = Number | tuple[Number, ...]
"""What a distribution's parameter can be: a number or a list of them."""


@dataclass(frozen=True, slots=True)
class RunSettings:
    """The section `[run]`.

    Attributes:
        draws: Number of draws, at least 1.
        seed: The seed, 0 to 2**64 - 1; 0 is a seed like any other.
        sampling: "latin-hypercube" or "random".
    """

    draws: int = DEFAULT_DRAWS
    seed: int = DEFAULT_SEED
    sampling: str = LATIN_HYPERCUBE


@dataclass(frozen=True, slots=True)
class InputSpec:
    """A section `[inputs.NAME]`: one uncertain cell and its distribution.

    Attributes:
        name: Its name in the side-car.
        cell: The cell as written: an address with its sheet, or a defined name.
        label: The text that must stand beside the cell, or None for no guard.
        distribution: Name of the family, one of `distributions.families.FAMILIES`.
        parameters: The family's parameters by key; the keys form one of its parameter sets.
        floor: The distribution is conditional on values not below it, or None.
        cap: The distribution is conditional on values not above it, or None.
        replace_formula: Whether the cell may hold a formula that the draws replace.
        note: Why the distribution was chosen, or "".
        source: Where it comes from, or "".
        unit: Its unit, or "".
        line: Line of the section's head.
        lines: Line of each key.
    """

    name: str
    cell: str
    label: str | None
    distribution: str
    parameters: Mapping[str, Parameter]
    floor: Number | None
    cap: Number | None
    replace_formula: bool
    note: str
    source: str
    unit: str
    line: int
    lines: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class DependenceSpec:
    """A section `[[dependence]]`: inputs that move together.

    Attributes:
        inputs: Names of two or more inputs.
        rank_correlation: Full symmetric matrix of Spearman rank correlations in their order.
        line: Line of the section's head.
    """

    inputs: tuple[str, ...]
    rank_correlation: tuple[tuple[float, ...], ...]
    line: int


@dataclass(frozen=True, slots=True)
class OutputSpec:
    """A section `[outputs.NAME]`: what is asked; exactly one of `cell` and `formula` is given.

    Attributes:
        name: Its name in the side-car.
        cell: The cell as written, or None.
        formula: The formula over cells without its `=`, or None.
        unit: Its unit, or "".
        label: What to call it in the results, or "".
        thresholds: The values that it is compared with.
        line: Line of the section's head.
        lines: Line of each key.
    """

    name: str
    cell: str | None
    formula: str | None
    unit: str
    label: str
    thresholds: tuple[Number, ...]
    line: int
    lines: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class Sidecar:
    """A side-car as it was read, free of every mistake that shows without the model.

    Attributes:
        path: The file.
        text: Its text.
        workbook: The model's path, resolved relative to the side-car's folder.
        as_of: What TODAY() and NOW() return (a `datetime` if a time of day was given), or None.
        iterate: Whether circular references are iterated even if the workbook does not ask for it.
        run: The section `[run]`.
        inputs: The inputs in the file's order, at least one.
        dependence: The dependence sections in the file's order.
        outputs: The outputs in the file's order, at least one.
    """

    path: Path
    text: str
    workbook: Path
    as_of: dt.date | None
    iterate: bool
    run: RunSettings
    inputs: tuple[InputSpec, ...]
    dependence: tuple[DependenceSpec, ...]
    outputs: tuple[OutputSpec, ...]
