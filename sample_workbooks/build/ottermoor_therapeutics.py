"""Builds ottermoor_therapeutics.xlsx: a staged valuation of one drug candidate of an invented company.

Run as `python sample_workbooks/build/ottermoor_therapeutics.py`; LibreOffice calculates the stored
values. The texts, inputs and rows are in ottermoor_rows.py.
"""

from __future__ import annotations

import datetime as dt
import math
import re
from collections.abc import Callable, Sequence
from pathlib import Path

from openpyxl import Workbook
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet
from ottermoor_rows import (
    AMOUNT,
    DATE,
    DEVELOPMENT,
    GUIDE,
    INPUTS,
    MARKET,
    SHARE,
    STAGE_TABLE,
    STAGES,
    VALUATION,
    WHOLE,
    Row,
)
from recalculate import recalculate

TARGET = Path(__file__).resolve().parents[1] / "ottermoor_therapeutics.xlsx"
YEARS = 25
FIRST_YEAR = 4
"""Column of the first year."""
LAST = get_column_letter(FIRST_YEAR + YEARS - 1)
FIRST_STAGE = 8
"""Row of the first stage on Development; the launch follows the last one."""
LAUNCH = FIRST_STAGE + len(STAGES)

PLAIN = Font(name="Calibri", size=11)
TITLE = Font(name="Calibri", bold=True, size=14)
STRONG = Font(name="Calibri", bold=True, size=11)
QUIET = Font(name="Calibri", italic=True, size=11, color="FF5B6770")
HEADER = PatternFill("solid", fgColor="FFE7ECEF")
LINE = Border(bottom=Side(style="thin", color="FF22313F"))
BESIDE = Alignment(horizontal="left", indent=1)
"""Texts to the right of numbers."""
WRAPPED = Alignment(wrap_text=True, vertical="top")

_REFERENCE = re.compile(r"\b([iptrs])\.(\w+)")


class Places:
    """Where each key's cell or row is, and formulas with keys replaced by references."""

    def __init__(self) -> None:
        self.inputs: dict[str, int] = {}
        self.rows: dict[str, tuple[str, int]] = {}
        self.cells: dict[str, str] = _stage_places()

    def formula(self, text: str, sheet: str, year: int = FIRST_YEAR) -> str:
        """The formula as it stands on a sheet, in a year's column."""
        finders: dict[str, Callable[[str], str]] = {
            "i": self._input,
            "t": lambda key: self._row(key, sheet, year),
            "p": lambda key: self._row(key, sheet, year - 1),
            "r": lambda key: self._all_years(key, sheet),
            "s": lambda key: _shortened(self.cells[key], sheet),
        }
        return _REFERENCE.sub(lambda found: finders[found[1]](found[2]), text)

    def _input(self, key: str) -> str:
        if key in self.inputs:
            return f"Inputs!$C${self.inputs[key]}"
        numbered = [row for name, row in self.inputs.items() if re.fullmatch(rf"{key}\d", name)]
        return f"Inputs!$C${min(numbered)}:$C${max(numbered)}"

    def _row(self, key: str, sheet: str, year: int) -> str:
        home, row = self.rows[key]
        return _shortened(f"{home}!{get_column_letter(year)}{row}", sheet)

    def _all_years(self, key: str, sheet: str) -> str:
        home, row = self.rows[key]
        return _shortened(f"{home}!${get_column_letter(FIRST_YEAR)}${row}:${LAST}${row}", sheet)


def _shortened(reference: str, sheet: str) -> str:
    return reference.removeprefix(f"{sheet}!")


def _stage_places() -> dict[str, str]:
    last = LAUNCH - 1
    columns = {"starts_chance": "J", "starts": "K", "success_chance": "L", "success": "M"}
    columns |= {"due": "N", "end_year": "O", "chance": "E"}
    places = {
        key: f"Development!${column}${FIRST_STAGE}:${column}${last}"
        for key, column in columns.items()
    }
    for n in range(1, len(STAGES) + 1):
        row = FIRST_STAGE + n - 1
        for key, column in {"cost": "D", "start": "H", "end": "I"}.items():
            places[f"{key}{n}"] = f"Development!${column}${row}"
    places["launch_chance"] = f"Development!$E${LAUNCH}"
    places["launched"] = f"Development!$F${LAUNCH}"
    places["launch"] = f"Development!$H${LAUNCH}"
    places["expiry"] = f"Development!$H${LAUNCH + 1}"
    return places


