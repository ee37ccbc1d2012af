"""Builds larkholm_ferries.xlsx: a ten-year discounted cash flow of an invented ferry company.

Run as `python sample_workbooks/build/larkholm_ferries.py`; LibreOffice calculates the stored values.
"""

from __future__ import annotations

from pathlib import Path

from openpyxl import Workbook
from openpyxl.styles import Font
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.worksheet import Worksheet
from recalculate import recalculate

TARGET = Path(__file__).resolve().parents[1] / "larkholm_ferries.xlsx"
TITLE = Font(name="Cambria", bold=True, size=14)
STRONG = Font(name="Cambria", bold=True, size=11)
YEARS = "DEFGHIJKLM"

GUIDE = (
    "An invented company with invented figures, made to try cellsim on.",
    "Inputs: every number that may be changed, with a scenario switch. Operations: ten years of "
    "business. Valuation: present values, bridge to equity, value per share. Market: the quoted "
    "price.",
    "Amounts are in thousand EUR unless a unit says otherwise.",
    "The figures are no advice to buy, sell or lend; a licensed professional and local rules come "
    "first.",
)

# Row, label, value, number format, unit.
INPUTS: tuple[tuple[int, str, float | str, str, str], ...] = (
    (5, "Scenario (1 slow, 2 base, 3 strong)", 2, "0", ""),
    (6, "Passengers in the first year", 1850, "#,##0", "thousand"),
    (7, "Passenger growth, slow", 0.005, "0.0%", "a year"),
    (8, "Passenger growth, base", 0.022, "0.0%", "a year"),
    (9, "Passenger growth, strong", 0.035, "0.0%", "a year"),
    (10, "Fare per passenger", 24.5, "#,##0.00", "EUR"),
    (11, "Fare inflation", 0.02, "0.0%", "a year"),
    (12, "On-board spending per passenger", 6.2, "#,##0.00", "EUR"),
    (13, "Fuel per sailing year", 11.5, "#,##0.0", "thousand t"),
    (14, "Fuel price", 640, "#,##0", "EUR/t"),
    (15, "Fuel price drift", 0.015, "0.0%", "a year"),
    (16, "Crew and port cost", 24500, "#,##0", "EUR thousand"),
    (17, "Cost inflation", 0.021, "0.0%", "a year"),
    (18, "Overhead share of revenue", 0.11, "0.0%", ""),
    (19, "Maintenance capex share of revenue", 0.065, "0.0%", ""),
    (20, "New berth is built (0 or 1)", 1, "0", ""),
    (21, "Cost of the new berth", 14000, "#,##0", "EUR thousand"),
    (22, "Year of the new berth", 3, "0", ""),
    (23, "Passengers added by the new berth", 0.06, "0.0%", ""),
    (24, "Working capital share of revenue", 0.05, "0.0%", ""),
    (25, "Tax rate", 0.24, "0.0%", ""),
    (26, "Tax losses carried forward", 9000, "#,##0", "EUR thousand"),
    (27, "Cost of capital", 0.082, "0.0%", "a year"),
    (28, "Terminal growth", 0.015, "0.0%", "a year"),
    (29, "Depreciation life of assets", 12, "0", "years"),
    (30, "Fixed assets at the start", 96000, "#,##0", "EUR thousand"),
    (32, "Passenger growth in the chosen scenario", "=CHOOSE(C5,C7,C8,C9)", "0.0%", ""),
    (33, "Interest rate on debt and leases", 0.052, "0.0%", "a year"),
)

