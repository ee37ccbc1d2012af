"""Writing the results workbook."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

from xlsxwriter import Workbook

from cellsim.report.book import Book
from cellsim.report.figures import work_out
from cellsim.report.plain_text import one_line
from cellsim.report.sheets import (
    dependence,
    distribution,
    draws,
    failed_draws,
    headline,
    inputs,
    model_check,
    quantiles,
    run_record,
)
from cellsim.report.styles import Styles
from cellsim.report.whole_file import new_workbook, write_whole
from cellsim.report.wording import CAUTION
from cellsim.results import RunResults


@dataclass(frozen=True, slots=True)
class _Sheet:
    """A sheet of the workbook: its name, when it is there, how it is written."""

    name: str
    is_needed: Callable[[Book], bool]
    write: Callable[[Book], None]


_SHEETS = tuple(
    _Sheet(module.NAME, module.is_needed, module.write)
    for module in (
        headline,
        quantiles,
        distribution,
        inputs,
        dependence,
        failed_draws,
        model_check,
        run_record,
    )
)
_DRAWS = _Sheet(draws.NAME, draws.is_needed, draws.write)


def write_report(
    results: RunResults, path: Path, *, overwrite: bool = False, draws_sheet: bool = False
) -> None:
    """Write the results workbook, whole or not at all.

    It is written to a temporary file in the same folder, flushed to disk and renamed.

    Args:
        results: The run.
        path: The new .xlsx file.
        overwrite: Whether an existing file is replaced.
        draws_sheet: Whether every draw is written too.

    Raises:
        RunError: The file exists already, or it cannot be written.
    """
    write_whole(
        path,
        lambda stream, folder: _write_book(results, stream, folder, draws_sheet=draws_sheet),
        overwrite=overwrite,
    )


def _write_book(results: RunResults, stream: BinaryIO, folder: str, *, draws_sheet: bool) -> None:
    workbook = new_workbook(stream, folder)
    _describe(workbook, results)
    figures = work_out(results)
    asking = Book(workbook, Styles(workbook), results, figures, ())
    sheets = [
        sheet for sheet in (*_SHEETS, *([_DRAWS] if draws_sheet else [])) if sheet.is_needed(asking)
    ]
    book = Book(workbook, asking.styles, results, figures, tuple(sheet.name for sheet in sheets))
    for sheet in sheets:
        sheet.write(book)
    workbook.worksheets()[0].activate()
    workbook.close()


def _describe(workbook: Workbook, results: RunResults) -> None:
    record = results.record
    version = one_line(record.versions.get("cellsim", ""), 20)
    workbook.set_properties(
        {
            "title": f"Results: {one_line(record.model, 100)}",
            "subject": f"{record.draws:,} draws of {one_line(record.sidecar, 100)}",
            "author": f"cellsim {version}".strip(),
            "comments": CAUTION,
            "created": record.started,
        }
    )