def build() -> Workbook:
    """The workbook, not yet calculated."""
    book, places = Workbook(), Places()
    guide = book.active
    assert isinstance(guide, Worksheet)
    guide.title = "Guide"
    _guide(guide)
    _inputs(book.create_sheet("Inputs"), places)
    sheets = [book.create_sheet(title) for title in ("Development", "Market", "Valuation")]
    development, market, valuation = sheets
    blocks = (
        (development, DEVELOPMENT, LAUNCH + 4),
        (market, MARKET, 4),
        (valuation, VALUATION, 4),
    )
    for sheet, rows, top in blocks:  # all places first: rows read rows of other sheets
        _find_rows(sheet.title, rows, top, places)
    market_end, valuation_end = 4 + len(MARKET) + 1, 4 + len(VALUATION) + 1
    _tiers(market, market_end, places)
    for sheet, rows, top in blocks:
        _years(sheet, rows, top, places)
    _stages(development, places)
    _values(valuation, valuation_end, places)
    _results(book.create_sheet("Results"), places)
    for sheet in book.worksheets:
        sheet.sheet_view.showGridLines = False
        sheet.page_setup.orientation = "landscape"
        sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
        sheet.sheet_properties.pageSetUpPr.fitToPage = True
    return book


def _head(sheet: Worksheet, about: str, widths: dict[str, float]) -> None:
    sheet["A1"], sheet["A1"].font = sheet.title, TITLE
    sheet["A2"], sheet["A2"].font = about, QUIET
    sheet.column_dimensions["A"].width = 3
    for column, width in widths.items():
        sheet.column_dimensions[column].width = width


def _header(sheet: Worksheet, row: int, first: int, texts: Sequence[str]) -> None:
    for column, text in enumerate(texts, start=first):
        cell = sheet.cell(row, column, text)
        cell.font, cell.fill, cell.border = STRONG, HEADER, LINE
        cell.alignment = Alignment(
            wrap_text=True, vertical="bottom", horizontal="left" if column == first else "right"
        )


def _put(sheet: Worksheet, address: str, value: float | str | dt.date, number_format: str) -> None:
    sheet[address] = value
    sheet[address].number_format = number_format
    sheet[address].alignment = Alignment(horizontal="right")


def _guide(sheet: Worksheet) -> None:
    sheet.column_dimensions["A"].width = 92
    for row, (text, strong) in enumerate(GUIDE, start=1):
        cell = sheet.cell(row, 1, text)
        cell.font = TITLE if row == 1 else STRONG if strong else PLAIN
        cell.alignment = WRAPPED
        sheet.row_dimensions[row].height = 15 * math.ceil(len(text) / 95) + 6 * strong


def _inputs(sheet: Worksheet, places: Places) -> None:
    _head(sheet, "Every number that may be changed.", {"B": 40, "C": 14, "D": 15, "E": 38})
    _header(sheet, 4, 2, ("Input", "Value", "Unit", "Note"))
    for column in "DE":
        sheet[f"{column}4"].alignment = BESIDE
    sheet.freeze_panes = "C5"
    for row, line in enumerate(INPUTS, start=5):
        if isinstance(line, str):
            sheet[f"B{row}"], sheet[f"B{row}"].font = line, STRONG
            continue
        key, label, value, unit, number_format, note = line
        places.inputs[key] = row
        sheet[f"B{row}"] = label
        _put(sheet, f"C{row}", value, number_format)
        sheet[f"D{row}"], sheet[f"E{row}"] = unit or None, note or None
        sheet[f"E{row}"].font = QUIET
        sheet[f"D{row}"].alignment = sheet[f"E{row}"].alignment = BESIDE


def _find_rows(sheet: str, rows: Sequence[Row | str], top: int, places: Places) -> None:
    for row, line in enumerate(rows, start=top):
        if not isinstance(line, str):
            places.rows[line[0]] = (sheet, row)


def _years(sheet: Worksheet, rows: Sequence[Row | str], top: int, places: Places) -> None:
    widths = {get_column_letter(FIRST_YEAR + n): 11.5 for n in range(YEARS)}
    about = {
        "Development": "Stages, their dates, chances and flags; cost and milestones by year.",
        "Market": "Sales and costs on the footing that the drug is launched.",
        "Valuation": "Cash flows and present values: by chance, and for the flags on Inputs.",
    }
    _head(sheet, about[sheet.title], {"B": 44, "C": 14} | widths)
    sheet.freeze_panes = "C1" if sheet.title == "Development" else f"D{top + 1}"
    for row, line in enumerate(rows, start=top):
        if isinstance(line, str):
            sheet[f"B{row}"], sheet[f"B{row}"].font = line, STRONG
            continue
        _, label, unit, number_format, formula, first = line
        sheet[f"B{row}"], sheet[f"C{row}"] = label, unit or None
        for year in range(FIRST_YEAR, FIRST_YEAR + YEARS):
            text = first if first is not None and year == FIRST_YEAR else formula
            _put(
                sheet,
                f"{get_column_letter(year)}{row}",
                places.formula(text, sheet.title, year),
                number_format,
            )
        if row == top:
            for column in range(2, FIRST_YEAR + YEARS):
                cell = sheet.cell(row, column)
                cell.font, cell.fill, cell.border = STRONG, HEADER, LINE


