"""What a run leaves behind: frozen records that the report, the command line and the API read."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.values import Scalar

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class InputRecord:
    """One uncertain input as it was drawn.

    Attributes:
        name: Its name in the side-car.
        label: The text beside the cell in the model, or "".
        place: The cell, `Inputs!C6`.
        unit: Its unit from the side-car or the number format, or "".
        number_format: The model's number format code for the cell, "General" if it has none.
        distribution: In words, with parameters: `triangular, low 0.12, mode 0.18, high 0.24`.
        note: Why it was chosen, from the side-car, or "".
        source: Where it came from, from the side-car, or "".
        base: The model's own value.
        base_percentile: Share of the distribution at or below the base value, 0 to 1, or None.
        mean: The distribution's mean (truncation included).
        sd: The distribution's standard deviation (truncation included).
        lower: Lower bound, -inf if none.
        upper: Upper bound, inf if none.
        discrete: Whether it takes separate values only.
    """

    name: str
    label: str
    place: str
    unit: str
    number_format: str
    distribution: str
    note: str
    source: str
    base: float | None
    base_percentile: float | None
    mean: float
    sd: float
    lower: float
    upper: float
    discrete: bool


@dataclass(frozen=True, slots=True)
class Threshold:
    """A value that an output is compared with.

    Attributes:
        text: As the side-car gives it: `4.2` or `=Market!B2`.
        value: The number.
    """

    text: str
    value: float


@dataclass(frozen=True, slots=True)
class OutputRecord:
    """One output that was asked for.

    Attributes:
        name: Its name in the side-car.
        label: From the side-car, else the text beside the cell, or "".
        place: The cell, or the formula with its `=`.
        unit: From the side-car or the number format, or "".
        number_format: The model's number format code for the cell, "General" if it has none.
        base: Its value in the base case; may be an error.
        thresholds: What it is compared with.
    """

    name: str
    label: str
    place: str
    unit: str
    number_format: str
    base: Scalar
    thresholds: tuple[Threshold, ...]


@dataclass(frozen=True, slots=True)
class DependencePair:
    """Two inputs that move together.

    Attributes:
        first: Name of one input.
        second: Name of the other.
        asked: Rank correlation (Spearman) that the side-car asks for.
        achieved: Rank correlation of the draws.
    """

    first: str
    second: str
    asked: float
    achieved: float


@dataclass(frozen=True, slots=True)
class FailedDraw:
    """One failed draw, replayed to find where its error arose.

    Attributes:
        draw: Its number, counted from 1.
        output: Name of the output.
        error: The error as spelled in a cell.
        place: The cell where it first arose, or "".
        formula: The formula there with its `=`, or "".
        inputs: The value of each input in the draw, by name.
    """

    draw: int
    output: str
    error: str
    place: str
    formula: str
    inputs: Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Failures:
    """All failed draws.

    Attributes:
        draws: Number of draws in which at least one output failed.
        counts: Number of failed draws by output name and error spelling.
        examples: Some of them, replayed.
    """

    draws: int
    counts: Mapping[tuple[str, str], int]
    examples: tuple[FailedDraw, ...]


@dataclass(frozen=True, slots=True)
class Disagreement:
    """A formula whose recalculated value is not the stored one.

    Attributes:
        place: The cell.
        formula: Its formula with `=`.
        stored: The value in the file.
        recalculated: The value that cellsim finds.
        root: Whether the difference starts here: on the stored values of the cells that it reads, the
            formula does not give its own.
        cause: What it may come from, in a few words.
    """

    place: str
    formula: str
    stored: Scalar
    recalculated: Scalar
    root: bool
    cause: str = ""


@dataclass(frozen=True, slots=True)
class SheetAgreement:
    """How the formulas of one sheet compare.

    Attributes:
        title: The sheet.
        compared: Formula cells compared.
        agreeing: How many of them agree.
    """

    title: str
    compared: int
    agreeing: int


@dataclass(frozen=True, slots=True)
class ModelCheck:
    """How the recalculated workbook compares with the values stored in the file.

    Attributes:
        compared: Formula cells compared.
        agreeing: How many of them agree.
        volatile: Formula cells left out because they are or depend on volatile functions.
        without_value: Formula cells left out because the file stores no value.
        disagreements: All others.
        unsupported: Functions that cellsim does not calculate: name, number of cells, reason.
        notes: What else a reader should know (macros not run, external links read from the file).
        sheets: The same by sheet, those without formulas left out.
    """

    compared: int
    agreeing: int
    volatile: int
    without_value: int
    disagreements: tuple[Disagreement, ...]
    unsupported: tuple[tuple[str, int, str], ...]
    notes: tuple[str, ...] = ()
    sheets: tuple[SheetAgreement, ...] = ()


@dataclass(frozen=True, slots=True)
class RunRecord:
    """Everything needed to repeat the run.

    Attributes:
        model: The model's file name.
        model_sha256: Hash of its bytes.
        sidecar: The side-car's file name.
        sidecar_sha256: Hash of its bytes.
        sidecar_text: Its text.
        draws: Number of draws.
        seed: The seed.
        sampling: "random" or "latin-hypercube".
        as_of: What TODAY() returned.
        started: When the run began (UTC).
        command: What was asked of the program, or "" for the Python API.
        versions: Version by name: cellsim, Python, NumPy and so on.
        engine: Facts of the evaluation by name: backend, threads, draws in a block, instructions.
        timings: Seconds by stage, in order: read, compile, sample, evaluate, summarise.
        slow_cells: Cells evaluated draw by draw or taken from the file, each with the reason.
    """

    model: str
    model_sha256: str
    sidecar: str
    sidecar_sha256: str
    sidecar_text: str
    draws: int
    seed: int
    sampling: str
    as_of: dt.datetime
    started: dt.datetime
    command: str
    versions: Mapping[str, str]
    engine: Mapping[str, str]
    timings: Mapping[str, float]
    slow_cells: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, eq=False)
class RunResults:
    """One run of a study.

    Attributes:
        inputs: The inputs, in the side-car's order.
        outputs: The outputs, in the side-car's order.
        input_draws: Shape (inputs, draws).
        output_draws: Shape (outputs, draws); NaN in failed draws (the payload names the error).
        dependence: The pairs of inputs with an asked rank correlation.
        failures: The failed draws.
        check: The model check.
        record: The run record.
    """

    inputs: tuple[InputRecord, ...]
    outputs: tuple[OutputRecord, ...]
    input_draws: FloatArray
    output_draws: FloatArray
    dependence: tuple[DependencePair, ...]
    failures: Failures
    check: ModelCheck
    record: RunRecord
