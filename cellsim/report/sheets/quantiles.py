"""The sheet Quantiles: every percentile with its interval, and live look-up beside it."""

from __future__ import annotations

from xlsxwriter.utility import xl_range_abs, xl_rowcol_to_cell

from cellsim.report.book import Book
from cellsim.report.figures import OutputFigures
from cellsim.report.page import Page
from cellsim.report.places import QUANTILES, Block, quantile_blocks
from cellsim.report.wording import interval_note

_TITLES = ("Probability", "Value", "95 % from", "95 % to")
_ASK, _ANSWER = 6, 7
_FINE = "0.0%"


def write_quantiles(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(QUANTILES, (13, 16, 16, 16, 3, 30, 16, 16))
    page.title("Quantiles", interval_note(book), 7)
    for output, block in zip(book.figures.outputs, quantile_blocks(book.figures), strict=True):
        page.heading(block.top, f"{output.title}{output.scale.title}", 7)
        if output.summary is None:
            page.text(block.first, 0, "Every draw failed.")
            continue
        page.header(block.top + 1, _TITLES, numbers_from=0)
        table = output.summary.quantiles
        for k, probability in enumerate(table.probabilities):
            row = block.first + k
            page.number(row, 0, float(probability), _FINE)
            for column, values in enumerate((table.values, table.lower, table.upper), start=1):
                page.number(row, column, float(values[k]), output.scale.code)
        _look_up(page, output, block)


def _look_up(page: Page, output: OutputFigures, block: Block) -> None:
    """Type a value to read its probability, or a probability to read its value."""
    summary = output.summary
    if summary is None:
        return
    shares = xl_range_abs(block.first, 0, block.last, 0)
    values = xl_range_abs(block.first, 1, block.last, 1)
    row = block.first
    page.text(row, 5, "Type a value or a probability:", "strong")
    page.text(row, _ASK, "you type", "header_right")
    page.text(row, _ANSWER, "answer", "header_right")
    middle = float(summary.quantiles.values[len(summary.quantiles.values) // 2])
    page.text(row + 1, 5, "Share of draws at or below value")
    page.number(row + 1, _ASK, middle, output.scale.code, "ask")
    asked = xl_rowcol_to_cell(row + 1, _ASK)
    formula = _interpolation(asked, values, shares)
    page.formula(row + 1, _ANSWER, formula, 0.5, _FINE)
    page.text(row + 2, 5, "Value at probability")
    page.number(row + 2, _ASK, 0.5, _FINE, "ask")
    asked = xl_rowcol_to_cell(row + 2, _ASK)
    page.formula(row + 2, _ANSWER, _interpolation(asked, shares, values), middle, output.scale.code)


def _interpolation(asked: str, across: str, up: str) -> str:
    """Linear interpolation in a table of this sheet; held at the table's ends."""
    place = f"MIN(MATCH({asked},{across},1),ROWS({across})-1)"
    x1, x2 = f"INDEX({across},{place})", f"INDEX({across},{place}+1)"
    y1, y2 = f"INDEX({up},{place})", f"INDEX({up},{place}+1)"
    return (
        f"=IF({asked}<=MIN({across}),MIN({up}),IF({asked}>=MAX({across}),MAX({up}),"
        f"IF({x2}={x1},{y2},{y1}+({asked}-{x1})/({x2}-{x1})*({y2}-{y1}))))"
    )