def _stages(sheet: Worksheet, places: Places) -> None:
    sheet["B4"] = "A stage starts only if all before it succeeded. Flags come from Inputs."
    _header(sheet, FIRST_STAGE - 1, 2, ("Stage", *(header for header, *_ in STAGE_TABLE)))
    sheet.row_dimensions[FIRST_STAGE - 1].height = 62
    for n, stage in enumerate(STAGES, start=1):
        row = FIRST_STAGE + n - 1
        sheet[f"B{row}"] = stage
        overrun = "over_early" if n <= 3 else "over_late"
        for column, (_, number_format, first, later) in enumerate(STAGE_TABLE, start=3):
            text = (first if n == 1 else later).format(n=n, r=row, q=row - 1, overrun=overrun)
            address = f"{get_column_letter(column)}{row}"
            _put(sheet, address, places.formula(text, sheet.title), number_format)
    last = LAUNCH - 1
    sheet[f"B{LAUNCH}"], sheet[f"B{LAUNCH + 1}"] = "Launch", "Protection ends"
    for column, number_format in zip("CDEF", (AMOUNT, AMOUNT, SHARE, WHOLE), strict=True):
        function = "SUM" if column in "CD" else "PRODUCT"
        formula = f"={function}({column}{FIRST_STAGE}:{column}{last})"
        _put(sheet, f"{column}{LAUNCH}", formula, number_format)
    formulas = (f"=EDATE(I{last},i.to_launch)", f"=MAX(i.patent,EDATE(H{LAUNCH},12*i.shield))")
    for row, text in enumerate(formulas, start=LAUNCH):
        _put(sheet, f"H{row}", places.formula(text, sheet.title), DATE)
    for column in "BCDEFGH":
        sheet[f"{column}{LAUNCH}"].font = STRONG


def _tiers(sheet: Worksheet, top: int, places: Places) -> None:
    _header(sheet, top, 2, ("Royalty tiers", "Sales from", "Rate", "Step"))
    for n in (1, 2, 3):
        row = top + n
        sheet[f"B{row}"] = f"Tier {n}"
        rate = places.formula(f"=CHOOSE(i.deal,i.first_rate{n},i.second_rate{n})", sheet.title)
        _put(sheet, f"C{row}", places.formula(f"=i.tier{n}", sheet.title), "#,##0")
        _put(sheet, f"D{row}", rate, SHARE)
        _put(sheet, f"E{row}", f"=D{row}" if n == 1 else f"=D{row}-D{row - 1}", SHARE)
    places.cells["tiers"] = f"Market!$C${top + 1}:$C${top + 3}"
    places.cells["steps"] = f"Market!$E${top + 1}:$E${top + 3}"


def _values(sheet: Worksheet, top: int, places: Places) -> None:
    values = (
        ("rnpv", "Risk-adjusted value", "=SUM(r.mean_pv)"),
        ("npv", "The same by NPV", "=NPV(i.discount,r.mean_flow)*(1+i.discount)^0.5"),
        ("value", "Value with these flags", "=SUM(r.flag_pv)"),
        ("top_value", "Value if every stage succeeds", "=SUMPRODUCT(r.all_flow,r.factor)"),
        (
            "outlay",
            "Expected outlay before launch, present value",
            "=SUMPRODUCT(r.spent_mean+r.due_mean,r.factor)",
        ),
    )
    for row, (key, label, text) in enumerate(values, start=top):
        sheet[f"B{row}"], sheet[f"B{row}"].font = label, STRONG
        sheet[f"C{row}"] = "EUR million"
        _put(sheet, f"D{row}", places.formula(text, sheet.title), AMOUNT)
        places.cells[key] = f"Valuation!$D${row}"
    _ends(sheet, top + len(values) + 1, places)


