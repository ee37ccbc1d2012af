"""Every draw, one row each, written in slices so that memory stays small."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from xlsxwriter.worksheet import Worksheet

from cellsim.report.book import Book
from cellsim.report.figures import InputFigures, OutputFigures
from cellsim.report.page import NO_NUMBER
from cellsim.report.places import DRAWS, HEADLINE
from cellsim.report.plain_text import one_line, storable
from cellsim.results import FloatArray
from cellsim.values import decode_error

NAME = DRAWS
_LAST_ROW = 1_048_576
_LAST_COLUMN = 16_384
_SLICE = 20_000
_HEAD = 4
_HEADER_HEIGHT = 58


def is_needed(book: Book) -> bool:
    """When there are draws; the caller asks for the sheet."""
    return book.results.record.draws > 0


def write(book: Book) -> None:
    """Write the sheet, or several where the draws are more than the rows of one."""
    room = _LAST_ROW - _HEAD - 1
    draws = book.results.output_draws.shape[1]
    # XlsxWriter takes the mode of a sheet from its workbook at the time the sheet is added: only this
    # one goes to disk row by row, so that charts on the others keep their cached values.
    book.workbook.constant_memory = True
    try:
        for part, start in enumerate(range(0, draws, room)):
            name = NAME if part == 0 else f"{NAME} {part + 1}"
            _write_part(book, name, start, min(start + room, draws))
    finally:
        book.workbook.constant_memory = False


def _write_part(book: Book, name: str, start: int, stop: int) -> None:
    figures: list[OutputFigures | InputFigures] = [*book.figures.outputs, *book.figures.inputs]
    figures = figures[: _LAST_COLUMN - 1]
    page = book.add_page(name, (), landscape=True, way_back=False)  # rows must come in order
    page.worksheet.set_column(0, 0, 10, book.styles.get("plain", "0"))
    for k, item in enumerate(figures, start=1):
        page.worksheet.set_column(k, k, 16, book.styles.get("plain", item.scale.code))
    page.text(0, 0, "Draws", "title")
    lead = "One row a draw: outputs first, then inputs. A failed output shows its error as text."
    left = len(book.figures.outputs) + len(book.figures.inputs) - len(figures)
    if left:
        lead += f" The last {left:,} inputs have no column: a sheet has no more."
    page.text(1, 0, lead, "plain")
    page.link(2, 0, HEADLINE, "Back to Headline")
    page.worksheet.set_row(_HEAD, _HEADER_HEIGHT)
    page.text(_HEAD, 0, "Draw", "header")
    for k, item in enumerate(figures, start=1):
        kind = "output" if k <= len(book.figures.outputs) else "input"
        page.text(_HEAD, k, f"{one_line(item.title, 40)}\n({kind})", "header_right")
    page.repeat(_HEAD, _HEAD)
    arrays = [*book.results.output_draws, *book.results.input_draws][: len(figures)]
    for first in range(start, stop, _SLICE):
        last = min(first + _SLICE, stop)
        block = np.column_stack([array[first:last] for array in arrays])
        _write_slice(page.worksheet, _HEAD + 1 + first - start, first + 1, block)


def _write_slice(worksheet: Worksheet, row: int, number: int, block: FloatArray) -> None:
    write_number = worksheet.write_number
    sound = np.logical_and.reduce(np.isfinite(block), axis=1).tolist()
    for k, values in enumerate(block.tolist()):
        write_number(row + k, 0, number + k)
        if sound[k]:
            for column, value in enumerate(values, start=1):
                write_number(row + k, column, value)
        else:
            _write_unsound(worksheet, row + k, values, block[k])


def _write_unsound(
    worksheet: Worksheet, row: int, values: Sequence[float], raw: FloatArray
) -> None:
    for column, value in enumerate(values, start=1):
        if math.isfinite(value):
            worksheet.write_number(row, column, value)
        elif math.isnan(value):
            worksheet.write_string(row, column, storable(str(decode_error(float(raw[column - 1])))))
        else:
            worksheet.write_string(row, column, NO_NUMBER)
