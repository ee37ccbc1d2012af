"""The results workbook appears whole or not at all."""

from __future__ import annotations

import errno
import os
from pathlib import Path

import pytest
import xlsxwriter

from cellsim.errors import RunError
from cellsim.report.write import write_report
from cellsim.results import RunResults


def test_workbook_is_the_only_file_left_in_the_folder(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    write_report(ferry_run, tmp_path / "run.xlsx", draws_sheet=True)
    assert [path.name for path in tmp_path.iterdir()] == ["run.xlsx"]


def test_existing_file_is_kept_unless_it_is_to_be_overwritten(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    path = tmp_path / "run.xlsx"
    path.write_bytes(b"mine")
    with pytest.raises(RunError, match="exists already"):
        write_report(ferry_run, path)
    assert path.read_bytes() == b"mine"
    write_report(ferry_run, path, overwrite=True)
    assert path.read_bytes()[:2] == b"PK"


def test_file_made_while_writing_is_not_overwritten(
    ferry_run: RunResults, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "run.xlsx"
    close = xlsxwriter.Workbook.close

    def meanwhile(workbook: xlsxwriter.Workbook) -> None:
        close(workbook)
        path.write_bytes(b"theirs")

    monkeypatch.setattr(xlsxwriter.Workbook, "close", meanwhile)
    with pytest.raises(RunError, match="exists already"):
        write_report(ferry_run, path)
    assert path.read_bytes() == b"theirs"
    assert [item.name for item in tmp_path.iterdir()] == ["run.xlsx"]


def test_file_systems_without_second_names_are_written_to_as_well(
    ferry_run: RunResults, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(_path: Path, _target: Path) -> None:
        raise PermissionError(errno.EPERM, os.strerror(errno.EPERM))

    monkeypatch.setattr(Path, "hardlink_to", refuse)
    write_report(ferry_run, tmp_path / "run.xlsx")
    assert [item.name for item in tmp_path.iterdir()] == ["run.xlsx"]


def test_missing_folder_is_a_run_error(ferry_run: RunResults, tmp_path: Path) -> None:
    with pytest.raises(RunError, match="cannot be written"):
        write_report(ferry_run, tmp_path / "nowhere" / "run.xlsx")


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="permissions do not bind")
def test_folder_without_write_permission_is_a_run_error(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    tmp_path.chmod(0o500)
    try:
        with pytest.raises(RunError, match="cannot be written"):
            write_report(ferry_run, tmp_path / "run.xlsx")
    finally:
        tmp_path.chmod(0o700)


@pytest.mark.parametrize("fault", [KeyboardInterrupt, MemoryError, OSError])
def test_nothing_is_left_when_writing_is_broken_off(
    fault: type[BaseException],
    ferry_run: RunResults,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    path = tmp_path / "run.xlsx"
    path.write_bytes(b"mine")

    def break_off(_workbook: xlsxwriter.Workbook) -> None:
        raise fault

    monkeypatch.setattr(xlsxwriter.Workbook, "close", break_off)
    expected = RunError if fault is OSError else fault
    with pytest.raises(expected):
        write_report(ferry_run, path, overwrite=True)
    assert [item.name for item in tmp_path.iterdir()] == ["run.xlsx"]
    assert path.read_bytes() == b"mine"


def test_new_file_has_the_permissions_of_any_new_file(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    write_report(ferry_run, tmp_path / "run.xlsx")
    (tmp_path / "other").write_bytes(b"")
    assert (tmp_path / "run.xlsx").stat().st_mode == (tmp_path / "other").stat().st_mode
