"""Writing a workbook whole or not at all."""

from __future__ import annotations

import contextlib
import errno
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import BinaryIO, TypeAlias

from xlsxwriter import Workbook
from xlsxwriter.exceptions import XlsxWriterException

from cellsim.errors import Problem, RunError
from cellsim.report.styles import FONT

Writer: TypeAlias = Callable[[BinaryIO, str], None]
"""Writes a workbook into a stream; the folder is for its temporary files."""


def new_workbook(stream: BinaryIO, folder: str) -> Workbook:
    """An empty workbook in which text stays text."""
    options = {
        "tmpdir": folder,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
        "default_format_properties": FONT,
    }
    workbook = Workbook(stream, options)
    workbook.use_zip64()
    return workbook


def write_whole(path: Path, write: Writer, *, overwrite: bool) -> None:
    """Write a file to a temporary one in the same folder, flush it to disk and rename it.

    Args:
        path: The new file.
        write: What writes it.
        overwrite: Whether an existing file is replaced.

    Raises:
        RunError: The file exists already, or it cannot be written.
    """
    try:
        if not overwrite:
            _refuse_existing(path)
        _write_whole(path, write, overwrite=overwrite)
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


def _write_whole(path: Path, write: Writer, *, overwrite: bool) -> None:
    handle, name = tempfile.mkstemp(prefix=f".{path.stem[:40]}.", suffix=".part", dir=path.parent)
    temporary = Path(name)
    try:
        with (
            os.fdopen(handle, "wb") as stream,
            tempfile.TemporaryDirectory(prefix="cellsim-") as folder,
        ):
            write(stream, folder)
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