def _ends(sheet: Worksheet, top: int, places: Places) -> None:
    """The six ways in which development can end; their mean is the risk-adjusted value."""
    headers = ("Chance", "Cost of the stage", "Its milestone", "Value", "Chance times value")
    _header(sheet, top, 2, ("How it can end", *headers))
    sheet.row_dimensions[top].height = 30
    first, last = top + 1, top + len(STAGES) + 1
    for n, stage in enumerate(STAGES, start=1):
        row, home = top + n, FIRST_STAGE + n - 1
        sheet[f"B{row}"] = f"{stage} fails"
        formulas = (
            f"=Development!J{home}*(1-Development!E{home})",
            f"=SUMPRODUCT(r.spent{n},r.factor)",
            f"=IFERROR(Development!N{home}*INDEX(r.factor,MATCH(Development!O{home},r.v_year,0)),0)",
            f"=-SUM(D${first}:D{row})-SUM(E${first}:E{row})+E{row}",
            f"=C{row}*F{row}",
        )
        for column, text in zip("CDEFG", formulas, strict=True):
            formula = places.formula(text, sheet.title)
            _put(sheet, f"{column}{row}", formula, SHARE if column == "C" else AMOUNT)
    sheet[f"B{last}"], sheet[f"B{last + 1}"] = "Launched", "All"
    sheet[f"B{last + 2}"] = "Standard deviation over the ends"
    span = f"{{0}}{first}:{{0}}{last}"
    chances, ends = span.format("C"), span.format("F")
    _put(sheet, f"C{last}", places.formula("=s.launch_chance", sheet.title), SHARE)
    _put(sheet, f"F{last}", places.formula("=s.top_value", sheet.title), AMOUNT)
    _put(sheet, f"G{last}", f"=C{last}*F{last}", AMOUNT)
    _put(sheet, f"C{last + 1}", f"=SUM({chances})", SHARE)
    _put(sheet, f"G{last + 1}", f"=SUM({span.format('G')})", AMOUNT)
    spread = f"=SQRT(SUMPRODUCT({chances},({ends}-G{last + 1})^2))"
    _put(sheet, f"G{last + 2}", spread, AMOUNT)
    places.cells["ends_mean"] = f"Valuation!$G${last + 1}"
    places.cells["ends_sd"] = f"Valuation!$G${last + 2}"


def _results(sheet: Worksheet, places: Places) -> None:
    _head(sheet, "For the memo.", {"B": 42, "C": 16, "D": 14, "E": 64})
    sheet.freeze_panes = "C5"
    _header(sheet, 4, 2, ("Result", "Value", "Unit", "Note"))
    for column in "DE":
        sheet[f"{column}4"].alignment = BESIDE
    million, stages = "EUR million", f"Development!$B${FIRST_STAGE}:$B${LAUNCH - 1}"
    lines = (
        ("Risk-adjusted value (rNPV)", "=s.rnpv", million, AMOUNT, "Mean over all ways it can end"),
        ("Value with these flags", "=s.value", million, AMOUNT, "Stored workbook: all succeed"),
        (
            "Value if every stage succeeds",
            "=s.top_value",
            million,
            AMOUNT,
            "Whatever the flags say",
        ),
        ("Standard deviation from the flags alone", "=s.ends_sd", million, AMOUNT, ""),
        ("Chance of launch", "=s.launch_chance", "", SHARE, ""),
        ("Launched with these flags (0 or 1)", "=s.launched", "", WHOLE, ""),
        ("Year of launch, if launched", "=YEAR(s.launch)", "", WHOLE, ""),
        ("Peak sales, if launched", "=MAX(r.sales)", million, AMOUNT, ""),
        (
            "Year of peak sales, if launched",
            "=INDEX(r.year,MATCH(MAX(r.sales),r.sales,0))",
            "",
            WHOLE,
            "",
        ),
        ("End of protection, if launched", "=s.expiry", "", DATE, ""),
        ("Expected outlay before launch", "=s.outlay", million, AMOUNT, "Present value"),
        ("Risk-adjusted value for each EUR of it", "=IFERROR(C5/C15,0)", "EUR", "0.00", ""),
        (
            "How it ends with these flags",
            f'=IF(s.launched=1,"launched",INDEX({stages},MATCH(0,s.success,0))&" fails")',
            "",
            "General",
            "",
        ),
        (
            "Decision",
            '=IF(C5<=0,"stop or find a partner",IF(C16<0.25,"go on, thin margin","go on"))',
            "",
            "General",
            "Stop if the risk-adjusted value is not above zero; thin below 0.25 for each EUR",
        ),
        ("Check: rNPV by NPV", "=ROUND(C5-s.npv,6)", million, "0.0", "0 if both agree"),
        ("Check: rNPV by ways of ending", "=ROUND(C5-s.ends_mean,6)", million, "0.0", "Likewise"),
        (
            "Check: cost outside the 25 years",
            f"=ROUND(Development!D{LAUNCH}-SUM(r.spent),6)",
            million,
            "0.0",
            "0 if every stage ends within them",
        ),
    )
    for row, (label, text, unit, number_format, note) in enumerate(lines, start=5):
        sheet[f"B{row}"] = label
        _put(sheet, f"C{row}", places.formula(text, sheet.title), number_format)
        sheet[f"D{row}"], sheet[f"E{row}"] = unit or None, note or None
        sheet[f"E{row}"].font = QUIET
        sheet[f"D{row}"].alignment = sheet[f"E{row}"].alignment = BESIDE


if __name__ == "__main__":
    build().save(TARGET)
    recalculate(TARGET)
