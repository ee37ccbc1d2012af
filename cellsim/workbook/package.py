"""The file before it is read: is it a workbook at all, whole, and of a bearable size?"""

from __future__ import annotations

import zipfile
import zlib
from pathlib import Path
from types import TracebackType

from cellsim.errors import ModelError, Problem

MOST_BYTES = 4 * 2**30
"""All parts unpacked may take so much together."""
MOST_BYTES_A_PART = 2 * 2**30
"""One part unpacked may take so much."""
MOST_EXPANSION = 1_000
"""A part larger than `_SUSPECT` may be at most so many times its packed size."""
_SUSPECT = 100 * 2**20
_CHUNK = 1 << 20

_COMPOUND_FILE = bytes.fromhex("d0cf11e0a1b11ae1")
_ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
_LEGACY = ("Workbook".encode("utf-16-le"), "Book".encode("utf-16-le"))


class Package:
    """An open workbook file; its parts are read into memory one at a time, never onto the disk."""

    def __init__(self, path: Path) -> None:
        self.path = path
        _check_kind(path)
        try:
            self._zip = zipfile.ZipFile(path)
        except zipfile.BadZipFile as error:
            raise ModelError(
                Problem(
                    path.name,
                    "the file is cut off or damaged: its list of parts cannot be read",
                    "get it again from its source",
                )
            ) from error
        self._names = {
            name.lstrip("/").replace("\\", "/").casefold(): name for name in self._zip.namelist()
        }
        self._check_sizes()

    def __enter__(self) -> Package:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._zip.close()

    def has(self, part: str) -> bool:
        """Whether there is a part of that name."""
        return part.lstrip("/").casefold() in self._names

    def read(self, part: str) -> bytes:
        """The bytes of a part.

        Raises:
            ModelError: It is not there, damaged, encrypted or larger than it says.
        """
        name = self._names.get(part.lstrip("/").casefold())
        if name is None:
            raise ModelError(Problem(self.path.name, f"the workbook lacks its part {part}"))
        info = self._zip.getinfo(name)
        chunks: list[bytes] = []
        size = 0
        try:
            with self._zip.open(info) as file:
                while chunk := file.read(_CHUNK):
                    chunks.append(chunk)
                    size += len(chunk)
                    if size > info.file_size or size > MOST_BYTES_A_PART:
                        raise ModelError(
                            Problem(self.path.name, f"the part {part} unpacks to more than it says")
                        )
        except (zipfile.BadZipFile, zlib.error, EOFError, OSError) as error:
            raise ModelError(
                Problem(
                    self.path.name,
                    f"the part {part} is damaged",
                    "get the file again from its source",
                )
            ) from error
        except (RuntimeError, NotImplementedError) as error:
            raise ModelError(
                Problem(self.path.name, f"the part {part} cannot be unpacked: {error}")
            ) from error
        return b"".join(chunks)

    def _check_sizes(self) -> None:
        total = 0
        for info in self._zip.infolist():
            total += info.file_size
            packed = max(info.compress_size, 1)
            if info.file_size > MOST_BYTES_A_PART or (
                info.file_size > _SUSPECT and info.file_size / packed > MOST_EXPANSION
            ):
                raise ModelError(
                    Problem(
                        self.path.name,
                        f"its part {info.filename} would unpack from {packed:,} to {info.file_size:,} bytes; the file "
                        "is refused as a possible attack on the machine's memory",
                    )
                )
        if total > MOST_BYTES:
            raise ModelError(
                Problem(
                    self.path.name,
                    f"its parts would unpack to {total:,} bytes, more than {MOST_BYTES:,}",
                )
            )


def _check_kind(path: Path) -> None:
    """Say plainly what a file is that is no workbook.

    Raises:
        ModelError: It is missing, a folder, or of another kind.
    """
    name = path.name
    if not path.exists():
        raise ModelError(Problem(str(path), "there is no such file", _nearby(path)))
    if path.is_dir():
        raise ModelError(Problem(str(path), "this is a folder, expected an .xlsx or .xlsm file"))
    try:
        with path.open("rb") as file:
            head = file.read(4096)
    except OSError as error:
        raise ModelError(
            Problem(str(path), f"the file cannot be read: {error.strerror}")
        ) from error
    if not head:
        raise ModelError(Problem(name, "the file is empty"))
    if head.startswith(_COMPOUND_FILE):
        raise ModelError(_compound_file(path))
    if not head.startswith((b"PK\x03\x04", b"PK\x05\x06")):
        raise ModelError(
            Problem(name, "this is no workbook: it is not a zip package", _text_hint(path, head))
        )


def _compound_file(path: Path) -> Problem:
    content = path.read_bytes()
    if _ENCRYPTED in content:
        return Problem(
            path.name, "the workbook is encrypted", "save a copy without a password to open it"
        )
    if any(mark in content for mark in _LEGACY):
        return Problem(path.name, "this is a workbook in the old .xls format", "save it as .xlsx")
    return Problem(path.name, "this is an older office document, not an .xlsx workbook")


def _text_hint(path: Path, head: bytes) -> str:
    if path.suffix.lower() == ".csv" or (b"\0" not in head and b"," in head):
        return (
            "it looks like text with commas; open it in a spreadsheet program and save it as .xlsx"
        )
    return "expected an .xlsx or .xlsm file"


def _nearby(path: Path) -> str:
    if not path.parent.is_dir():
        return f"there is no folder {path.parent}"
    books = sorted(p.name for p in path.parent.iterdir() if p.suffix.lower() in {".xlsx", ".xlsm"})
    return (
        f"workbooks there: {', '.join(books[:8])}"
        if books
        else "there is no workbook in that folder"
    )
