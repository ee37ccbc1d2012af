"""A model check as a workbook of its own."""

from __future__ import annotations

from pathlib import Path
from typing import BinaryIO

from cellsim.report.page import Page
from cellsim.report.plain_text import one_line
from cellsim.report.sheets.model_check import NAME, WIDTHS, write_check
from cellsim.report.styles import Styles
from cellsim.report.whole_file import new_workbook, write_whole
from cellsim.results import ModelCheck
from cellsim.version import VERSION

_MOST = 200_000


def write_check_workbook(
    check: ModelCheck, model: str, against: str, path: Path, *, overwrite: bool = False
) -> None:
    """Write a model check, whole or not at all.

    Args:
        check: The model check.
        model: The model's file name.
        against: The name of the file whose stored values were compared with.
        path: The new .xlsx file.
        overwrite: Whether an existing file is replaced.

    Raises:
        RunError: The file exists already, or it cannot be written.
    """

    def write(stream: BinaryIO, folder: str) -> None:
        workbook = new_workbook(stream, folder)
        workbook.set_properties(
            {"title": f"Model check: {one_line(model, 100)}", "author": f"cellsim {VERSION}"}
        )
        page = Page(workbook.add_worksheet(NAME), Styles(workbook), WIDTHS, landscape=True)
        lead = (
            f"Every formula of {one_line(model, 100)} was recalculated from its constants and compared with the value "
            f"stored in {one_line(against, 100)}."
        )
        write_check(page, check, lead, most=_MOST)
        workbook.close()

    write_whole(path, write, overwrite=overwrite)
