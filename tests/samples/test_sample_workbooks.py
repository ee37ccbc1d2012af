"""The samples: what the build scripts write, what LibreOffice stored, and what their studies need."""

from __future__ import annotations

import importlib
import re
import sys
from pathlib import Path

import openpyxl
import pytest

import cellsim

SAMPLES = Path(__file__).resolve().parents[2] / "sample_workbooks"
BUILT = ("larkholm_ferries", "ottermoor_therapeutics")
FORMULAS = {"larkholm_ferries": (340, 360), "ottermoor_therapeutics": (600, 1500)}

pytestmark = pytest.mark.slow


def _cells(book: openpyxl.Workbook) -> dict[str, tuple[object, str]]:
    return {
        f"{sheet.title}!{cell.coordinate}": (cell.value, re.sub(r"[\\\"]", "", cell.number_format))
        for sheet in book
        for row in sheet.iter_rows()
        for cell in row
        if cell.value is not None
    }


@pytest.mark.parametrize("name", BUILT)
def test_the_script_writes_the_workbook_that_is_stored(
    name: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.syspath_prepend(str(SAMPLES / "build"))
    built = _cells(importlib.import_module(name).build())
    stored = _cells(openpyxl.load_workbook(SAMPLES / f"{name}.xlsx"))
    assert built.keys() == stored.keys()
    for place, (value, number_format) in built.items():
        kept, kept_format = stored[place]
        if hasattr(value, "year"):
            assert str(kept)[:10] == str(value)[:10], place
        elif isinstance(value, float):
            assert kept == pytest.approx(value, rel=1e-15), place
        else:
            assert kept == value, place
        assert kept_format == number_format, place
    sys.modules.pop(name, None)


@pytest.mark.parametrize("name", BUILT)
def test_every_stored_value_is_recalculated(name: str) -> None:
    """The stored values are LibreOffice's."""
    check = cellsim.load(SAMPLES / f"{name}.xlsx").check()
    least, most = FORMULAS[name]
    assert least <= check.compared <= most
    assert check.agreeing == check.compared
    assert not check.without_value


def test_the_ferry_companys_value_per_share_stays_what_it_was() -> None:
    """As stored by LibreOffice before rows of ratios were added to the sample."""
    stored = openpyxl.load_workbook(SAMPLES / "larkholm_ferries.xlsx", data_only=True)
    assert stored["Valuation"]["D30"].value == pytest.approx(9.91521443903863, rel=1e-14)


def test_checks_of_the_drug_sample_are_zero() -> None:
    stored = openpyxl.load_workbook(SAMPLES / "ottermoor_therapeutics.xlsx", data_only=True)
    checks = {
        row[1].value: row[2].value
        for row in stored["Results"].iter_rows()
        if str(row[1].value).startswith("Check")
    }
    assert len(checks) == 3
    assert set(checks.values()) == {0}


@pytest.mark.parametrize("name", BUILT)
def test_the_study_runs_without_a_failed_draw(name: str) -> None:
    outputs = cellsim.open_study(SAMPLES / f"{name}.toml").run(draws=500).outputs
    assert outputs.notna().all().all()
