"""The samples: what the build scripts write, what LibreOffice stored, and what their studies need."""

from __future__ import annotations

import importlib
import re
import shutil
import sys
from pathlib import Path

import openpyxl
import pytest

import cellsim

SAMPLES = Path(__file__).resolve().parents[2] / "sample_workbooks"
NAMES = tuple(sorted(path.stem for path in SAMPLES.glob("*.xlsx") if ".results" not in path.name))
FORMULAS = {
    "brennhalde_solar": (19_000, 21_000),
    "larkholm_ferries": (340, 360),
    "ottermoor_therapeutics": (600, 1500),
}

pytestmark = pytest.mark.slow


def _cells(book: openpyxl.Workbook) -> dict[str, tuple[object, str]]:
    return {
        f"{sheet.title}!{cell.coordinate}": (cell.value, re.sub(r"[\\\"]", "", cell.number_format))
        for sheet in book
        for row in sheet.iter_rows()
        for cell in row
        if cell.value is not None
    }


@pytest.mark.parametrize("name", NAMES)
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


@pytest.mark.parametrize("name", NAMES)
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


@pytest.mark.parametrize("name", NAMES)
def test_the_study_runs_without_a_failed_draw(name: str) -> None:
    study = cellsim.open_study(SAMPLES / f"{name}.toml")
    assert study.run(draws=200).outputs.notna().all().all()


def test_the_solar_park_is_circular_and_every_circle_settles() -> None:
    model = cellsim.load(SAMPLES / "brennhalde_solar.xlsx")
    model.check()
    cycles = model.base.findings.cycles
    assert len(cycles) > 300
    assert all(cycle.settled for cycle in cycles)


def test_the_solar_parks_own_checks_hold_in_every_draw(tmp_path: Path) -> None:
    """The balance sheet and the sums of cash and loan close only if each draw's circles were solved."""
    sidecar = (SAMPLES / "brennhalde_solar.toml").read_text(encoding="utf-8")
    rows = (20, 21, 22, 23, 25, 26, 27)  # row 24 holds for the yield profile, which no input moves
    shutil.copy(SAMPLES / "brennhalde_solar.xlsx", tmp_path)
    study = tmp_path / "checks.toml"
    asked = [f'[outputs.check_{row}]\ncell = "Returns!B{row}"\n' for row in rows]
    study.write_text(sidecar[: sidecar.index("[outputs.")] + "\n".join(asked), encoding="utf-8")
    opened = cellsim.open_study(study)
    assert not opened.compiled.program.slow
    outputs = opened.run(draws=200).outputs
    assert outputs.shape == (200, len(rows))
    assert (outputs == 0).all().all()
    stored = openpyxl.load_workbook(SAMPLES / "brennhalde_solar.xlsx", data_only=True)["Returns"]
    assert [stored[f"B{row}"].value for row in range(20, 28)] == [0] * 8
    assert stored["B28"].value is True


def test_a_stressed_draw_of_the_solar_park_is_what_libreoffice_makes_of_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Low yield, high rate, eight months late: the shareholders pay in, and the circles are solved anew."""
    if shutil.which("soffice") is None and shutil.which("libreoffice") is None:
        pytest.skip("LibreOffice is not there")
    monkeypatch.syspath_prepend(str(SAMPLES / "build"))
    study = cellsim.open_study(SAMPLES / "brennhalde_solar.toml")
    values = {
        "specific_yield": 1_010.0,
        "availability": 0.965,
        "degradation": 0.006,
        "market_price": 42.0,
        "construction_cost": 33_500.0,
        "cost_inflation": 0.026,
        "base_rate": 0.042,
        "delay": 8.0,
    }
    found = study.evaluate({name: [value] for name, value in values.items()}).iloc[0]
    book = importlib.import_module("brennhalde_solar").build()
    for asked in study.inputs:
        book[asked.cell.sheet].cell(asked.cell.row, asked.cell.column, values[asked.spec.name])
    path = tmp_path / "stressed.xlsx"
    book.save(path)
    importlib.import_module("recalculate").recalculate(path, rounds=5)
    returns = openpyxl.load_workbook(path, data_only=True)["Returns"]
    assert returns["B28"].value is True
    assert returns["B9"].value < 1  # the stress is one
    for asked in study.outputs:
        wanted = returns.cell(asked.target.row, asked.target.column).value
        assert found[asked.spec.name] == pytest.approx(wanted, rel=1e-9, abs=1e-9)
    for name in ("brennhalde_solar", "recalculate"):
        sys.modules.pop(name, None)
