"""Histogram, cumulative line and moments of every output."""

from __future__ import annotations

import math

import numpy as np

from cellsim.analysis.histogram import Histogram
from cellsim.analysis.summarize import Summary
from cellsim.report.book import Book
from cellsim.report.figures import OutputFigures
from cellsim.report.number_formats import finer_code
from cellsim.report.output_charts import histogram_alt_text, histogram_chart
from cellsim.report.page import Page
from cellsim.report.places import DISTRIBUTION, Block, base_bin, distribution_blocks
from cellsim.report.scale import Scale
from cellsim.report.wording import precision_note

NAME = DISTRIBUTION
_WIDTHS = (25, 13, 13, 10, 10, 11, 11, 3, 30, 17, 17, 17)
_LAST = len(_WIDTHS) - 1
_SIDE = 8
_CHART_ROW = 12


def is_needed(book: Book) -> bool:
    """Always."""
    return bool(book.figures.outputs)


def write(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(NAME, _WIDTHS, landscape=True)
    lead = (
        "How the draws of each output spread. A bin is named by its lower edge, which belongs to it; its upper edge does not. Where a tail is "
        "long, what lies beyond the last edges is counted in one open bin. Failed draws are left out. "
        + precision_note(book.results.record.sampling)
    )
    page.title("Distribution", lead, _LAST)
    page.worksheet.freeze_panes(4, 0)
    page.worksheet.repeat_rows(0)
    blocks = distribution_blocks(book.figures)
    for output, block in zip(book.figures.outputs, blocks, strict=True):
        _write_block(book, page, output, block)
    page.worksheet.set_h_pagebreaks([block.top for block in blocks[1:]])


def _write_block(book: Book, page: Page, output: OutputFigures, block: Block) -> None:
    unit = f" ({output.scale.unit})" if output.scale.unit else ""
    page.heading(block.top, f"{output.title}{unit} — {output.record.place}", _LAST)
    if output.summary is None:
        page.text(block.first, 0, "No draw gave a number.", "plain")
        return
    _write_bins(page, output, output.summary.histogram, block)
    _write_moments(page, output, output.summary, block)
    chart = histogram_chart(book.workbook, output, block)
    chart.set_size({"width": 580, "height": 380})
    page.chart(block.first + _CHART_ROW, _SIDE, chart, histogram_alt_text(output))


def _write_bins(page: Page, output: OutputFigures, bins: Histogram, block: Block) -> None:
    titles = (
        "Value" if bins.separate else "Bin, by lower edge",
        "From",
        "To below",
        "Draws",
        "Share",
        "Cumulative share",
        "Bin with base case",
    )
    page.header(block.first - 1, titles)
    total = int(bins.counts.sum())
    running = np.cumsum(bins.counts).tolist()
    marked = base_bin(output)
    edges = zip(bins.lower.tolist(), bins.upper.tolist(), strict=True)
    code = bin_code(bins, output.scale)
    for k, (lower, upper) in enumerate(edges):
        row = block.first + k
        page.text(row, 0, bin_label(lower, upper, Scale(code, code, code, "")))
        page.number(row, 1, lower, code)
        page.number(row, 2, upper, code)
        page.count(row, 3, int(bins.counts[k]))
        share = int(bins.counts[k]) / total
        page.share(row, 4, share)
        page.share(row, 5, running[k] / total)
        if k == marked:
            page.share(row, 6, share)


def bin_code(bins: Histogram, scale: Scale) -> str:
    """The number format with decimals enough to tell the edges apart."""
    finite = bins.lower[np.isfinite(bins.lower)]
    if scale.is_date or bins.separate or len(finite) < 2:
        return scale.code
    step = float(np.diff(finite).min())
    short = float(f"{step:.2g}")
    return finer_code(scale.code, short * 10 if float(f"{step:.1g}") == short else short)


def bin_label(lower: float, upper: float, scale: Scale) -> str:
    """A bin's label under the chart: its lower edge or its value; open bins by their only edge."""
    if math.isinf(lower):
        return f"< {scale.text(upper)}"
    if math.isinf(upper):
        return f"≥ {scale.text(lower)}"
    return scale.text(lower)


def _write_moments(page: Page, output: OutputFigures, summary: Summary, block: Block) -> None:
    page.header(block.first - 1, ("Figure", "Value", "Standard error", ""), first=_SIDE)
    found, code, spread = summary.moments, output.scale.code, output.scale.spread_code
    row = block.first
    page.text(row, _SIDE, "Base case")
    page.scalar(row, _SIDE + 1, output.record.base, code)
    page.text(row + 1, _SIDE, "Mean")
    page.number(row + 1, _SIDE + 1, found.mean, output.scale.mean_code)
    page.number(row + 1, _SIDE + 2, found.mean_se, finer_code(spread, found.mean_se or 0.0))
    page.text(row + 2, _SIDE, "Standard deviation")
    page.number(row + 2, _SIDE + 1, found.sd, finer_code(spread, found.sd or 0.0))
    page.number(row + 2, _SIDE + 2, found.sd_se, finer_code(spread, found.sd_se or 0.0))
    plain = (
        ("Median", float(summary.quantiles.values[52]), code),
        ("Smallest", found.minimum, code),
        ("Largest", found.maximum, code),
        ("Skewness", found.skewness, "0.00"),
        ("Excess kurtosis", found.excess_kurtosis, "0.00"),
    )
    for k, (name, value, shown) in enumerate(plain, start=3):
        page.text(row + k, _SIDE, name)
        page.number(row + k, _SIDE + 1, value, shown)
    row += 3 + len(plain)
    page.text(row, _SIDE, "Draws with a number")
    page.count(row, _SIDE + 1, found.count)
    page.text(row + 1, _SIDE, "Failed draws")
    page.count(row + 1, _SIDE + 1, summary.failed)
    page.text(row + 2, _SIDE, "Draws below the base case")
    page.share(row + 2, _SIDE + 1, output.at_base.below.share if output.at_base else None)
