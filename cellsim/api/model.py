"""A workbook as a model: read, parsed, calculated, checked."""

from __future__ import annotations

import datetime as dt
import difflib
from functools import cached_property
from pathlib import Path

from cellsim.audit.model_check import check_model
from cellsim.cells import CellRef
from cellsim.errors import FormulaSyntaxError, ModelError, Problem
from cellsim.formula.tree import (
    CellReference,
    NameReference,
    Node,
    RangeReference,
    StructuredReference,
)
from cellsim.graph.build import Graph, build_graph
from cellsim.program.calculation import Calculation, calculate_all
from cellsim.program.interpret import Frame, dereference, evaluate_formula
from cellsim.program.settle_spills import settle_spills
from cellsim.results import ModelCheck
from cellsim.values import Array, Reference, Scalar
from cellsim.workbook.labels import find_label, unit_of
from cellsim.workbook.model import Sheet, Workbook
from cellsim.workbook.read import read_workbook


class Model:
    """A workbook that can be recalculated.

    Attributes:
        path: The file.
        workbook: What was read of it.
        as_of: What TODAY() and NOW() return.
    """

    def __init__(self, path: Path, workbook: Workbook, *, as_of: dt.datetime | None = None) -> None:
        self.path = path
        self.workbook = workbook
        self.as_of = (
            as_of or workbook.last_saved or dt.datetime.fromtimestamp(path.stat().st_mtime, dt.UTC)
        )
        self._sheets = {sheet.title: sheet for sheet in workbook.sheets}

    @cached_property
    def graph(self) -> Graph:
        """The formulas and what each reads."""
        return settle_spills(build_graph(self.workbook), as_of=self._now)

    @cached_property
    def base(self) -> Calculation:
        """The base case; cells are calculated when they are asked for."""
        return Calculation(self.graph, as_of=self._now)

    @property
    def _now(self) -> dt.datetime:
        return self.as_of.replace(tzinfo=None)

    def calculate(self) -> dict[str, Scalar]:
        """Recalculate every formula cell from the constants.

        Returns:
            By `Sheet!A1`, unquoted: float for numbers and dates, str, bool, None for a blank, or an
            `ErrorValue` whose `str()` is the spreadsheet's spelling.
        """
        calculation = self._calculated
        return {
            formula.cell.key: calculation.cell_value(*formula.cell)
            for formula in self.graph.all_formulas()
        }

    @cached_property
    def _calculated(self) -> Calculation:
        calculate_all(self.base)
        return self.base

    @cached_property
    def _check(self) -> ModelCheck:
        return check_model(self._calculated)

    def check(self) -> ModelCheck:
        """Recalculate every formula cell and compare it with the value stored in the file."""
        return self._check

    def parse(self, text: str, at: CellRef | None = None) -> Node:
        """The tree of a formula over the model, written as in a cell.

        Raises:
            FormulaSyntaxError: It does not follow the grammar.
        """
        place = at or self.home
        return self.graph.cache.parse(text, place.row, place.column, "")

    @property
    def home(self) -> CellRef:
        """Where formulas that stand in no cell are taken to stand: A1 of the first sheet."""
        return CellRef(self.workbook.sheets[0].title, 1, 1)

    def evaluate(self, tree: Node, at: CellRef | None = None) -> Scalar:
        """The value of a formula in the base case."""
        frame = Frame(self.base, at or self.home)
        value = dereference(evaluate_formula(tree, frame, whole=False), frame, whole=False)
        if isinstance(value, Array):
            return value.items[0]
        return value

    def find_cell(self, text: str) -> CellRef:
        """The one cell that an address, a defined name or a table reference names.

        Raises:
            ModelError: There is no such sheet, name or table, or it is not one cell; the problem's
                hint has the nearest valid name.
        """
        try:
            tree = self.parse(text)
        except FormulaSyntaxError as error:
            raise ModelError(
                Problem(
                    "",
                    f"{text!r} is no cell: expected an address such as Sheet!C6 or a defined name",
                )
            ) from error
        self._check_sheet(text, tree)
        frame = Frame(self.base, self.home)
        value = None
        if isinstance(tree, (CellReference, RangeReference, NameReference, StructuredReference)):
            value = evaluate_formula(tree, frame, whole=True)
        if not isinstance(value, Reference):
            raise ModelError(self._unknown(text, tree))
        area = value.areas[0]
        if len(value.areas) != 1 or area.size != 1:
            raise ModelError(Problem("", f"{text!r} names {area.size} cells where one is wanted"))
        return area.first

    def _check_sheet(self, text: str, tree: Node) -> None:
        if isinstance(tree, NameReference) and tree.prefix is None:
            return
        prefix = getattr(tree, "prefix", None)
        if isinstance(tree, (CellReference, RangeReference)) and prefix is None:
            if len(self._sheets) > 1:
                raise ModelError(
                    Problem("", f"{text!r} does not say on which sheet it lies", "write Sheet!C6")
                )
            return
        if prefix is not None and self.graph.resolver.sheet(prefix.first) is None:
            near = difflib.get_close_matches(prefix.first, self._sheets, n=1, cutoff=0.4)
            hint = f"did you mean {near[0]!r}?" if near else f"sheets: {', '.join(self._sheets)}"
            raise ModelError(
                Problem("", f"there is no sheet {prefix.first!r} in {self.path.name}", hint)
            )

    def _unknown(self, text: str, tree: Node) -> Problem:
        if isinstance(tree, NameReference):
            known = [record.definition.name for record in self.graph.resolver.names()]
            near = difflib.get_close_matches(tree.name, known, n=1, cutoff=0.4)
            hint = f"did you mean {near[0]!r}?" if near else "write an address such as Sheet!C6"
            return Problem("", f"there is no name {tree.name!r} in {self.path.name}", hint)
        return Problem("", f"{text!r} is no cell of {self.path.name}")

    def sheet(self, cell: CellRef) -> Sheet:
        """The sheet of a cell."""
        return self._sheets[cell.sheet]

    def label(self, cell: CellRef) -> str:
        """The text beside or above a cell, or ""."""
        return find_label(self.sheet(cell), cell.row, cell.column)

    def number_format(self, cell: CellRef) -> str:
        """The number format code of a cell."""
        return self.sheet(cell).number_formats.get((cell.row, cell.column), "General")

    def unit(self, cell: CellRef) -> str:
        """The unit that a cell's number format shows, or ""."""
        return unit_of(self.number_format(cell))

    def is_empty(self, cell: CellRef) -> bool:
        """Whether a cell holds neither a constant nor a formula."""
        position = (cell.row, cell.column)
        sheet = self.sheet(cell)
        return (
            position not in sheet.constants
            and position not in sheet.formulas
            and position not in self.graph.members[cell.sheet]
        )


def load(path: Path | str, *, as_of: dt.datetime | None = None) -> Model:
    """Read a workbook.

    Args:
        path: An .xlsx or .xlsm file; it is never changed.
        as_of: What TODAY() and NOW() return; by default when the file was last saved.

    Raises:
        ModelError: The file is missing, damaged or of another kind.
    """
    path = Path(path)
    return Model(path, read_workbook(path), as_of=as_of)