# Row, label, formula of the first year, number format, formula of later years where it differs.
# {c} is the year's own column, {p} the column before it.
OPERATIONS: tuple[tuple[int, str, str, str, str | None], ...] = (
    (4, "Year ending", "=EOMONTH($C$2,12)", "yyyy\\-mm\\-dd", "=EOMONTH({p}4,12)"),
    (5, "Year number", "=1", "0", "={p}5+1"),
    (
        6,
        "Passengers",
        "=Inputs!$C$6*(1+Inputs!$C$32)^({c}5-1)"
        "*IF(AND(Inputs!$C$20=1,{c}5>=Inputs!$C$22),1+Inputs!$C$23,1)",
        "#,##0",
        None,
    ),
    (7, "Fare", "=Inputs!$C$10*(1+Inputs!$C$11)^({c}5-1)", "0.00", None),
    (8, "Fare revenue", "={c}6*{c}7", "#,##0", None),
    (9, "On-board revenue", "={c}6*Inputs!$C$12", "#,##0", None),
    (10, "Revenue", "=SUM({c}8:{c}9)", "#,##0", None),
    (11, "Fuel price", "=Inputs!$C$14", "#,##0", "={p}11*(1+Inputs!$C$15)"),
    (12, "Fuel cost", "=Inputs!$C$13*{c}11", "#,##0", None),
    (13, "Crew and port cost", "=Inputs!$C$16*(1+Inputs!$C$17)^({c}5-1)", "#,##0", None),
    (14, "Overhead", "=Inputs!$C$18*{c}10", "#,##0", None),
    (15, "Operating profit before depreciation", "={c}10-SUM({c}12:{c}14)", "#,##0", None),
    (16, "Margin", "=IFERROR({c}15/{c}10,0)", "0.0%", None),
    (17, "Maintenance capex", "=Inputs!$C$19*{c}10", "#,##0", None),
    (18, "New berth", "=IF({c}5=Inputs!$C$22,Inputs!$C$20*Inputs!$C$21,0)", "#,##0", None),
    (19, "Fixed assets", "=Inputs!$C$30+{c}17+{c}18", "#,##0", "={p}19-{p}20+{c}17+{c}18"),
    (20, "Depreciation", "={c}19/Inputs!$C$29", "#,##0", None),
    (21, "Operating profit", "={c}15-{c}20", "#,##0", None),
    (22, "Losses at the start", "=Inputs!$C$26", "#,##0", "={p}22-{p}23+{p}24"),
    (23, "Losses used", "=MIN({c}22,MAX({c}21,0))", "#,##0", None),
    (24, "Losses made", "=MAX(-{c}21,0)", "#,##0", None),
    (25, "Tax", "=Inputs!$C$25*(MAX({c}21,0)-{c}23)", "#,##0", None),
    (26, "Working capital", "=Inputs!$C$24*{c}10", "#,##0", None),
    (27, "Change in working capital", "={c}26-0", "#,##0", "={c}26-{p}26"),
    (28, "Free cash flow", "={c}15-{c}25-{c}17-{c}18-{c}27", "#,##0", None),
    (30, "Revenue per passenger", "=IFERROR({c}10/{c}6,0)", "0.00", None),
    (31, "Operating profit per passenger", "=IFERROR({c}21/{c}6,0)", "0.00", None),
    (
        32,
        "Return on capital, after tax",
        "=IFERROR(({c}21-{c}25)/({c}19-{c}20+{c}26),0)",
        "0.0%",
        None,
    ),
    (
        33,
        "Interest cover",
        "=IFERROR({c}21/(Inputs!$C$33*(Valuation!$D$21+Valuation!$D$22)),0)",
        '0.0"x"',
        None,
    ),
)

VALUATION_BY_YEAR: tuple[tuple[int, str, str, str], ...] = (
    (4, "Year number", "=Operations!{c}5", "General"),
    (5, "Free cash flow", "=Operations!{c}28", "#,##0"),
    (6, "Discount factor, mid-year", "=1/(1+Inputs!$C$27)^({c}4-0.5)", "0.0000"),
    (7, "Present value", "={c}5*{c}6", "#,##0"),
)

VALUATION: tuple[tuple[int, str, float | str, str], ...] = (
    (10, "Present value of the flows", "=SUM(D7:M7)", "#,##0"),
    (11, "The same, checked", "=SUMPRODUCT(D5:M5,D6:M6)", "#,##0"),
    (12, "Year-end NPV", "=NPV(Inputs!$C$27,D5:M5)", "#,##0"),
    (14, "Normal free cash flow", "=AVERAGE(K5:M5)", "#,##0"),
    (
        15,
        "Terminal value",
        "=IF(Inputs!$C$27>Inputs!$C$28,D14*(1+Inputs!$C$28)/(Inputs!$C$27-Inputs!$C$28),NA())",
        "#,##0",
    ),
    (16, "Present value of the terminal value", "=D15*M6", "#,##0"),
    (18, "Enterprise value", "=D10+D16", "#,##0"),
    (19, "Terminal value's share", "=IFERROR(D16/D18,0)", "0.0%"),
    (21, "Bank debt", 41000, "#,##0"),
    (22, "Leases", 6500, "#,##0"),
    (23, "Cash", 8200, "#,##0"),
    (24, "Net debt", "=D21+D22-D23", "#,##0"),
    (26, "Equity value", "=D18-D24", "#,##0"),
    (27, "Equity value, not below zero", "=MAX(D26,0)", "#,##0"),
    (28, "Shares", "=Market!B3", "#,##0"),
    (30, "Value per share", "=D27/D28", "0.00"),
    (31, "Rounded for the memo", "=ROUND(D30,1)", "0.0"),
    (32, "Above the share price", '=IF(D30>Market!B2,"above","below")', "General"),
    (
        34,
        "Implied multiple of profit before depreciation",
        "=IFERROR(D18/Operations!D15,0)",
        '0.0"x"',
    ),
    (
        35,
        "The same at the share price",
        "=IFERROR((Market!B4+D24)/Operations!D15,0)",
        '0.0"x"',
    ),
    (36, "Enterprise value per passenger", "=IFERROR(D18/Operations!D6,0)", "0.00"),
)

