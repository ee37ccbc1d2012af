"""A study: one model with one side-car, compiled, drawn, evaluated."""

from __future__ import annotations

import dataclasses
import datetime as dt
import hashlib
import platform
import time
from collections.abc import Callable, Mapping, Sequence
from functools import cached_property
from importlib import metadata
from pathlib import Path
from typing import TypeVar

import numpy as np
import numpy.typing as npt
import pandas as pd

from cellsim import version
from cellsim.api.failures import trace_failures
from cellsim.api.model import Model, load
from cellsim.api.questions import FoundInput, FoundOutput, Questions, as_datetime
from cellsim.api.result import Result
from cellsim.cells import CellRef
from cellsim.engine.blocks import BlockEngine
from cellsim.errors import Problem, SidecarError, UsageError
from cellsim.program.lower import Compiled, compile_program, instruction_count
from cellsim.results import (
    DependencePair,
    Failures,
    InputRecord,
    ModelCheck,
    OutputRecord,
    RunRecord,
    RunResults,
)
from cellsim.uncertainty.sampling import achieved_rank_correlation, draw_inputs
from cellsim.uncertainty.sidecar import load_sidecar
from cellsim.uncertainty.specs import Sidecar

FloatArray = npt.NDArray[np.float64]
T = TypeVar("T")
Progress = Callable[[str, int, int], None]
"""Called with the stage, the work done in it and its whole."""


_RECORDED_LIBRARIES = ("numpy", "scipy", "openpyxl", "xlsxwriter")
"""Libraries whose version may change a figure or the results workbook."""


