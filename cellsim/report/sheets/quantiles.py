"""Quantiles of every output with confidence intervals, and a live look-up beside them."""

from __future__ import annotations

import numpy as np
from xlsxwriter.utility import xl_range_abs, xl_rowcol_to_cell

from cellsim.analysis.summarize import Summary
from cellsim.report.book import Book
from cellsim.report.figures import OutputFigures
from cellsim.report.output_charts import (
    MARKS_COLUMN,
    MARKS_ROW,
    cumulative_alt_text,
    cumulative_chart,
    mark_values,
)
from cellsim.report.page import Page
from cellsim.report.places import QUANTILES, Block, quantile_blocks
from cellsim.report.wording import precision_note

NAME = QUANTILES
_WIDTHS = (13, 17, 17, 17, 3, 27, 15, 15, 13, 13)
_LAST = len(_WIDTHS) - 1
_ASK = 0.25
_CODES = {0.0: '0%;;"smallest"', 1.0: '"largest"'}


def is_needed(book: Book) -> bool:
    """Always."""
    return bool(book.figures.outputs)


def write(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(NAME, _WIDTHS)
    lead = (
        "The value that a share of the draws does not exceed, with the 95 % confidence interval between two of the draws "
        "(order statistics; no distribution is assumed). A dash: too few draws to bound the quantile on that side. Values "
        "between two draws are interpolated linearly. "
        + precision_note(book.results.record.sampling)
    )
    row = page.title("Quantiles", lead, _LAST)
    page.header(row, ("Share of draws", "Value", "95 % from", "95 % to"), numbers_from=0)
    page.header(row, ("Look up", "", "", "", ""), first=MARKS_COLUMN)
    page.repeat(row, row)
    blocks = quantile_blocks(book.figures)
    for output, block in zip(book.figures.outputs, blocks, strict=True):
        _write_block(book, page, output, block)
    page.worksheet.set_h_pagebreaks([block.top for block in blocks[1:]])


def _write_block(book: Book, page: Page, output: OutputFigures, block: Block) -> None:
    unit = f" ({output.scale.unit})" if output.scale.unit else ""
    page.heading(block.top, f"{output.title}{unit} — {output.record.place}", _LAST)
    if output.summary is None:
        page.text(block.first, 0, "No draw gave a number.", "plain")
        return
    _write_table(page, output, output.summary, block)
    _write_look_up(page, output, output.summary, block)
    _write_marks(page, output, block)
    chart = cumulative_chart(book.workbook, output, block)
    chart.set_size({"width": 585, "height": 380})
    page.chart(block.top + MARKS_ROW + 6, MARKS_COLUMN, chart, cumulative_alt_text(output))


def _write_table(page: Page, output: OutputFigures, summary: Summary, block: Block) -> None:
    found = summary.quantiles
    code = output.scale.code
    rows = zip(
        found.probabilities.tolist(),
        found.values.tolist(),
        found.lower.tolist(),
        found.upper.tolist(),
        strict=True,
    )
    for k, (probability, value, lower, upper) in enumerate(rows):
        row = block.first + k
        page.share(row, 0, probability, _CODES.get(probability, "0.0%"))
        page.number(row, 1, value, code)
        page.number(row, 2, lower, code)
        page.number(row, 3, upper, code)


def _write_look_up(page: Page, output: OutputFigures, summary: Summary, block: Block) -> None:
    """Two questions with live answers, interpolated in the table beside them."""
    values = xl_range_abs(block.first, 1, block.last, 1)
    shares = xl_range_abs(block.first, 0, block.last, 0)
    row, column = block.first, MARKS_COLUMN
    asked = next(
        (value for _, value in reversed(mark_values(output))), float(summary.quantiles.values[52])
    )
    cell = xl_rowcol_to_cell(row, column + 1)
    page.text(row, column, "Type a value:")
    page.number(row, column + 1, asked, output.scale.code, "ask")
    page.text(row + 1, column, "Share of draws at or below it")
    share = _share_at(summary, asked)
    page.formula(
        row + 1, column + 1, _interpolation(cell, values, shares, ("0", "1")), share, "0.0%"
    )
    page.text(row + 2, column, "Share of draws above it")
    page.formula(
        row + 2, column + 1, f"=1-{xl_rowcol_to_cell(row + 1, column + 1)}", 1 - share, "0.0%"
    )
    cell = xl_rowcol_to_cell(row + 4, column + 1)
    page.text(row + 4, column, "Type a share of draws:")
    page.number(row + 4, column + 1, _ASK, "0.0%", "ask")
    page.worksheet.data_validation(
        row + 4,
        column + 1,
        row + 4,
        column + 1,
        {
            "validate": "decimal",
            "criteria": "between",
            "minimum": 0,
            "maximum": 1,
            "error_title": "Share of draws",
            "error_message": "Type a share from 0 % to 100 %.",
        },
    )
    page.text(row + 5, column, "Value that it does not exceed")
    ends = (f"INDEX({values},1)", f"INDEX({values},ROWS({values}))")
    value = float(np.interp(_ASK, summary.quantiles.probabilities, summary.quantiles.values))
    page.formula(
        row + 5, column + 1, _interpolation(cell, shares, values, ends), value, output.scale.code
    )


def _interpolation(cell: str, known: str, wanted: str, ends: tuple[str, str]) -> str:
    """A formula that interpolates in a table; beyond its ends it gives the ends."""
    place = f"MATCH({cell},{known},1)"
    x0, x1 = f"INDEX({known},{place})", f"INDEX({known},{place}+1)"
    y0, y1 = f"INDEX({wanted},{place})", f"INDEX({wanted},{place}+1)"
    first, last = f"INDEX({known},1)", f"INDEX({known},ROWS({known}))"
    inside = f"{y0}+({cell}-{x0})/({x1}-{x0})*({y1}-{y0})"
    return f"=IF({cell}<{first},{ends[0]},IF({cell}>={last},{ends[1]},{inside}))"


def _share_at(summary: Summary, value: float) -> float:
    """What the look-up formula gives."""
    known, shares = summary.quantiles.values, summary.quantiles.probabilities
    if value < known[0]:
        return 0.0
    if value >= known[-1]:
        return 1.0
    k = int(np.searchsorted(known, value, side="right")) - 1
    return float(
        shares[k] + (value - known[k]) / (known[k + 1] - known[k]) * (shares[k + 1] - shares[k])
    )


def _write_marks(page: Page, output: OutputFigures, block: Block) -> None:
    """The ends of the upright lines in the chart."""
    row = block.top + MARKS_ROW
    marks = mark_values(output)
    if marks:
        for k, title in enumerate(
            ("Lines in the chart", "Value from", "Value to", "Share from", "Share to")
        ):
            page.text(row - 1, MARKS_COLUMN + k, title, "strong_right" if k else "strong")
    for k, (name, value) in enumerate(marks):
        page.text(row + k, MARKS_COLUMN, name)
        page.number(row + k, MARKS_COLUMN + 1, value, output.scale.code)
        page.number(row + k, MARKS_COLUMN + 2, value, output.scale.code)
        page.share(row + k, MARKS_COLUMN + 3, 0.0, "0%")
        page.share(row + k, MARKS_COLUMN + 4, 1.0, "0%")
