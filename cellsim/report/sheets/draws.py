"""The sheet Draws: inputs and outputs of every draw, up to the sheet's last row."""

from __future__ import annotations

import numpy as np

from cellsim.cells import LAST_ROW
from cellsim.report.book import Book
from cellsim.report.places import DRAWS

_HEAD = 4
_SLICE = 10_000


def write_draws(book: Book) -> None:
    """Write the sheet; failed outputs are left blank."""
    results = book.results
    names = [record.name for record in (*results.inputs, *results.outputs)]
    page = book.add_page(DRAWS, (10, *(16 for _ in names)))
    most = LAST_ROW - _HEAD - 1
    count = min(results.record.draws, most)
    note = "" if count == results.record.draws else f" Only the first {count:,} fit on the sheet."
    page.text(0, 0, "Draws", "title")
    page.text(1, 0, f"Every draw; outputs that failed are blank.{note}", "plain")
    page.header(_HEAD - 1, ("Draw", *names), numbers_from=0)
    page.repeat(_HEAD - 1, _HEAD - 1)
    table = np.concatenate([results.input_draws[:, :count], results.output_draws[:, :count]])
    for start in range(0, count, _SLICE):
        for k, values in enumerate(table[:, start : start + _SLICE].T.tolist()):
            row = _HEAD + start + k
            page.worksheet.write_number(row, 0, start + k + 1)
            for column, value in enumerate(values, start=1):
                if value == value:
                    page.worksheet.write_number(row, column, value)
