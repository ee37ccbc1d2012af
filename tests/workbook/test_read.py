from __future__ import annotations

import datetime as dt
import zipfile
from pathlib import Path

import openpyxl
import pytest

from cellsim.errors import ModelError
from cellsim.workbook.labels import find_label, unit_of
from cellsim.workbook.read import read_workbook

SHEET = """<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>
<row r="1"><c r="A1"><v>1</v></c><c r="B1"><f t="shared" ref="B1:B2" si="0">A1*2</f><v>2</v></c></row>
<row r="2" hidden="1"><c r="A2" t="str"><f>"x"&amp;A1</f><v>x1</v></c><c r="B2"><f t="shared" si="0"/><v>4</v></c></row>
<row r="3"><c r="A3" cm="1"><f t="array" ref="A3:A4">A1:A2</f><v>1</v></c><c r="C3" t="e"><v>#N/A</v></c></row>
<row r="4"><c r="A4"><f/><v>7</v></c><c r="B4"><f t="dataTable" ref="B4:C5" dt2D="1" dtr="1" r1="A1" r2="A2"/><v>3</v></c></row>
</sheetData></worksheet>"""
WORKBOOK = """<workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"
 xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><workbookPr date1904="1"/>
<sheets><sheet name="Costs" sheetId="1" state="hidden" r:id="rId1"/></sheets>
<definedNames><definedName name="rate" localSheetId="0">Costs!$A$1</definedName></definedNames>
<calcPr iterate="1" iterateCount="50" iterateDelta="0.01"/></workbook>"""
RELATION = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"


def write_package(path: Path, sheet: str = SHEET) -> Path:
    relations = (
        '<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">'
    )
    with zipfile.ZipFile(path, "w") as package:
        package.writestr(
            "_rels/.rels",
            f'{relations}<Relationship Id="r" Type="{RELATION}/officeDocument" Target="xl/workbook.xml"/></Relationships>',
        )
        package.writestr("xl/workbook.xml", WORKBOOK)
        package.writestr(
            "xl/_rels/workbook.xml.rels",
            f'{relations}<Relationship Id="rId1" Type="{RELATION}/worksheet" Target="worksheets/sheet1.xml"/></Relationships>',
        )
        package.writestr("xl/worksheets/sheet1.xml", sheet)
    return path


def test_shared_array_and_table_formulas_are_read_with_their_values(tmp_path: Path) -> None:
    book = read_workbook(write_package(tmp_path / "m.xlsx"))
    sheet = book.sheets[0]
    assert (sheet.title, sheet.state) == ("Costs", "hidden")
    assert sheet.formulas[2, 2].text == "A1*2"
    assert sheet.formulas[2, 2].origin == (1, 2)
    assert sheet.formulas[2, 2].stored == 4.0
    assert sheet.formulas[2, 1].stored == "x1"
    array = sheet.formulas[3, 1]
    assert array.dynamic
    assert array.array_area is not None
    assert array.array_area.address == "A3:A4"
    assert sheet.constants[4, 1] == 7.0
    table = sheet.formulas[4, 2].data_table
    assert table is not None
    assert (table.row_input, table.column_input) == ((1, 1), (2, 1))
    assert sheet.hidden_rows == frozenset({2})


def test_settings_and_names_are_read(tmp_path: Path) -> None:
    book = read_workbook(write_package(tmp_path / "m.xlsx"))
    assert book.date_1904
    assert (book.iteration.enabled, book.iteration.passes, book.iteration.change) == (
        True,
        50,
        0.01,
    )
    assert (book.names[0].name, book.names[0].scope, book.names[0].text) == (
        "rate",
        "Costs",
        "Costs!$A$1",
    )


def test_a_workbook_of_another_writer_is_read(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    sheet["A1"], sheet["B1"], sheet["C1"] = "Growth", 0.03, dt.datetime(2026, 6, 30)  # noqa: DTZ001
    sheet["B1"].number_format = "0.0%"
    sheet["A2"], sheet["B2"] = True, "=B1*2"
    book.save(tmp_path / "m.xlsx")
    read = read_workbook(tmp_path / "m.xlsx").sheets[0]
    assert read.constants == {(1, 1): "Growth", (1, 2): 0.03, (1, 3): 46203.0, (2, 1): True}
    assert read.number_formats[1, 2] == "0.0%"
    assert not read.formulas[2, 2].has_stored
    assert find_label(read, 1, 2) == "Growth"


def test_units_come_from_number_formats() -> None:
    assert unit_of("0.0%") == "%"
    assert unit_of('#,##0 "EUR"') == "EUR"
    assert unit_of("General") == ""


def refused(tmp_path: Path, content: bytes, name: str = "m.xlsx") -> str:
    path = tmp_path / name
    path.write_bytes(content)
    with pytest.raises(ModelError) as caught:
        read_workbook(path)
    assert caught.value.exit_status == 3
    return str(caught.value)


def test_files_that_are_no_workbooks_are_refused_each_in_its_own_words(tmp_path: Path) -> None:
    compound = bytes.fromhex("d0cf11e0a1b11ae1") + b"\0" * 600
    assert "is empty" in refused(tmp_path, b"")
    assert "not a zip package" in refused(tmp_path, b"hello, world")
    assert "encrypted" in refused(tmp_path, compound + "EncryptedPackage".encode("utf-16-le"))
    assert "old .xls format" in refused(tmp_path, compound + "Workbook".encode("utf-16-le"))
    whole = write_package(tmp_path / "whole.xlsx").read_bytes()
    assert "cut off or damaged" in refused(tmp_path, whole[: len(whole) // 2])
    with pytest.raises(ModelError, match="no such file"):
        read_workbook(tmp_path / "missing.xlsx")
    with pytest.raises(ModelError, match="folder"):
        read_workbook(tmp_path)


def test_entities_and_malformed_parts_are_refused(tmp_path: Path) -> None:
    bomb = '<!DOCTYPE x [<!ENTITY a "aaaa">]>' + SHEET
    with pytest.raises(ModelError, match="document type"):
        read_workbook(write_package(tmp_path / "bomb.xlsx", bomb))
    with pytest.raises(ModelError, match=r"sheet1\.xml is not well-formed"):
        read_workbook(write_package(tmp_path / "broken.xlsx", SHEET[:-20]))


def test_a_part_that_unpacks_to_far_too_much_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "bomb.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
        package.writestr("xl/workbook.xml", b" " * (150 * 2**20))
    with pytest.raises(ModelError, match="possible attack"):
        read_workbook(path)
