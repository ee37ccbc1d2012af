"""Every input as it was asked for and as it was drawn."""

from __future__ import annotations

import math

from xlsxwriter.chart import Chart

from cellsim.analysis.histogram import Histogram
from cellsim.report.book import Book
from cellsim.report.charts import Line, curve_chart
from cellsim.report.figures import InputFigures
from cellsim.report.number_formats import finer_code
from cellsim.report.page import Page
from cellsim.report.palette import BASE_LINE, CURVE
from cellsim.report.places import INPUTS
from cellsim.report.plain_text import one_line

NAME = INPUTS
_WIDTHS = (24, 15, 9, 34, 13, 10, 13, 13, 13, 13, 13, 13, 13, 13, 13, 30, 24)
_TITLES = (
    "Input", "Place", "Unit", "Distribution", "Base value", "Base at percentile", "Mean asked", "Mean drawn",
    "Standard deviation asked", "Standard deviation drawn", "Smallest drawn", "5 % drawn", "50 % drawn", "95 % drawn",
    "Largest drawn", "Why", "Source",
)  # fmt: skip
_LAST = len(_WIDTHS) - 1
_ACROSS = (0, 4, 9)
_CHART_ROWS = 15
_CHART_SIZE = {"width": 480, "height": 270}
_P5, _P50, _P95 = 7, 52, 97


def is_needed(book: Book) -> bool:
    """When there are inputs."""
    return bool(book.figures.inputs)


def write(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(NAME, _WIDTHS, landscape=True)
    lead = (
        "What is uncertain: the distribution asked for, the model's own value and where it lies in that distribution, and "
        "what was drawn. Asked and drawn differ by chance only."
    )
    row = page.title("Inputs", lead, _LAST)
    page.header(row, _TITLES, numbers_from=4)
    page.repeat(row, row)
    row += 1
    for item in book.figures.inputs:
        _write_row(page, row, item)
        row += 1
    _write_charts(book, page, row + 1)


def _write_row(page: Page, row: int, item: InputFigures) -> None:
    record, code, spread = item.record, item.scale.code, item.scale.spread_code
    name = (
        record.name
        if not record.label or record.label == record.name
        else f"{record.label}\n({record.name})"
    )
    wrapped = {
        0: name,
        1: record.place,
        2: item.scale.unit,
        3: record.distribution,
        15: record.note,
        16: record.source,
    }
    for column, text in wrapped.items():
        page.text(row, column, text, "wrapped")
    page.fit_row(row, [(text, page.widths[column]) for column, text in wrapped.items()])
    page.number(row, 4, record.base, code)
    page.share(row, 5, record.base_percentile)
    page.number(row, 6, record.mean, code)
    page.number(row, 8, record.sd, finer_code(spread, record.sd))
    found = item.summary
    sd = found.moments.sd if found else None
    page.number(row, 7, found.moments.mean if found else None, code)
    page.number(row, 9, sd, finer_code(spread, sd or 0.0))
    page.number(row, 10, found.moments.minimum if found else None, code)
    for column, place in ((11, _P5), (12, _P50), (13, _P95)):
        page.number(row, column, float(found.quantiles.values[place]) if found else None, code)
    page.number(row, 14, found.moments.maximum if found else None, code)


def _write_charts(book: Book, page: Page, row: int) -> None:
    """Density charts in rows of three, and below them the table that they are drawn from."""
    drawn = [item for item in book.figures.inputs if item.summary is not None]
    if not drawn:
        return
    page.heading(row, "Densities of the draws", _LAST)
    row += 1
    rows_of_charts = math.ceil(len(drawn) / len(_ACROSS))
    table = row + rows_of_charts * _CHART_ROWS + 1
    page.heading(table, "What the charts are drawn from", _LAST)
    page.header(table + 1, ("Input", "Value", "Density"), numbers_from=1)
    place = table + 2
    for k, item in enumerate(drawn):
        place, chart = _write_density(book, page, place, item)
        page.chart(
            row + k // len(_ACROSS) * _CHART_ROWS,
            _ACROSS[k % len(_ACROSS)],
            chart,
            f"Density of the draws of {item.title}; the base value is a dashed upright line.",
        )


def _write_density(book: Book, page: Page, row: int, item: InputFigures) -> tuple[int, Chart]:
    """Write an input's outline and base line; the next free row and the chart are given back."""
    if item.summary is None:
        raise AssertionError("an input without draws has no density")
    outline = density_outline(item.summary.histogram)
    first = row
    top = max(height for _, height in outline)
    lines = [("Draws", outline)]
    if item.record.base is not None and math.isfinite(item.record.base):
        lines.append(("Base value", [(item.record.base, 0.0), (item.record.base, top)]))
    made = []
    for name, points in lines:
        start = row
        for x, height in points:
            page.text(row, 0, item.title if row == first else "" if row > start else name)
            page.number(row, 1, x, item.scale.code)
            page.number(row, 2, height, "0.00E+00")
            row += 1
        style = CURVE if name == "Draws" else BASE_LINE
        made.append(Line(name, (NAME, start, 1, row - 1, 1), (NAME, start, 2, row - 1, 2), style))
    height_name = "Share of draws" if item.summary.histogram.separate else "Density of draws"
    chart = curve_chart(
        book.workbook,
        f"Input: {one_line(item.title, 45)}",
        made,
        {
            "name": f"Value{item.scale.title}",
            "num_format": item.scale.code,
            "label_position": "low",
        },
        {
            "name": height_name,
            "num_format": "General" if not item.summary.histogram.separate else "0%",
            "min": 0,
        },
    )
    chart.set_size(_CHART_SIZE)
    return row, chart


def density_outline(bins: Histogram) -> list[tuple[float, float]]:
    """The outline of a histogram: steps of its density, or spikes at separate values.

    Open bins of long tails have no width and so no density; they are left out of the outline.
    """
    total = float(bins.counts.sum())
    points: list[tuple[float, float]] = []
    for lower, upper, count in zip(
        bins.lower.tolist(), bins.upper.tolist(), bins.counts.tolist(), strict=True
    ):
        if bins.separate:
            points += [(lower, 0.0), (lower, count / total), (lower, 0.0)]
        elif math.isfinite(lower) and math.isfinite(upper):
            density = count / total / (upper - lower)
            points += [(lower, density), (upper, density)]
    if bins.separate:
        return points
    return [(points[0][0], 0.0), *points, (points[-1][0], 0.0)]
