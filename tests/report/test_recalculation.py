"""The live look-up recalculated by a spreadsheet program."""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import numpy as np
import openpyxl
import pytest

from cellsim.report.write import write_report
from cellsim.results import RunResults

SOFFICE = shutil.which("soffice")
needs_soffice = pytest.mark.skipif(SOFFICE is None, reason="LibreOffice is not installed")


def recalculated(path: Path, folder: Path) -> Path:
    """The workbook, calculated and saved by LibreOffice."""
    assert SOFFICE is not None
    target = folder / "recalculated"
    profile = f"-env:UserInstallation={(folder / 'profile').as_uri()}"
    command = [
        SOFFICE,
        "--headless",
        profile,
        "--convert-to",
        "xlsx",
        "--outdir",
        str(target),
        str(path),
    ]
    subprocess.run(command, check=True, capture_output=True, timeout=180)
    return target / path.name


@needs_soffice
@pytest.mark.slow
def test_look_up_gives_the_same_when_recalculated(ferry_run: RunResults, tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    write_report(ferry_run, path)
    before = openpyxl.load_workbook(path, data_only=True)["Quantiles"]
    after = openpyxl.load_workbook(recalculated(path, tmp_path), data_only=True)["Quantiles"]
    formulas = openpyxl.load_workbook(path)["Quantiles"]
    cells = [
        cell.coordinate for row in formulas.iter_rows() for cell in row if cell.data_type == "f"
    ]
    assert len(cells) == 9
    for cell in cells:
        assert after[cell].value == pytest.approx(before[cell].value, rel=1e-12)


@needs_soffice
@pytest.mark.slow
def test_look_up_answers_what_is_typed(ferry_run: RunResults, tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    write_report(ferry_run, path)
    values = ferry_run.output_draws[0][np.isfinite(ferry_run.output_draws[0])]
    table = [0, 0.001, 0.005, *[k / 100 for k in range(1, 100)], 0.995, 0.999, 1]
    known = np.quantile(values, table)
    asked = [
        (known[0] - 1, 0.0),
        (known[0], 0.4),
        (float(known[40]), 0.123),
        (4.05, 0.5),
        (known[-1], 1.0),
    ]
    for k, (value, share) in enumerate(asked):
        book = openpyxl.load_workbook(path)
        sheet = book["Quantiles"]
        sheet["G9"], sheet["G13"] = float(value), share
        changed = tmp_path / f"typed_{k}.xlsx"
        book.save(changed)
        answer = openpyxl.load_workbook(recalculated(changed, tmp_path), data_only=True)[
            "Quantiles"
        ]
        expected = float(np.interp(value, known, table)) if value >= known[0] else 0.0
        assert answer["G10"].value == pytest.approx(expected, abs=1e-9)
        assert answer["G11"].value == pytest.approx(1 - expected, abs=1e-9)
        assert answer["G14"].value == pytest.approx(float(np.interp(share, table, known)), rel=1e-9)


@needs_soffice
@pytest.mark.slow
def test_look_up_over_repeated_values_does_not_fail(
    make_run: object, output_record: object, tmp_path: Path
) -> None:
    assert callable(make_run)
    assert callable(output_record)
    path = tmp_path / "run.xlsx"
    write_report(make_run([(output_record("berths", 1.0, [1.0]), [0.0, 1.0, 1.0, 2.0] * 50)]), path)
    sheet = openpyxl.load_workbook(recalculated(path, tmp_path), data_only=True)["Quantiles"]
    assert sheet["G10"].value == pytest.approx(0.74, abs=0.02)
