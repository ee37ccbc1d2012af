"""The two charts of an output, used on more than one sheet."""

from __future__ import annotations

import math
from typing import Any

from xlsxwriter import Workbook
from xlsxwriter.chart import Chart

from cellsim.report.charts import Line, Span, bin_chart, curve_chart, fit_side_by_side, round_bounds
from cellsim.report.figures import OutputFigures
from cellsim.report.palette import BASE_LINE, CURVE, THRESHOLD_LINES
from cellsim.report.places import DISTRIBUTION, QUANTILES, Block, base_bin
from cellsim.report.plain_text import one_line
from cellsim.report.wording import base_text

MARKS_COLUMN = 5
MARKS_ROW = 9
"""Rows below a quantile block's heading at which its first mark stands: base case, then thresholds."""
MOST_MARKS = 4
LABEL, SHARE, CUMULATIVE, BASE_SHARE = 0, 4, 5, 6
"""Columns of a distribution block's table."""
_MOST_LABELS = 10
_LETTERS_ACROSS = 40


def mark_values(output: OutputFigures) -> list[tuple[str, float]]:
    """The upright lines of an output's curve: base case and the first thresholds."""
    marks = [] if output.base is None else [("Base case", output.base)]
    thresholds = [about.value for about in output.thresholds if about is not None]
    names = (
        ["Threshold"]
        if len(thresholds) == 1
        else [f"Threshold {k + 1}" for k in range(len(thresholds))]
    )
    return (marks + list(zip(names, thresholds, strict=True)))[:MOST_MARKS]


def cumulative_chart(workbook: Workbook, output: OutputFigures, block: Block) -> Chart:
    """The cumulative distribution of an output with its base case and thresholds as upright lines."""
    lines = [
        Line(
            "Share of draws at or below",
            (QUANTILES, block.first, 1, block.last, 1),
            (QUANTILES, block.first, 0, block.last, 0),
            CURVE,
        )
    ]
    styles = iter(THRESHOLD_LINES)
    for k, (name, _) in enumerate(mark_values(output)):
        row = block.top + MARKS_ROW + k
        x = (QUANTILES, row, MARKS_COLUMN + 1, row, MARKS_COLUMN + 2)
        y = (QUANTILES, row, MARKS_COLUMN + 3, row, MARKS_COLUMN + 4)
        lines.append(Line(name, x, y, BASE_LINE if name == "Base case" else next(styles)))
    title = f"Cumulative distribution: {one_line(output.title, 50)}"
    x_axis = {
        "name": f"Value{output.scale.title}",
        "num_format": output.scale.axis_code,
        "label_position": "low",
    }
    x_axis |= _bounds(output)
    y_axis = {
        "name": "Share of draws at or below",
        "num_format": "0%",
        "min": 0,
        "max": 1,
        "major_unit": 0.25,
    }
    return curve_chart(workbook, title, lines, x_axis, y_axis)


def _bounds(output: OutputFigures) -> dict[str, Any]:
    """Axis bounds about the body of the draws and the marks that are not far from it."""
    summary = output.summary
    if summary is None:
        return {}
    low, high = (float(value) for value in summary.quantiles.values[[1, -2]])
    reach = 2 * (high - low)
    near = [value for _, value in mark_values(output) if low - reach <= value <= high + reach]
    return round_bounds(min(low, *near, high), max(low, *near, high))


def cumulative_alt_text(output: OutputFigures) -> str:
    """The curve in words."""
    return (
        f"Cumulative distribution of {output.title}: share of draws at or below each value, from the quantile table; "
        f"base case {base_text(output.record.base, output)}."
    )


def histogram_chart(workbook: Workbook, output: OutputFigures, block: Block) -> Chart:
    """Share of draws by bin with the cumulative share; the bin of the base case is hatched."""
    labels = _column(block, LABEL)
    columns = [("Share of draws", _column(block, SHARE))]
    if base_bin(output) is not None:
        columns.append(("Bin with the base case", _column(block, BASE_SHARE)))
    bins = block.last - block.first + 1
    separate = output.summary is not None and output.summary.histogram.separate
    edge = "Value" if separate else "Lower edge of bin"
    outside = output.base is not None and base_bin(output) is None
    note = f" (base case {output.scale.text(output.base)} not among them)" if outside else ""
    title = f"Distribution: {one_line(output.title, 50)}"
    x_axis = {
        "name": f"{edge}{output.scale.title}{note}",
        "interval_unit": max(1, math.ceil(bins / _MOST_LABELS)),
    }
    return bin_chart(
        workbook,
        title,
        labels,
        columns,
        _column(block, CUMULATIVE),
        x_axis,
        highest=output.summary.histogram.highest_share if output.summary else 1.0,
        upright=separate and _are_short(output),
    )


def _are_short(output: OutputFigures) -> bool:
    """Whether the labels of an output's separate values go side by side under a chart."""
    values = output.summary.histogram.lower.tolist() if output.summary else []
    return fit_side_by_side(map(output.scale.bare_text, values), _LETTERS_ACROSS)


def histogram_alt_text(output: OutputFigures) -> str:
    """The histogram in words."""
    place = "" if base_bin(output) is None else " The bin that holds the base case is hatched."
    return f"Histogram of {output.title}: share of draws in each bin, and the cumulative share as a line.{place}"


def _column(block: Block, column: int) -> Span:
    return (DISTRIBUTION, block.first, column, block.last, column)
