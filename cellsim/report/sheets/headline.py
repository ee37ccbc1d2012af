"""The sheet Headline: one page for someone who has never heard of this program."""

from __future__ import annotations

from cellsim.report.book import Book
from cellsim.report.charts import Line, curve_chart
from cellsim.report.figures import central_range
from cellsim.report.number_formats import PERCENT
from cellsim.report.page import Page
from cellsim.report.palette import BASE_LINE, CURVE
from cellsim.report.places import HEADLINE, QUANTILES, quantile_blocks
from cellsim.report.sheets.distribution import histogram_chart
from cellsim.report.wording import CAUTION, output_sentence, question, warnings

_TITLES = ("Output", "Base case", "Mean", "10 %", "Median", "90 %", "Draws below base case")
_LAST = len(_TITLES) - 1
_SENTENCES = 6
_CHART_ROWS = 18


def write_headline(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(HEADLINE, (30, 14, 14, 14, 14, 14, 14))
    page.worksheet.fit_to_pages(1, 1)
    row = page.title("What the draws say", question(book), _LAST)
    page.paragraph(2, CAUTION, _LAST, kind="caution")
    for output in book.figures.outputs[:_SENTENCES]:
        page.paragraph(row, output_sentence(output), _LAST)
        row += 1
    row = _table(book, page, row + 1)
    row = _thresholds(book, page, row)
    notes = list(warnings(book))
    page.heading(row, "What to be careful of", _LAST)
    for note in notes or ["Nothing out of the ordinary was found."]:
        row += 1
        page.paragraph(row, note, _LAST)
    row += 2
    if book.figures.outputs[0].summary is not None:
        _charts(book, page, row)
        row += 2 * _CHART_ROWS + 1
    for k, name in enumerate(book.sheet_names[1:]):
        page.link(row + k // 4, k % 4, name, f"To {name}")


def _table(book: Book, page: Page, row: int) -> int:
    page.header(row, _TITLES)
    for output in book.figures.outputs:
        row += 1
        unit = f" ({output.scale.unit})" if output.scale.unit else ""
        page.text(row, 0, output.title + unit, "strong")
        page.fit_row(row, [(output.title + unit, page.widths[0])])
        page.scalar(row, 1, output.record.base, output.scale.code)
        if output.summary is None:
            continue
        low, middle, high = central_range(output.summary)
        for column, value in enumerate((output.summary.moments.mean, low, middle, high), start=2):
            page.number(row, column, value, output.scale.code)
        page.share(row, 6, output.at_base.below.share if output.at_base is not None else None)
    return row + 2


def _thresholds(book: Book, page: Page, row: int) -> int:
    pairs = [
        (output, threshold, found)
        for output in book.figures.outputs
        for threshold, found in zip(output.record.thresholds, output.thresholds, strict=True)
    ]
    if not pairs:
        return row
    page.header(
        row,
        ("Threshold", "Asked as", "Value", "Share above", "95 % from", "95 % to", "Share below"),
    )
    for output, threshold, found in pairs:
        row += 1
        page.text(row, 0, output.title, "strong")
        page.text(row, 1, threshold.text, "number")
        page.number(row, 2, threshold.value, output.scale.code)
        if found is not None:
            shares = (found.above.share, found.above.lower, found.above.upper, found.below.share)
            for column, share in enumerate(shares, start=3):
                page.share(row, column, share, PERCENT)
    return row + 2


def _charts(book: Book, page: Page, row: int) -> None:
    output = book.figures.outputs[0]
    block = quantile_blocks(book.figures)[0]
    span = (QUANTILES, block.first, 1, block.last, 1)
    lines = [
        Line("Share of draws at or below", span, (QUANTILES, block.first, 0, block.last, 0), CURVE)
    ]
    if output.base is not None:
        page.worksheet.write_row(row, 9, (output.base, 0))
        page.worksheet.write_row(row + 1, 9, (output.base, 1))
        page.worksheet.set_column(9, 10, None, None, {"hidden": True})
        lines.append(
            Line(
                "Base case",
                (HEADLINE, row, 9, row + 1, 9),
                (HEADLINE, row, 10, row + 1, 10),
                BASE_LINE,
            )
        )
    chart = curve_chart(
        book.workbook,
        f"{output.title}: cumulative share of draws",
        lines,
        {"name": f"{output.title}{output.scale.title}", "num_format": output.scale.code},
        {"name": "Share of draws", "num_format": "0%", "min": 0, "max": 1},
    )
    chart.show_hidden_data()
    chart.set_size({"width": 800, "height": 310})
    page.chart(row, 0, chart, f"Cumulative share of draws of {output.title}")
    bars = histogram_chart(book, 0)
    if bars is not None:
        bars.set_size({"width": 800, "height": 310})
        page.chart(row + _CHART_ROWS, 0, bars, f"Histogram of {output.title}")
