"""Writing the results workbook."""

from __future__ import annotations

import contextlib
import errno
import os
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from xlsxwriter import Workbook
from xlsxwriter.exceptions import XlsxWriterException

from cellsim.errors import Problem, RunError
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
from cellsim.report.styles import FONT, Styles
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
    try:
        if not overwrite:
            _refuse_existing(path)
        _write_whole(results, path, overwrite=overwrite, draws_sheet=draws_sheet)
    except FileExistsError as error:
        raise RunError(
            Problem(
                str(path), "exists already", "choose another name, or ask for it to be replaced"
            )
        ) from error
    except (OSError, XlsxWriterException) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise RunError(
            Problem(str(path), f"the results workbook cannot be written: {reason}")
        ) from error


def _write_whole(results: RunResults, path: Path, *, overwrite: bool, draws_sheet: bool) -> None:
    handle, name = tempfile.mkstemp(prefix=f".{path.stem[:40]}.", suffix=".part", dir=path.parent)
    temporary = Path(name)
    try:
        with (
            os.fdopen(handle, "wb") as stream,
            tempfile.TemporaryDirectory(prefix="cellsim-") as folder,
        ):
            _write_book(results, stream, folder, draws_sheet=draws_sheet)
            stream.flush()
            os.fsync(stream.fileno())
        temporary.chmod(0o666 & ~_umask())
        _put_in_place(temporary, path, overwrite=overwrite)
    except BaseException:
        with contextlib.suppress(FileNotFoundError):
            temporary.unlink()
        raise
    _sync_folder(path.parent)


def _put_in_place(temporary: Path, path: Path, *, overwrite: bool) -> None:
    """Give the finished file its name; without `overwrite` never that of a file made meanwhile."""
    if overwrite:
        temporary.replace(path)
        return
    try:
        path.hardlink_to(temporary)
    except FileExistsError:
        raise
    except (OSError, NotImplementedError):  # some file systems have no second names
        _refuse_existing(path)
        temporary.replace(path)
    else:
        temporary.unlink()


def _refuse_existing(path: Path) -> None:
    if path.exists():
        raise FileExistsError(errno.EEXIST, os.strerror(errno.EEXIST))


def _umask() -> int:
    """The process's mask for new files, which can only be read by setting it."""
    mask = os.umask(0o077)
    os.umask(mask)
    return mask


def _sync_folder(folder: Path) -> None:
    """Make the rename itself last, where the system lets folders be opened."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)


def _write_book(results: RunResults, stream: object, folder: str, *, draws_sheet: bool) -> None:
    options = {
        "tmpdir": folder,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
        "default_format_properties": FONT,
    }
    workbook = Workbook(stream, options)
    workbook.use_zip64()
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