MARKET: tuple[tuple[int, str, float | str, str, str], ...] = (
    (2, "Share price", 8.4, "0.00", "EUR"),
    (3, "Shares", 24000, "#,##0", "thousand"),
    (4, "Market value", "=B2*B3", "#,##0", "EUR thousand"),
)


def build() -> Workbook:
    """The workbook, not yet calculated."""
    book = Workbook()
    guide = book.active
    assert isinstance(guide, Worksheet)
    guide.title = "Guide"
    _head(guide, "Larkholm Ferries: discounted cash flow", {"A": 110})
    for row, text in enumerate(GUIDE, start=2):
        guide.cell(row, 1, text)
    _inputs(book.create_sheet("Inputs"))
    _operations(book.create_sheet("Operations"))
    _valuation(book.create_sheet("Valuation"))
    _market(book.create_sheet("Market"))
    book.defined_names["ShareValue"] = DefinedName("ShareValue", attr_text="Valuation!$D$30")
    return book


def _head(sheet: Worksheet, title: str, widths: dict[str, float]) -> None:
    sheet["A1"] = title
    sheet["A1"].font = TITLE if sheet.title == "Guide" else STRONG
    for column, width in widths.items():
        sheet.column_dimensions[column].width = width


def _put(sheet: Worksheet, address: str, value: float | str, number_format: str) -> None:
    sheet[address] = value
    sheet[address].number_format = number_format


def _inputs(sheet: Worksheet) -> None:
    _head(sheet, "Inputs", {"B": 42, "C": 14})
    for column, text in zip("BCD", ("Input", "Value", "Unit"), strict=True):
        sheet[f"{column}4"] = text
        sheet[f"{column}4"].font = STRONG
    for row, label, value, number_format, unit in INPUTS:
        sheet[f"B{row}"] = label
        _put(sheet, f"C{row}", value, number_format)
        if unit:
            sheet[f"D{row}"] = unit


def _operations(sheet: Worksheet) -> None:
    _head(sheet, "Operations", {"B": 36, "C": 12} | dict.fromkeys(YEARS, 12.0))
    sheet["B2"] = "Valuation date"
    _put(sheet, "C2", "=DATE(2025,12,31)", "yyyy\\-mm\\-dd")
    for row, label, first, number_format, later in OPERATIONS:
        sheet[f"B{row}"] = label
        for before, column in zip("C" + YEARS, YEARS, strict=False):
            formula = first if later is None or column == YEARS[0] else later
            _put(sheet, f"{column}{row}", formula.format(c=column, p=before), number_format)


def _valuation(sheet: Worksheet) -> None:
    _head(sheet, "Valuation", {"B": 36, "C": 12} | dict.fromkeys(YEARS, 12.0))
    for row, label, formula, number_format in VALUATION_BY_YEAR:
        sheet[f"B{row}"] = label
        for column in YEARS:
            _put(sheet, f"{column}{row}", formula.format(c=column), number_format)
    for row, label, value, number_format in VALUATION:
        sheet[f"B{row}"] = label
        _put(sheet, f"D{row}", value, number_format)
    for column in "BD":
        sheet[f"{column}30"].font = STRONG


def _market(sheet: Worksheet) -> None:
    _head(sheet, "Market", {"A": 24})
    for row, label, value, number_format, unit in MARKET:
        sheet[f"A{row}"] = label
        _put(sheet, f"B{row}", value, number_format)
        sheet[f"C{row}"] = unit


if __name__ == "__main__":
    build().save(TARGET)
    recalculate(TARGET)
