"""Every input as it was asked for and as it was drawn."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

from xlsxwriter.chart import Chart

from cellsim.analysis.histogram import Histogram
from cellsim.report.book import Book
from cellsim.report.charts import Line, Span, bin_chart, curve_chart, fit_side_by_side, round_bounds
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
    "Input", "Unit", "Mean\nasked", "Mean\ndrawn", "Standard\ndeviation\nasked", "Standard\ndeviation\ndrawn",
    "Smallest\ndrawn", "5 %\ndrawn", "50 %\ndrawn", "95 %\ndrawn", "Largest\ndrawn",
)  # fmt: skip
_ACROSS = ((0, 0), (2, 63), (6, 80))
_CHART_ROWS = 16
_TITLE_ROWS = 2  # repeated on every page
_CHART_SIZE = {"width": 398, "height": 270}
_LETTERS_ACROSS = 32
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
    charts = _write_drawn(book, page, row)
    _write_charts(book, page, charts)
    page.keep_whole(_blocks(book, row, charts), repeated=_TITLE_ROWS)


def _blocks(book: Book, drawn: int, charts: int) -> list[tuple[int, int]]:
    """First rows of what should stay together in print, and of what follows: tables, rows of charts."""
    rows_of_charts = math.ceil(len(book.figures.inputs) / len(_ACROSS))
    starts = [charts, *[charts + 1 + k * _CHART_ROWS for k in range(1, rows_of_charts + 1)]]
    return [(0, drawn), (drawn, charts), *pairwise(starts)]


def _write_asked(book: Book, page: Page, row: int) -> int:
    page.heading(row, "As asked", _LAST)
    page.header(row + 1, _ASKED, numbers_from=5)
    for column, title in enumerate(_ASKED[7:], start=7):
        page.text(row + 1, column, title, "header" if column > 8 else "header_in")
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
        page.paragraph(row, record.note, 8, first=7, kind="wrapped_in")
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
    page.number(row, 2, record.mean, item.scale.mean_code)
    page.number(row, 4, record.sd, finer_code(spread, record.sd))
    found = item.summary
    sd = found.moments.sd if found else None
    page.number(row, 3, found.moments.mean if found else None, item.scale.mean_code)
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
    page.heading(
        table,
        "What the charts are drawn from (not printed; open bins of long tails have no density)",
        _LAST,
    )
    page.header(table + 1, ("Input", "Value", "Density or share", "Share at base"), numbers_from=1)
    place = table + 2
    for k, item in enumerate(drawn):
        place, chart = _write_picture(book, page, place, item)
        page.chart(
            row + k // len(_ACROSS) * _CHART_ROWS,
            _ACROSS[k % len(_ACROSS)][0],
            chart,
            f"Density of the draws of {item.title}; the base value is a dashed upright line.",
            x_offset=_ACROSS[k % len(_ACROSS)][1],
        )


def _write_picture(book: Book, page: Page, row: int, item: InputFigures) -> tuple[int, Chart]:
    """Write what an input's chart is drawn from; the next free row and the chart are given back."""
    if item.summary is None:
        raise AssertionError("an input without draws has no picture")
    bins = item.summary.histogram
    draw = _write_values if bins.separate else _write_density
    row, chart = draw(book, page, row, item, bins)
    chart.set_size(_CHART_SIZE)
    return row, chart


def _write_density(
    book: Book, page: Page, row: int, item: InputFigures, bins: Histogram
) -> tuple[int, Chart]:
    """The outline of a density, the base value as an upright line."""
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
    x_axis = {"name": f"Value{item.scale.title}", "num_format": item.scale.axis_code}
    chart = curve_chart(
        book.workbook,
        _title(item),
        lines,
        {**x_axis, "label_position": "low", **round_bounds(low, high)},
        {"name": f"Density of draws{_per(item)}", "num_format": "General", "min": 0},
    )
    return row, chart


def _per(item: InputFigures) -> str:
    """The unit of a density; none for shares and dates, whose unit is that of their format."""
    unit = one_line(item.scale.unit, 16)
    return f", per {unit}" if unit and unit != "%" and not item.scale.is_date else ""


def _write_values(
    book: Book, page: Page, row: int, item: InputFigures, bins: Histogram
) -> tuple[int, Chart]:
    """A column for each of a few values, that of the base value hatched."""
    marked = bins.bin_of(item.record.base) if item.record.base is not None else None
    total = int(bins.counts.sum())
    for k, value in enumerate(bins.lower.tolist()):
        share = int(bins.counts[k]) / total
        page.text(row + k, 0, f"{item.title}: draws")
        page.text(row + k, 1, item.scale.bare_text(value), "number")
        page.share(row + k, 2, share)
        if k == marked:
            page.share(row + k, 3, share)
    last = row + len(bins.counts) - 1
    columns: list[tuple[str, Span]] = [("Share of draws", (NAME, row, 2, last, 2))]
    if marked is not None:
        columns.append(("Base value", (NAME, row, 3, last, 3)))
    x_axis = {"name": f"Value{item.scale.title}"}
    labels = (NAME, row, 1, last, 1)
    chart = bin_chart(
        book.workbook,
        _title(item),
        labels,
        columns,
        None,
        x_axis,
        highest=bins.highest_share,
        upright=fit_side_by_side(map(item.scale.bare_text, bins.lower.tolist()), _LETTERS_ACROSS),
    )
    return last + 1, chart


def _title(item: InputFigures) -> str:
    return f"Input: {one_line(item.title, 45)}"


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
    """The outline of a histogram in steps of its density.

    Open bins of long tails have no width and so no density; they are left out.

    Args:
        bins: A histogram of bins.

    Returns:
        Places and heights, from the axis up and back to it.
    """
    total = float(bins.counts.sum())
    points: list[tuple[float, float]] = []
    edges = zip(bins.lower.tolist(), bins.upper.tolist(), bins.counts.tolist(), strict=True)
    for lower, upper, count in edges:
        if math.isfinite(lower) and math.isfinite(upper):
            density = count / total / (upper - lower)
            points += [(lower, density), (upper, density)]
    return [(points[0][0], 0.0), *points, (points[-1][0], 0.0)]
