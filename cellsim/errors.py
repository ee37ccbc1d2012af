"""One tree of errors, and the record that tells a person where a problem is and what to do."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong.

    Attributes:
        place: Where: `Costs!C14`, `study.toml, line 12`, or a file name; may be empty.
        message: What was read and what was expected, one sentence without a full stop.
        hint: What to do about it, such as the nearest valid name; may be empty.
    """

    place: str
    message: str
    hint: str = ""

    def __str__(self) -> str:
        place = f"{self.place}: " if self.place else ""
        hint = f"; {self.hint}" if self.hint else ""
        return f"{place}{self.message}{hint}"


class CellsimError(Exception):
    """Base of everything that cellsim raises on purpose; carries all problems found, not the first.

    Attributes:
        problems: The problems, in the order in which they were met.
        exit_status: What the command line exits with.
    """

    exit_status = 1

    def __init__(self, problems: Problem | str | Iterable[Problem]) -> None:
        if isinstance(problems, str):
            problems = Problem("", problems)
        self.problems = (problems,) if isinstance(problems, Problem) else tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class UsageError(CellsimError):
    """A command or an API call was used wrongly."""

    exit_status = 2


class ModelError(CellsimError):
    """The model cannot be read or calculated."""

    exit_status = 3


class FormulaSyntaxError(ModelError):
    """A formula does not follow the grammar."""


class CircularReferenceError(ModelError):
    """Cells depend on each other and the workbook does not allow iteration."""


class SidecarError(CellsimError):
    """The side-car is wrong."""

    exit_status = 4


class RunError(CellsimError):
    """The run could not be carried out or its results could not be written."""

    exit_status = 5
