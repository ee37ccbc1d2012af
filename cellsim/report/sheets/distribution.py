"""The sheet Distribution: a histogram of each output with its cumulative line, and its moments."""

from __future__ import annotations

import math

from xlsxwriter.chart import Chart

from cellsim.analysis.histogram import Histogram
from cellsim.report.book import Book
from cellsim.report.charts import bin_chart
from cellsim.report.figures import OutputFigures
from cellsim.report.page import Page
from cellsim.report.places import DISTRIBUTION, Block, base_bin, distribution_blocks
from cellsim.report.scale import Scale

_TITLES = ("Values", "Draws", "Share", "Share in the base case's bin", "Cumulative share")


def write_distribution(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(DISTRIBUTION, (26, 11, 11, 13, 12, 3, 30, 18), landscape=True)
    page.title(
        "Distribution",
        "How the draws of each output spread. The bin that holds the base case is hatched. Bins that take a long tail "
        "are marked with 'below' or 'above'.",
        7,
    )
    for number, (output, block) in enumerate(
        zip(book.figures.outputs, distribution_blocks(book.figures), strict=True)
    ):
        page.heading(block.top, f"{output.title}{output.scale.title}", 7)
        if output.summary is None:
            page.text(block.first, 0, "Every draw failed.")
            continue
        _bins(page, output, output.summary.histogram, block)
        _moments(page, output, block)
        chart = histogram_chart(book, number)
        if chart is not None:
            chart.set_size({"width": 560, "height": 360})
            page.chart(
                block.first + 14, 6, chart, f"Histogram of {output.title} with its cumulative share"
            )


def _bins(page: Page, output: OutputFigures, found: Histogram, block: Block) -> None:
    page.header(block.top + 2, _TITLES)
    total = int(found.counts.sum())
    own = base_bin(output)
    done = 0
    for k, count in enumerate(found.counts):
        row = block.first + k
        done += int(count)
        page.text(row, 0, bin_label(output.scale, float(found.lower[k]), float(found.upper[k])))
        page.count(row, 1, int(count))
        page.share(row, 2, 0.0 if k == own else count / total)
        page.share(row, 3, count / total if k == own else 0.0)
        page.share(row, 4, done / total)


def bin_label(scale: Scale, lower: float, upper: float) -> str:
    """What a bin is called."""
    if lower == upper:
        return scale.bare_text(lower)
    if math.isinf(lower):
        return f"below {scale.bare_text(upper)}"
    if math.isinf(upper):
        return f"above {scale.bare_text(lower)}"
    return f"{scale.bare_text(lower)} to {scale.bare_text(upper)}"


def _moments(page: Page, output: OutputFigures, block: Block) -> None:
    if output.summary is None:
        return
    m, scale = output.summary.moments, output.scale
    rows = (
        ("Draws", float(m.count), "#,##0"),
        ("Failed draws", float(output.summary.failed), "#,##0"),
        ("Mean", m.mean, scale.code),
        ("Standard error of the mean", m.mean_se, scale.spread_code),
        ("Standard deviation", m.sd, scale.spread_code),
        ("Standard error of that", m.sd_se, scale.spread_code),
        ("Skewness", m.skewness, "0.00"),
        ("Excess kurtosis", m.excess_kurtosis, "0.00"),
        ("Smallest", m.minimum, scale.code),
        ("Largest", m.maximum, scale.code),
    )
    page.header(block.top + 2, ("Figure", "Value"), first=6)
    for k, (title, value, code) in enumerate(rows):
        page.text(block.first + k, 6, title)
        page.number(block.first + k, 7, value, code)
    page.text(block.first + len(rows), 6, "Base case")
    page.scalar(block.first + len(rows), 7, output.record.base, scale.code)


def histogram_chart(book: Book, number: int) -> Chart | None:
    """The chart of an output's histogram; None if all its draws failed."""
    output = book.figures.outputs[number]
    block = distribution_blocks(book.figures)[number]
    if output.summary is None:
        return None

    def span(column: int) -> tuple[str, int, int, int, int]:
        return DISTRIBUTION, block.first, column, block.last, column

    return bin_chart(
        book.workbook,
        f"{output.title}: share of draws by value",
        span(0),
        (("Share of draws", span(2)), ("The base case's bin", span(3))),
        span(4),
        {"name": f"{output.title}{output.scale.title}"},
    )
