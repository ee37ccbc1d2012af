"""Native charts in one hand: scatter curves and columns, readable without colour."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from xlsxwriter import Workbook
from xlsxwriter.chart import Chart

from cellsim.analysis.histogram import round_width
from cellsim.report.palette import (
    AXIS_LINE,
    CLAY,
    CUMULATIVE_LINE,
    GRID_LINE,
    INK,
    PAPER,
    TEAL,
)
from cellsim.report.styles import FONT

_NAME_FONT = {"name": FONT["font_name"], "size": 9, "bold": False, "color": INK}
_TITLE_FONT = {"name": FONT["font_name"], "size": 11, "bold": True, "color": INK}

_STEPS = 7
_NEARLY_ALL = 0.75

Span = tuple[str, int, int, int, int]
"""Sheet name, first row, first column, last row, last column."""


@dataclass(frozen=True, slots=True)
class Line:
    """A line in a scatter chart.

    Attributes:
        name: What the legend says, this package's own words.
        x: Cells of its places.
        y: Cells of its heights.
        line: Line properties.
    """

    name: str
    x: Span
    y: Span
    line: dict[str, Any]


def curve_chart(
    workbook: Workbook,
    title: str,
    lines: Sequence[Line],
    x_axis: dict[str, Any],
    y_axis: dict[str, Any],
) -> Chart:
    """A chart of lines over numbers.

    Args:
        workbook: Where it goes.
        title: Its title.
        lines: The lines.
        x_axis: Name, number format and bounds of the axis across.
        y_axis: The same of the axis upward.

    Returns:
        The chart.
    """
    chart = _new(workbook, {"type": "scatter", "subtype": "straight"})
    for line in lines:
        chart.add_series(
            {
                "name": line.name,
                "categories": list(line.x),
                "values": list(line.y),
                "line": line.line,
                "marker": {"type": "none"},
            }
        )
    _dress(chart, title, _axis(x_axis), _axis(y_axis, grid=True))
    return chart


def bin_chart(
    workbook: Workbook,
    title: str,
    labels: Span,
    columns: Sequence[tuple[str, Span]],
    cumulative: Span | None,
    x_axis: dict[str, Any],
    *,
    highest: float,
    upright: bool = False,
) -> Chart:
    """Columns of shares by bin, with a cumulative line.

    A second series is hatched and stands before the first, which it hides where it has a column.

    Args:
        workbook: Where it goes.
        title: Its title.
        labels: Cells with the bins' labels.
        columns: Name and cells of one or two series of shares.
        cumulative: Cells of the cumulative shares, or None.
        x_axis: Name and label spacing of the axis across.
        highest: The highest share.
        upright: Whether the bins' labels stand upright; else they are turned to fit.

    Returns:
        The chart.
    """
    chart = _new(workbook, {"type": "column"})
    fills: tuple[dict[str, Any], ...] = (
        {"fill": {"color": TEAL}, "border": {"color": PAPER, "width": 0.5}},
        {
            "pattern": {"pattern": "wide_upward_diagonal", "fg_color": CLAY, "bg_color": PAPER},
            "border": {"color": CLAY, "width": 1},
        },
    )
    for (name, span), fill in zip(columns, fills, strict=False):
        chart.add_series(
            {
                "name": name,
                "categories": list(labels),
                "values": list(span),
                "gap": 4,
                "overlap": 100,
                **fill,
            }
        )
    y_axis = {"name": "Share of draws", "num_format": "0%", "min": 0}
    if highest > _NEARLY_ALL:
        y_axis |= {"max": 1, "major_unit": 0.25}  # or the axis would go beyond 100 %
    if cumulative is not None:
        line = workbook.add_chart({"type": "line"})
        line.add_series(
            {
                "name": "Cumulative share (right axis)",
                "categories": list(labels),
                "values": list(cumulative),
                "line": CUMULATIVE_LINE,
                "y2_axis": True,
            }
        )
        line.set_y2_axis(
            _axis(
                {
                    "name": "Cumulative share",
                    "num_format": "0%",
                    "min": 0,
                    "max": 1,
                    "major_unit": 0.25,
                }
            )
        )
        chart.combine(line)
    _dress(
        chart,
        title,
        _axis({**x_axis, "label_position": "low"}, rotation=0 if upright else -45),
        _axis(y_axis, grid=True),
    )
    return chart


def fit_side_by_side(labels: Iterable[str], letters: int) -> bool:
    """Whether labels go side by side under an axis.

    Args:
        labels: The labels.
        letters: How many letters the axis is wide.

    Returns:
        Whether they do.
    """
    return sum(len(label) + 2 for label in labels) <= letters


def round_bounds(low: float, high: float) -> dict[str, Any]:
    """Bounds and steps of an axis at round numbers; none where they would not be exact enough.

    Args:
        low: Smallest value to show.
        high: Largest value to show.

    Returns:
        Axis properties.
    """
    span = high - low
    if not math.isfinite(span) or span <= 0 or span < 1e-9 * max(abs(low), abs(high)):
        return {}
    step, power = round_width(span / _STEPS)
    width = step * 10.0**power
    if not 0 < width < math.inf:
        return {}
    ends = (math.floor(low / width) * step, math.ceil(high / width) * step)
    first, last = (end * 10.0**power if power >= 0 else end / 10.0**-power for end in ends)
    return {"min": first, "max": last, "major_unit": width}


def _new(workbook: Workbook, options: dict[str, Any]) -> Chart:
    chart = workbook.add_chart(options)
    if chart is None:
        raise AssertionError(f"no chart of type {options}")
    return chart


def _axis(given: dict[str, Any], *, grid: bool = False, rotation: int = 0) -> dict[str, Any]:
    return {
        "name_font": _NAME_FONT,
        "num_font": {**_NAME_FONT, "rotation": rotation} if rotation else _NAME_FONT,
        "line": AXIS_LINE,
        "major_gridlines": {"visible": grid, "line": GRID_LINE},
        **given,
    }


def _dress(chart: Chart, title: str, x_axis: dict[str, Any], y_axis: dict[str, Any]) -> None:
    chart.set_title({"name": title, "name_font": _TITLE_FONT, "overlay": False})
    chart.set_x_axis({"crossing": "min", **x_axis})
    chart.set_y_axis({"crossing": "min", **y_axis})
    chart.set_legend({"position": "bottom", "font": _NAME_FONT})
    chart.set_chartarea({"border": {"color": INK, "width": 0.5}, "fill": {"color": PAPER}})
    chart.set_plotarea({"fill": {"color": PAPER}})
    chart.show_blanks_as("gap")
