"""The sheet Inputs: what was put in, asked and as drawn."""

from __future__ import annotations

from cellsim.report.book import Book
from cellsim.report.charts import bin_chart
from cellsim.report.figures import InputFigures
from cellsim.report.page import Page
from cellsim.report.places import INPUTS
from cellsim.report.sheets.distribution import bin_label

_ROWS = 22
_TOP = 4


def write_inputs(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(INPUTS, (26, 16, 16, 3, 24, 11, 11))
    page.title("Inputs", "Each uncertain input: what was asked of it and what was drawn.", 6)
    for number, found in enumerate(book.figures.inputs):
        bins = len(found.summary.histogram.counts) if found.summary is not None else 0
        top = _TOP + sum(
            max(_ROWS + 16, 3 + (len(f.summary.histogram.counts) if f.summary else 0)) + 2
            for f in book.figures.inputs[:number]
        )
        _input(book, page, found, top, bins)


def _input(book: Book, page: Page, found: InputFigures, top: int, bins: int) -> None:
    record, scale, summary = found.record, found.scale, found.summary
    page.heading(top, f"{found.title}{scale.title}", 6)
    row = top + 1
    for title, text in (
        ("Name", record.name),
        ("Cell", record.place),
        ("Distribution", record.distribution),
        ("Why", record.note),
        ("Source", record.source),
    ):
        if text:
            page.text(row, 0, title)
            page.worksheet.merge_range(row, 1, row, 2, "", book.styles.get("wrapped"))
            page.text(row, 1, text, "wrapped")
            page.fit_row(row, [(text, page.widths[1] + page.widths[2])])
            row += 1
    page.header(row, ("", "Asked", "Drawn"))
    moments = summary.moments if summary is not None else None
    page.text(row + 1, 0, "Mean")
    page.number(row + 1, 1, record.mean, scale.code)
    page.number(row + 1, 2, moments.mean if moments else None, scale.code)
    page.text(row + 2, 0, "Standard deviation")
    page.number(row + 2, 1, record.sd, scale.spread_code)
    page.number(row + 2, 2, moments.sd if moments else None, scale.spread_code)
    page.text(row + 3, 0, "Lowest")
    page.number(row + 3, 1, record.lower, scale.code)
    page.number(row + 3, 2, moments.minimum if moments else None, scale.code)
    page.text(row + 4, 0, "Highest")
    page.number(row + 4, 1, record.upper, scale.code)
    page.number(row + 4, 2, moments.maximum if moments else None, scale.code)
    page.text(row + 5, 0, "Base value, and its percentile")
    page.number(row + 5, 1, record.base, scale.code)
    page.share(row + 5, 2, record.base_percentile)
    if summary is not None:
        for k, place in enumerate((7, 12, 27, 52, 77, 92, 97)):
            share, value = summary.quantiles.probabilities[place], summary.quantiles.values[place]
            page.text(row + 6 + k, 0, f"{share:.0%} of the draws lie below")
            page.number(row + 6 + k, 2, float(value), scale.code)
        _bins(book, page, found, top, bins)


def _bins(book: Book, page: Page, found: InputFigures, top: int, bins: int) -> None:
    if found.summary is None:
        return
    counts = found.summary.histogram
    page.header(top + 1, ("Values", "Draws", "Share"), first=4)
    total = int(counts.counts.sum())
    for k, count in enumerate(counts.counts):
        label = bin_label(found.scale, float(counts.lower[k]), float(counts.upper[k]))
        page.text(top + 2 + k, 4, label)
        page.count(top + 2 + k, 5, int(count))
        page.share(top + 2 + k, 6, count / total)
    first, last = top + 2, top + 1 + bins
    chart = bin_chart(
        book.workbook,
        f"{found.title}: share of draws by value",
        (INPUTS, first, 4, last, 4),
        (("Share of draws", (INPUTS, first, 6, last, 6)),),
        None,
        {"name": f"{found.title}{found.scale.title}"},
    )
    chart.set_size({"width": 410, "height": 300})
    page.chart(top + 20, 0, chart, f"How the draws of {found.title} spread")
