"""What a side-car asks of a model: its inputs and outputs found, checked and given numbers."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.api.model import Model
from cellsim.cells import CellRef
from cellsim.errors import CellsimError, FormulaSyntaxError, Problem, SidecarError
from cellsim.graph.slicing import affected_cells
from cellsim.program.lower import OutputFormula, Target
from cellsim.results import Threshold
from cellsim.uncertainty.dependence import matrix_fault, rank_correlation_matrix
from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.distributions.family import ParameterError
from cellsim.uncertainty.specs import Formula, InputSpec, Number, OutputSpec, Parameter, Sidecar
from cellsim.values import ErrorValue, Scalar


@dataclass(frozen=True, slots=True)
class FoundInput:
    """An input of the side-car in the model.

    Attributes:
        spec: What the side-car says.
        cell: Its cell.
        base: The cell's value in the base case, None if it is no number.
        distribution: How it is drawn.
    """

    spec: InputSpec
    cell: CellRef
    base: float | None
    distribution: Distribution


@dataclass(frozen=True, slots=True)
class FoundOutput:
    """An output of the side-car in the model.

    Attributes:
        spec: What the side-car says.
        target: The cell or formula.
        base: Its value in the base case.
        thresholds: What it is compared with.
    """

    spec: OutputSpec
    target: Target
    base: Scalar
    thresholds: tuple[Threshold, ...]


class Questions:
    """Finds a side-car's inputs and outputs in a model; collects every problem before it raises.

    Args:
        sidecar: What is asked.
        model: The model.

    Raises:
        SidecarError: Cells that are not there, overlap, hold formulas or another label; parameters
            that do not fit; outputs that no input reaches.
    """

    def __init__(self, sidecar: Sidecar, model: Model) -> None:
        self._sidecar = sidecar
        self._model = model
        self._problems: list[Problem] = []
        cells = [self._input_cell(spec) for spec in sidecar.inputs]
        self._check_overlap(cells)
        self._raise()
        self._cells = [cell for cell in cells if cell is not None]
        drawn = [
            self._input(spec, cell) for spec, cell in zip(sidecar.inputs, self._cells, strict=True)
        ]
        self.inputs = [found for found in drawn if found is not None]
        asked = [self._output(spec) for spec in sidecar.outputs]
        self.outputs = [found for found in asked if found is not None]
        self._raise()

    def _raise(self) -> None:
        if self._problems:
            raise SidecarError(self._problems)

    def _place(self, lines: Mapping[str, int], key: str, default: int) -> str:
        return f"{self._sidecar.path.name}, line {lines.get(key, default)}"

    def _input_cell(self, spec: InputSpec) -> CellRef | None:
        place = self._place(spec.lines, "cell", spec.line)
        try:
            cell = self._model.find_cell(spec.cell)
        except CellsimError as error:
            self._problems += [Problem(place, p.message, p.hint) for p in error.problems]
            return None
        if self._model.graph.source_of(cell) is not None and not spec.replace_formula:
            formula = self._model.graph.formula(cell)
            text = (
                "=" + formula.source.text[:60]
                if formula is not None
                else "part of an array formula"
            )
            self._problems.append(
                Problem(
                    place,
                    f"the input cell {cell} holds a formula, {text}",
                    "choose the cell that holds the number, or add `replace_formula = true`",
                )
            )
        self._check_label(spec, cell)
        return cell

    def _check_label(self, spec: InputSpec, cell: CellRef) -> None:
        if spec.label is None:
            return
        found = self._model.label(cell)
        if " ".join(found.split()) != " ".join(spec.label.split()):
            self._problems.append(
                Problem(
                    self._place(spec.lines, "label", spec.line),
                    f"the text beside {cell} is {found!r}, expected {spec.label!r}",
                    "the model may have changed; correct the cell or the label",
                )
            )

    def _check_overlap(self, cells: Sequence[CellRef | None]) -> None:
        first: dict[CellRef, str] = {}
        for spec, cell in zip(self._sidecar.inputs, cells, strict=True):
            if cell is None:
                continue
            if cell in first:
                place = self._place(spec.lines, "cell", spec.line)
                self._problems.append(
                    Problem(
                        place,
                        f"the inputs {first[cell]!r} and {spec.name!r} are both the cell {cell}",
                    )
                )
            first.setdefault(cell, spec.name)

    def _input(self, spec: InputSpec, cell: CellRef) -> FoundInput | None:
        numbers: dict[str, float | tuple[float, ...]] = {}
        before = len(self._problems)
        for key, parameter in spec.parameters.items():
            given = self._parameter(spec, cell, key, parameter)
            if given is not None:
                numbers[key] = given
        floor = self._number(spec, cell, "floor", spec.floor)
        cap = self._number(spec, cell, "cap", spec.cap)
        if len(self._problems) > before:
            return None
        try:
            distribution = build_distribution(spec.distribution, numbers, floor, cap)
        except ParameterError as error:
            place = self._place(spec.lines, error.key, spec.line)
            self._problems.append(Problem(place, error.message))
            return None
        value = self._model.base.cell_value(*cell)
        base = float(value) if isinstance(value, (float, bool)) else None
        return FoundInput(spec, cell, base, distribution)

    def _parameter(
        self, spec: InputSpec, cell: CellRef, key: str, parameter: Parameter
    ) -> float | tuple[float, ...] | None:
        if isinstance(parameter, tuple):
            values = [self._number(spec, cell, key, item) for item in parameter]
            return None if None in values else tuple(value for value in values if value is not None)
        return self._number(spec, cell, key, parameter)

    def _number(
        self, spec: InputSpec, cell: CellRef, key: str, number: Number | None
    ) -> float | None:
        if not isinstance(number, Formula):
            return number
        place = f"{self._sidecar.path.name}, line {number.line}"
        value = self._formula_value(place, number.text)
        if value is None:
            return None
        others = [other for other in self._cells if other != cell]
        if self._depends_on(number.text, others):
            self._problems.append(
                Problem(
                    place,
                    f"{key} of {spec.name!r} depends on another input: a distribution that is conditional on "
                    "another input's draw is not available yet",
                )
            )
        return value

    def _formula_value(self, place: str, text: str) -> float | None:
        try:
            value = self._model.evaluate(self._model.parse(text))
        except FormulaSyntaxError as error:
            self._problems += [Problem(place, p.message, p.hint) for p in error.problems]
            return None
        if isinstance(value, bool) or not isinstance(value, float):
            shown = (
                "blank"
                if value is None
                else str(value)
                if isinstance(value, ErrorValue)
                else repr(value)
            )
            self._problems.append(
                Problem(place, f"the formula ={text} gives {shown}, expected a number")
            )
            return None
        return value

    def _depends_on(self, text: str, inputs: Sequence[CellRef]) -> bool:
        graph = self._model.graph
        areas = graph.areas_of(self._model.parse(text), self._model.home)
        if any(area.holds(*cell) for area in areas for cell in inputs):
            return True
        sources = [
            source for area in areas for source in graph.formula_cells_in(graph.resolver.clip(area))
        ]
        affected = affected_cells(graph, inputs, sources, count_dynamic=False)
        return not affected.isdisjoint(sources)

    def _output(self, spec: OutputSpec) -> FoundOutput | None:
        target: Target
        try:
            if spec.cell is not None:
                target = self._model.find_cell(spec.cell)
                base = self._model.base.cell_value(*target)
            else:
                tree = self._model.parse(spec.formula or "")
                target = OutputFormula(tree, self._model.home)
                base = self._model.evaluate(tree)
        except CellsimError as error:
            key = "cell" if spec.cell is not None else "formula"
            place = self._place(spec.lines, key, spec.line)
            self._problems += [Problem(place, p.message, p.hint) for p in error.problems]
            return None
        self._check_reached(spec, target)
        thresholds = tuple(
            threshold
            for number in spec.thresholds
            if (threshold := self._threshold(number)) is not None
        )
        return FoundOutput(spec, target, base, thresholds)

    def _check_reached(self, spec: OutputSpec, target: Target) -> None:
        graph = self._model.graph
        place = self._place(spec.lines, "cell" if spec.cell is not None else "formula", spec.line)
        if isinstance(target, OutputFormula):
            areas = graph.areas_of(target.tree, target.cell)
            if any(area.holds(*cell) for area in areas for cell in self._cells):
                return
            sources = [
                s for area in areas for s in graph.formula_cells_in(graph.resolver.clip(area))
            ]
            named = f"the formula of the output {spec.name!r}"
        else:
            if target in self._cells:
                return
            if self._model.is_empty(target):
                self._problems.append(Problem(place, f"the output cell {target} is empty"))
                return
            source = graph.source_of(target)
            sources = [source] if source is not None else []
            named = f"the output cell {target}"
        affected = affected_cells(graph, self._cells, sources)
        if affected.isdisjoint(sources):
            self._problems.append(
                Problem(
                    place,
                    f"{named} does not depend on any input, so it is the same in every draw",
                    "check the output, or the cells of the inputs",
                )
            )

    def _threshold(self, number: Number) -> Threshold | None:
        if not isinstance(number, Formula):
            return Threshold(f"{number:.15g}", number)
        value = self._formula_value(f"{self._sidecar.path.name}, line {number.line}", number.text)
        return None if value is None else Threshold(f"={number.text}", value)

    def rank_correlation(self) -> npt.NDArray[np.float64] | None:
        """The full matrix of asked rank correlations in the order of the inputs, None if none is asked.

        Raises:
            SidecarError: The sections together are no correlation matrix.
        """
        names = [spec.name for spec in self._sidecar.inputs]
        matrix = rank_correlation_matrix(names, self._sidecar.dependence)
        fault = matrix_fault(matrix) if matrix is not None else None
        if fault is not None:
            place = f"{self._sidecar.path.name}, line {self._sidecar.dependence[0].line}"
            message = f"the matrix of all dependence sections together {fault}"
            raise SidecarError(Problem(place, message, "bring the correlations nearer to zero"))
        return matrix


def as_datetime(date: dt.date | None) -> dt.datetime | None:
    """A date as the moment at which it begins."""
    if date is None or isinstance(date, dt.datetime):
        return date
    return dt.datetime(date.year, date.month, date.day)  # noqa: DTZ001  (a model's date has no zone)