class Study:
    """One model with one side-car.

    Attributes:
        sidecar: What the side-car says.
        model: The model.
        inputs: The inputs as found in the model.
        outputs: The outputs as found in the model.
    """

    def __init__(self, sidecar: Sidecar, model: Model, *, timings: Mapping[str, float]) -> None:
        self.sidecar = sidecar
        self.model = model
        self._timings = dict(timings)
        start = time.perf_counter()
        questions = Questions(sidecar, model)
        self.inputs: Sequence[FoundInput] = questions.inputs
        self.outputs: Sequence[FoundOutput] = questions.outputs
        self._rank_correlation = questions.rank_correlation()
        self._timings["compile"] = self._timings.get("compile", 0.0) + time.perf_counter() - start
        self._engines: dict[tuple[int | None, int | None], BlockEngine] = {}

    @cached_property
    def compiled(self) -> Compiled:
        """The program for what lies between the inputs and the outputs."""
        start = time.perf_counter()
        cells = [found.cell for found in self.inputs]
        targets = [found.target for found in self.outputs]
        iterate = self.model.workbook.iteration.enabled or self.sidecar.iterate
        compiled = compile_program(self.model.base, cells, targets, iterate=iterate)
        self._timings["compile"] = self._timings.get("compile", 0.0) + time.perf_counter() - start
        return compiled

    def engine(self, *, threads: int | None = None, block: int | None = None) -> BlockEngine:
        """What evaluates the program; kept for later calls."""
        key = (threads, block)
        engine = self._engines.get(key)
        if engine is None:
            engine = BlockEngine(
                self.compiled.program, self.model.base, threads=threads, block=block
            )
            self._engines[key] = engine
        return engine

    def evaluate(
        self,
        draws: Mapping[str, npt.ArrayLike],
        *,
        threads: int | None = None,
        block: int | None = None,
    ) -> pd.DataFrame:
        """The outputs for draws that the caller brings.

        Args:
            draws: By input name, arrays of shape (draws,); an input left out stays at its base value.
            threads: How many threads work; by default one for each core.
            block: Draws in a block; by default chosen by the size of the program.

        Returns:
            One row a draw, one column an output; NaN in failed draws.

        Raises:
            UsageError: A name that is no input, arrays of different lengths, no array at all.
        """
        arrays = self._checked_draws(draws)
        count = len(next(iter(arrays.values())))
        columns = []
        for found in self.inputs:
            values = arrays.get(found.spec.name)
            columns.append(values if values is not None else np.full(count, self._base_of(found)))
        out = self.engine(threads=threads, block=block).run(columns)
        names = [found.spec.name for found in self.outputs]
        return pd.DataFrame(out.T, columns=names, copy=False)

    def _base_of(self, found: FoundInput) -> float:
        if found.base is None:
            raise UsageError(
                Problem(
                    found.spec.name,
                    f"the cell {found.cell} holds no number, so its draws cannot be left out",
                )
            )
        return found.base

    def _checked_draws(self, draws: Mapping[str, npt.ArrayLike]) -> dict[str, FloatArray]:
        names = [found.spec.name for found in self.inputs]
        unknown = [name for name in draws if name not in names]
        if unknown:
            raise UsageError(
                Problem(unknown[0], "is no input of the study", f"inputs: {', '.join(names)}")
            )
        arrays = {name: np.asarray(values, dtype=np.float64) for name, values in draws.items()}
        shapes = {array.shape for array in arrays.values()}
        if len(shapes) != 1 or len(next(iter(shapes))) != 1 or next(iter(shapes))[0] == 0:
            shown = ", ".join(f"{name} {array.shape}" for name, array in arrays.items()) or "none"
            raise UsageError(
                Problem("", f"expected arrays of one equal length by input name, got {shown}")
            )
        return arrays

    def run(
        self,
        draws: int | None = None,
        seed: int | None = None,
        *,
        threads: int | None = None,
        block: int | None = None,
        command: str = "",
        progress: Progress | None = None,
    ) -> Result:
        """Draw the inputs, evaluate the model on every draw, and gather the results.

        Args:
            draws: Number of draws; by default the side-car's.
            seed: The seed; by default the side-car's.
            threads: How many threads work; by default one for each core.
            block: Draws in a block; the results do not depend on it.
            command: The command to be recorded.
            progress: Called with the stage, the work done and its whole.

        Raises:
            UsageError: `draws` or `seed` is out of range.
            ModelError: Circular references that the workbook does not allow.
        """
        count = self.sidecar.run.draws if draws is None else draws
        key = self.sidecar.run.seed if seed is None else seed
        if count < 1:
            raise UsageError(Problem("draws", f"expected at least 1, got {count}"))
        if not 0 <= key < 2**64:
            raise UsageError(
                Problem("seed", f"expected a whole number from 0 to 2^64 - 1, got {key}")
            )
        report = progress or _silent
        started = dt.datetime.now(dt.UTC)
        compiled = self.compiled
        engine = self.engine(threads=threads, block=block)
        check = self._timed("check", self.model.check)
        report("sample", 0, count)
        input_draws = self._timed(
            "sample",
            lambda: draw_inputs(
                [found.distribution for found in self.inputs],
                self._rank_correlation,
                count,
                key,
                self.sidecar.run.sampling,
                engine.threads,
            ),
        )
        done = 0

        def advance(more: int) -> None:
            nonlocal done
            done += more
            report("evaluate", done, count)

        output_draws = self._timed("evaluate", lambda: engine.run(list(input_draws), advance))
        report("summarise", 0, 1)
        failures = self._timed("trace", lambda: self._failures(input_draws, output_draws))
        results = RunResults(
            inputs=tuple(self._input_record(found) for found in self.inputs),
            outputs=tuple(self._output_record(found) for found in self.outputs),
            input_draws=input_draws,
            output_draws=output_draws,
            dependence=self._dependence(input_draws),
            failures=failures,
            check=self._noted(check, engine),
            record=self._record(compiled, engine, count, key, started, command),
        )
        report("summarise", 1, 1)
        return Result(results)

    def _timed(self, stage: str, work: Callable[[], T]) -> T:
        start = time.perf_counter()
        value = work()
        self._timings[stage] = time.perf_counter() - start
        return value

    def _failures(self, input_draws: FloatArray, output_draws: FloatArray) -> Failures:
        return trace_failures(
            self.model,
            [(found.spec.name, found.cell) for found in self.inputs],
            [(found.spec.name, found.target) for found in self.outputs],
            input_draws,
            output_draws,
        )

    def _noted(self, check: ModelCheck, engine: BlockEngine) -> ModelCheck:
        notes = list(check.notes)
        loops = self.compiled.loops
        if loops:
            notes.append(_circles(loops))
        if engine.unsettled:
            notes.append(f"In {engine.unsettled} draws a circular chain had not settled.")
        return dataclasses.replace(check, notes=tuple(notes))

    def _input_record(self, found: FoundInput) -> InputRecord:
        distribution = found.distribution
        percentile = None
        if found.base is not None:
            percentile = float(distribution.cdf(np.array([found.base]))[0])
        return InputRecord(
            name=found.spec.name,
            label=self.model.label(found.cell),
            place=str(found.cell),
            unit=found.spec.unit or self.model.unit(found.cell),
            number_format=self.model.number_format(found.cell),
            distribution=distribution.describe(),
            note=found.spec.note,
            source=found.spec.source,
            base=found.base,
            base_percentile=percentile,
            mean=float(distribution.mean),
            sd=float(distribution.sd),
            lower=float(distribution.lower),
            upper=float(distribution.upper),
            discrete=distribution.discrete,
        )

    def _output_record(self, found: FoundOutput) -> OutputRecord:
        cell = found.target if isinstance(found.target, CellRef) else None
        return OutputRecord(
            name=found.spec.name,
            label=found.spec.label or (self.model.label(cell) if cell is not None else ""),
            place=str(cell) if cell is not None else f"={found.spec.formula}",
            unit=found.spec.unit or (self.model.unit(cell) if cell is not None else ""),
            number_format=self.model.number_format(cell) if cell is not None else "General",
            base=found.base,
            thresholds=found.thresholds,
        )

    def _dependence(self, input_draws: FloatArray) -> tuple[DependencePair, ...]:
        asked = self._rank_correlation
        if asked is None:
            return ()
        achieved = achieved_rank_correlation(input_draws)
        names = [found.spec.name for found in self.inputs]
        pairs: dict[tuple[int, int], None] = {}
        for section in self.sidecar.dependence:
            places = sorted(names.index(name) for name in section.inputs)
            pairs.update({(i, j): None for k, i in enumerate(places) for j in places[k + 1 :]})
        return tuple(
            DependencePair(names[i], names[j], float(asked[i, j]), float(achieved[i, j]))
            for i, j in pairs
        )

    def _record(
        self,
        compiled: Compiled,
        engine: BlockEngine,
        draws: int,
        seed: int,
        started: dt.datetime,
        command: str,
    ) -> RunRecord:
        program = compiled.program
        return RunRecord(
            model=self.model.path.name,
            model_sha256=_sha256(self.model.path),
            sidecar=self.sidecar.path.name,
            sidecar_sha256=hashlib.sha256(self.sidecar.text.encode()).hexdigest(),
            sidecar_text=self.sidecar.text,
            draws=draws,
            seed=seed,
            sampling=self.sidecar.run.sampling,
            as_of=self.model.as_of,
            started=started,
            command=command,
            versions={
                "cellsim": version.VERSION,
                "Python": platform.python_version(),
                **{name: metadata.version(name) for name in _RECORDED_LIBRARIES},
            },
            engine={
                "evaluator": "NumPy over blocks of draws",
                "threads": str(engine.threads),
                "draws in a block": str(engine.block),
                "cells between inputs and outputs": str(len(compiled.varying)),
                "instructions": str(instruction_count(program.instructions)),
            },
            timings={
                "read": self._timings.get("read", 0.0),
                "compile": self._timings.get("compile", 0.0),
                "check": self._timings.get("check", 0.0),
                "sample": self._timings.get("sample", 0.0),
                "evaluate": self._timings.get("evaluate", 0.0),
                "summarise": self._timings.get("trace", 0.0),
            },
            slow_cells=tuple(
                (str(expression.cell), f"evaluated draw by draw: {expression.reason}")
                for expression in program.slow
            ),
        )


