"""Every input as it was asked for and as it was drawn."""

from __future__ import annotations

import math
from collections.abc import Sequence

from xlsxwriter.chart import Chart

from cellsim.analysis.histogram import Histogram
from cellsim.report.book import Book
from cellsim.report.charts import Line, curve_chart, round_bounds
from cellsim.report.figures import InputFigures
from cellsim.report.number_formats import finer_code
from cellsim.report.page import Page
from cellsim.report.palette import BASE_LINE, CURVE
from cellsim.report.places import INPUTS
from cellsim.report.plain_text import one_line

NAME = INPUTS
_WIDTHS = (27, 20, 13, 13, 13, 13, 13, 13, 13, 13, 13)
_LAST = len(_WIDTHS) - 1
_ASKED = (
    "Input",
    "Place",
    "Distribution",
    "",
    "",
    "Base value",
    "Base at percentile",
    "Why",
    "",
    "Source",
    "",
)
_DRAWN = (
    "Input", "Unit", "Mean asked", "Mean drawn", "Standard deviation asked", "Standard deviation drawn",
    "Smallest drawn", "5 % drawn", "50 % drawn", "95 % drawn", "Largest drawn",
)  # fmt: skip
_ACROSS = ((0, 0), (3, 0), (7, 30))
_CHART_ROWS = 16
_CHART_SIZE = {"width": 400, "height": 270}
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
    page.worksheet.freeze_panes(row, 1)
    page.worksheet.repeat_rows(0)
    row = _write_asked(book, page, row)
    row = _write_drawn(book, page, row)
    _write_charts(book, page, row)


def _write_asked(book: Book, page: Page, row: int) -> int:
    page.heading(row, "As asked", _LAST)
    page.header(row + 1, _ASKED, numbers_from=_LAST + 1)
    row += 2
    for item in book.figures.inputs:
        record = item.record
        named = not record.label or record.label == record.name
        name = record.name if named else f"{record.label}\n({record.name})"
        page.text(row, 0, name, "wrapped")
        page.text(row, 1, record.place, "wrapped")
        page.fit_row(row, [(name, page.widths[0]), (record.place, page.widths[1])])
        page.paragraph(row, record.distribution, 4, first=2, kind="wrapped")
        page.number(row, 5, record.base, item.scale.code)
        page.share(row, 6, record.base_percentile)
        page.paragraph(row, record.note, 8, first=7, kind="wrapped")
        page.paragraph(row, record.source, 10, first=9, kind="wrapped")
        row += 1
    return row + 1


def _write_drawn(book: Book, page: Page, row: int) -> int:
    page.heading(row, "As drawn", _LAST)
    page.header(row + 1, _DRAWN, numbers_from=2)
    row += 2
    for item in book.figures.inputs:
        _write_figures(page, row, item)
        row += 1
    return row + 1


def _write_figures(page: Page, row: int, item: InputFigures) -> None:
    record, code, spread = item.record, item.scale.code, item.scale.spread_code
    page.text(row, 0, item.title, "wrapped")
    page.text(row, 1, item.scale.unit, "wrapped")
    page.fit_row(row, [(item.title, page.widths[0]), (item.scale.unit, page.widths[1])])
    page.number(row, 2, record.mean, code)
    page.number(row, 4, record.sd, finer_code(spread, record.sd))
    found = item.summary
    sd = found.moments.sd if found else None
    page.number(row, 3, found.moments.mean if found else None, code)
    page.number(row, 5, sd, finer_code(spread, sd or 0.0))
    page.number(row, 6, found.moments.minimum if found else None, code)
    for column, place in ((7, _P5), (8, _P50), (9, _P95)):
        page.number(row, column, float(found.quantiles.values[place]) if found else None, code)
    page.number(row, 10, found.moments.maximum if found else None, code)


def _write_charts(book: Book, page: Page, row: int) -> None:
    """Density charts in rows of three, and below them the table that they are drawn from."""
    drawn = [item for item in book.figures.inputs if item.summary is not None]
    if not drawn:
        return
    page.heading(row, "Densities of the draws", _LAST)
    row += 1
    rows_of_charts = math.ceil(len(drawn) / len(_ACROSS))
    table = row + rows_of_charts * _CHART_ROWS + 1
    page.worksheet.print_area(0, 0, table - 1, _LAST)
    page.heading(table, "What the charts are drawn from (not printed)", _LAST)
    page.header(table + 1, ("Input", "Value", "Density"), numbers_from=1)
    place = table + 2
    for k, item in enumerate(drawn):
        place, chart = _write_density(book, page, place, item)
        page.chart(
            row + k // len(_ACROSS) * _CHART_ROWS,
            _ACROSS[k % len(_ACROSS)][0],
            chart,
            f"Density of the draws of {item.title}; the base value is a dashed upright line.",
            x_offset=_ACROSS[k % len(_ACROSS)][1],
        )


def _write_density(book: Book, page: Page, row: int, item: InputFigures) -> tuple[int, Chart]:
    """Write an input's outline and base line; the next free row and the chart are given back."""
    if item.summary is None:
        raise AssertionError("an input without draws has no density")
    bins = item.summary.histogram
    outline = density_outline(bins)
    lines = [_write_line(page, row, item, outline, "Draws")]
    row += len(outline)
    base = item.record.base
    low, high = outline[0][0], outline[-1][0]
    if base is not None and math.isfinite(base):
        upright = [(base, 0.0), (base, max(height for _, height in outline))]
        lines.append(_write_line(page, row, item, upright, "Base value"))
        row += len(upright)
        low, high = min(low, base), max(high, base)
    x_axis = {"name": f"Value{item.scale.title}", "num_format": item.scale.code}
    y_axis = {"name": "Density of draws", "num_format": "General", "min": 0}
    if bins.separate:
        y_axis |= {"name": "Share of draws", "num_format": "0%"}
    chart = curve_chart(
        book.workbook,
        f"Input: {one_line(item.title, 45)}",
        lines,
        {**x_axis, "label_position": "low", **round_bounds(low, high)},
        y_axis,
    )
    chart.set_size(_CHART_SIZE)
    return row, chart


def _write_line(
    page: Page, row: int, item: InputFigures, points: Sequence[tuple[float, float]], name: str
) -> Line:
    """Write the points of a line and name the cells."""
    for k, (x, height) in enumerate(points):
        page.text(row + k, 0, f"{item.title}: {name.lower()}")
        page.number(row + k, 1, x, item.scale.code)
        page.number(row + k, 2, height, "0.00E+00")
    last = row + len(points) - 1
    style = CURVE if name == "Draws" else BASE_LINE
    return Line(name, (NAME, row, 1, last, 1), (NAME, row, 2, last, 2), style)


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
