"""The figures of a run, worked out once for all sheets."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from cellsim.analysis.shares import Exceedance
from cellsim.analysis.summarize import Summary, summarize
from cellsim.report.plain_text import one_line
from cellsim.report.scale import Scale, scale_of
from cellsim.results import InputRecord, OutputRecord, RunResults

PROBABILITIES = np.array([0, 0.001, 0.005, *[k / 100 for k in range(1, 100)], 0.995, 0.999, 1.0])
"""Those of the quantile table: the extremes, the far tails and every whole per cent."""
_LOW, _MIDDLE, _HIGH = 12, 52, 92  # rows of 10 %, 50 % and 90 %


@dataclass(frozen=True, slots=True)
class OutputFigures:
    """One output.

    Attributes:
        record: What was asked.
        title: What a person calls it.
        scale: How its numbers are written.
        base: Its base case if that is a finite number.
        summary: Its draws in figures, None if all failed.
        thresholds: For each finite threshold of the record, how the draws lie about it; None for others
            or where all draws failed.
        at_base: How the draws lie about the base case, or None.
    """

    record: OutputRecord
    title: str
    scale: Scale
    base: float | None
    summary: Summary | None
    thresholds: tuple[Exceedance | None, ...]
    at_base: Exceedance | None


@dataclass(frozen=True, slots=True)
class InputFigures:
    """One input.

    Attributes:
        record: How it was drawn.
        title: What a person calls it.
        scale: How its numbers are written.
        summary: Its draws in figures, None if there are none.
    """

    record: InputRecord
    title: str
    scale: Scale
    summary: Summary | None


@dataclass(frozen=True, slots=True)
class Figures:
    """All outputs and inputs in figures.

    Attributes:
        outputs: In the side-car's order.
        inputs: In the side-car's order.
    """

    outputs: tuple[OutputFigures, ...]
    inputs: tuple[InputFigures, ...]


def central_range(summary: Summary) -> tuple[float, float, float]:
    """The 10 %, 50 % and 90 % quantiles of a summary over `PROBABILITIES`."""
    values = summary.quantiles.values
    return float(values[_LOW]), float(values[_MIDDLE]), float(values[_HIGH])


def work_out(results: RunResults) -> Figures:
    """Summarise every output and input of a run.

    Args:
        results: The run.

    Returns:
        Its figures.
    """
    outputs = tuple(
        _output(record, draws)
        for record, draws in zip(results.outputs, results.output_draws, strict=True)
    )
    inputs = tuple(
        _input(record, draws)
        for record, draws in zip(results.inputs, results.input_draws, strict=True)
    )
    return Figures(outputs, inputs)


def _output(record: OutputRecord, draws: np.ndarray) -> OutputFigures:
    is_number = isinstance(record.base, int | float) and not isinstance(record.base, bool)
    base = float(record.base) if is_number and math.isfinite(record.base) else None  # type: ignore[arg-type]
    finite = [t.value for t in record.thresholds if math.isfinite(t.value)]
    about = finite if base is None else [*finite, base]
    summary = summarize(draws, PROBABILITIES, about=about)
    found = iter(summary.exceedances if summary is not None else ())
    thresholds = tuple(
        next(found, None) if math.isfinite(t.value) else None for t in record.thresholds
    )
    return OutputFigures(
        record=record,
        title=one_line(record.label or record.name, 80),
        scale=_scale(record.number_format, record.unit, summary, base),
        base=base,
        summary=summary,
        thresholds=thresholds,
        at_base=next(found, None),
    )


def _input(record: InputRecord, draws: np.ndarray) -> InputFigures:
    summary = summarize(draws, PROBABILITIES)
    title = one_line(record.label or record.name, 80)
    return InputFigures(
        record, title, _scale(record.number_format, record.unit, summary, record.base), summary
    )


def _scale(number_format: str, unit: str, summary: Summary | None, base: float | None) -> Scale:
    largest = abs(base) if base is not None and math.isfinite(base) else 0.0
    spread = 0.0
    if summary is not None:
        low, _, high = central_range(summary)
        largest = max(abs(low), abs(high)) or largest
        spread = (high - low) / 2.563 or summary.moments.sd or 0.0
    bins = summary.histogram if summary is not None else None
    separate = bins is not None and bins.separate
    whole = bins is not None and bool(np.all(bins.lower == np.rint(bins.lower)))
    return scale_of(number_format, unit, largest, spread, separate=separate, whole=whole)