def _circles(loops: Sequence[tuple[CellRef, ...]]) -> str:
    """What is said of circular chains: one sentence, however many there are."""
    first, longest = loops[0][0], max(len(cells) for cells in loops)
    if len(loops) == 1:
        return f"The circular chain of {longest} cells from {first} on is solved by iteration in every draw."
    return (
        f"{len(loops):,} circular chains of up to {longest} cells, the first from {first} on, are solved by "
        "iteration in every draw."
    )


def _silent(_stage: str, _done: int, _whole: int) -> None:
    """No progress is reported."""


def _sha256(path: Path) -> str:
    digest = hashlib.sha256()
    with path.open("rb") as file:
        while chunk := file.read(1 << 20):
            digest.update(chunk)
    return digest.hexdigest()


def open_study(path: Path | str) -> Study:
    """Read a side-car and its model, and find what is asked in it.

    Args:
        path: The side-car.

    Raises:
        SidecarError: The side-car is wrong, or does not fit the model.
        ModelError: The model cannot be read.
    """
    path = Path(path)
    sidecar = load_sidecar(path)
    if not sidecar.workbook.exists():
        raise SidecarError(
            Problem(
                f"{path.name}, [model]",
                f"the workbook {sidecar.workbook} is not there",
                _others(sidecar.workbook),
            )
        )
    start = time.perf_counter()
    model = load(sidecar.workbook, as_of=as_datetime(sidecar.as_of))
    read = time.perf_counter() - start
    start = time.perf_counter()
    _ = model.graph
    return Study(sidecar, model, timings={"read": read, "compile": time.perf_counter() - start})


def _others(path: Path) -> str:
    folder = path.parent
    if not folder.is_dir():
        return f"there is no folder {folder}"
    books = sorted(p.name for p in folder.iterdir() if p.suffix in {".xlsx", ".xlsm"})
    return (
        f"workbooks there: {', '.join(books[:8])}"
        if books
        else "there is no workbook in that folder"
    )
