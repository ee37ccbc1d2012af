"""Builds the sample of a solar park's project finance: `python sample_workbooks/build/brennhalde_solar.py`.

Brennhalde Solar is an invented company; all figures are invented. Interest is charged on the average
of a month's opening and closing balance, and the closing balance depends on that interest, so the model is
circular on purpose and its workbook allows iteration.
"""

from __future__ import annotations

from pathlib import Path

from openpyxl import Workbook
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.workbook.properties import CalcProperties
from openpyxl.worksheet.worksheet import Worksheet
from recalculate import recalculate

MODEL = Path(__file__).parents[1] / "brennhalde_solar.xlsx"
MONTHS = 326
FIRST = 6
LAST = FIRST + MONTHS - 1
FIRST_YEAR, YEARS = 2026, 28

TITLE = Font(bold=True, size=14, color="1F3A4D")
BOLD = Font(bold=True)
HEADING = PatternFill("solid", fgColor="DDE6EA")
INPUT = PatternFill("solid", fgColor="FBF3DC")
LINE = Border(bottom=Side(style="thin", color="8FA3AD"))

# Row, label, value or formula, number format, unit, note.
INPUTS: list[tuple[int, str, object, str, str, str]] = [
    (5, "Power price scenario (1 low, 2 central, 3 high)", 2, "0", "", "Chooses among rows 21 to 23"),
    (6, "First month of construction ends", "=DATE(2026,7,31)", "yyyy-mm-dd", "", ""),
    (7, "Months of construction as planned", 14, "0", "months", ""),
    (8, "Delay of the start", 0, "0", "months", "Stretches construction"),
    (9, "Months of construction", "=C7+C8", "0", "months", ""),
    (10, "Years of operation", 25, "0", "years", ""),
    (12, "Capacity", 48, "#,##0.0", "MWp", ""),
    (13, "Specific yield", 1120, "#,##0", "kWh/kWp a year", "Median of two yield reports"),
    (14, "Availability", 0.985, "0.0%", "", ""),
    (15, "Degradation", 0.004, "0.00%", "a year", ""),
    (16, "Losses up to the meter", 0.018, "0.0%", "", ""),
    (18, "Fixed tariff in the first year", 74.5, "0.00", "EUR/MWh", ""),
    (19, "Term of the fixed tariff", 15, "0", "years", ""),
    (20, "Indexation of the tariff", 0.01, "0.0%", "a year", ""),
    (21, "Market price, low", 44, "0.00", "EUR/MWh", "Money of the first month"),
    (22, "Market price, central", 53, "0.00", "EUR/MWh", ""),
    (23, "Market price, high", 62, "0.00", "EUR/MWh", ""),
    (24, "Market price in the chosen scenario", "=CHOOSE(C5,C21,C22,C23)", "0.00", "EUR/MWh", ""),
    (25, "Growth of the market price", 0.016, "0.0%", "a year", ""),
    (27, "Construction cost", 31200, "#,##0", "EUR thousand", ""),
    (28, "Operation and maintenance", 8.2, "0.00", "EUR/kWp a year", ""),
    (29, "Land lease", 210, "#,##0", "EUR thousand a year", ""),
    (30, "Insurance, share of construction cost", 0.0028, "0.00%", "a year", ""),
    (31, "Management", 145, "#,##0", "EUR thousand a year", ""),
    (32, "Cost inflation", 0.02, "0.0%", "a year", ""),
    (33, "New inverters", 620, "#,##0", "EUR thousand", "Money of the first month"),
    (34, "Year of the new inverters", 13, "0", "", ""),
    (36, "Debt share of construction cost", 0.65, "0.0%", "", ""),
    (37, "Base rate", 0.029, "0.00%", "a year", ""),
    (38, "Margin", 0.0175, "0.00%", "a year", ""),
    (39, "Commitment fee on what is not drawn", 0.006, "0.00%", "a year", ""),
    (40, "Loan term from the start of operation", 18, "0", "years", ""),
    (41, "Share of cash before tax swept to the loan", 0.12, "0.0%", "", "What makes the model circular"),
    (42, "Reserve, months of debt service", 6, "0", "months", ""),
    (43, "Reserve paid in by shareholders", 1450, "#,##0", "EUR thousand", ""),
    (44, "Lowest debt service cover allowed", 1.15, "0.00", "", "Covenant"),
    (46, "Tax rate", 0.27, "0.0%", "", ""),
    (47, "Depreciation", 20, "0", "years", "Straight line"),
    (48, "Customers pay after", 30, "0", "days", ""),
    (49, "Suppliers are paid after", 45, "0", "days", ""),
    (50, "Cash kept in hand", 150, "#,##0", "EUR thousand", "Carries the winter months"),
    (52, "Cost of equity", 0.075, "0.0%", "a year", ""),
    (53, "Project discount rate", 0.055, "0.0%", "a year", ""),
]  # fmt: skip

PROFILE = [0.028, 0.046, 0.083, 0.112, 0.129, 0.134, 0.135, 0.118, 0.091, 0.062, 0.036, 0.026]

# Row of the sheet Monthly: label, unit, formula (c: this column, p: the one before), format, total.
# A first-month formula of its own follows where there is no month before.
ROWS: dict[int, tuple[str, str, str, str, str | None, str | None]] = {
    4: ("Month ends", "", "=EOMONTH({p}4,1)", "mmm yy", None, "=Inputs!$C$6"),
    5: ("Month number", "", "={p}5+1", "0", None, "=1"),
    6: ("Year", "", "=YEAR({c}4)", "0", None, None),
    7: ("Under construction", "flag", "=IF({c}5<=Inputs!$C$9,1,0)", "0", "sum", None),
    8: ("Month of operation", "", "=IF(AND({c}5>Inputs!$C$9,{c}5<=Inputs!$C$9+12*Inputs!$C$10),{c}5-Inputs!$C$9,0)", "0", None, None),
    9: ("Year of operation", "", "=ROUNDUP({c}8/12,0)", "0", None, None),
    10: ("In operation", "flag", "=IF({c}8>0,1,0)", "0", "sum", None),
    11: ("Cost index", "", "=(1+Inputs!$C$32)^(({c}5-1)/12)", "0.000", None, None),
    13: ("Energy sold", "MWh", "={c}10*Inputs!$C$12*Inputs!$C$13*INDEX(Inputs!$H$5:$H$16,MONTH({c}4))*Inputs!$C$14*(1-Inputs!$C$16)*(1-Inputs!$C$15)^MAX({c}9-1,0)", "#,##0", "sum", None),
    14: ("Fixed tariff applies", "flag", "=IF(AND({c}8>0,{c}8<=12*Inputs!$C$19),1,0)", "0", "sum", None),
    15: ("Fixed tariff", "EUR/MWh", "=Inputs!$C$18*(1+Inputs!$C$20)^MAX({c}9-1,0)", "0.00", None, None),
    16: ("Market price", "EUR/MWh", "=Inputs!$C$24*(1+Inputs!$C$25)^(({c}5-1)/12)", "0.00", None, None),
    17: ("Price", "EUR/MWh", "=IF({c}14=1,{c}15,{c}16)", "0.00", None, None),
    18: ("Revenue", "EUR thousand", "={c}13*{c}17/1000", "#,##0", "sum", None),
    19: ("Operation and maintenance", "EUR thousand", "={c}10*Inputs!$C$12*Inputs!$C$28/12*{c}11", "#,##0", "sum", None),
    20: ("Land lease", "EUR thousand", "={c}10*Inputs!$C$29/12*{c}11", "#,##0", "sum", None),
    21: ("Insurance", "EUR thousand", "={c}10*Inputs!$C$30*Inputs!$C$27/12*{c}11", "#,##0", "sum", None),
    22: ("Management", "EUR thousand", "={c}10*Inputs!$C$31/12*{c}11", "#,##0", "sum", None),
    23: ("Operating cost", "EUR thousand", "=SUM({c}19:{c}22)", "#,##0", "sum", None),
    24: ("Operating profit before depreciation", "EUR thousand", "={c}18-{c}23", "#,##0", "sum", None),
    25: ("New inverters", "EUR thousand", "=IF({c}8=12*Inputs!$C$34-11,Inputs!$C$33*{c}11,0)", "#,##0", "sum", None),
    26: ("Working capital", "EUR thousand", "={c}18*Inputs!$C$48/30-{c}23*Inputs!$C$49/30", "#,##0", None, None),
    27: ("Change in working capital", "EUR thousand", "={c}26-{p}26", "#,##0", "sum", "={c}26"),
    29: ("Share built at the month's end", "", "=IF({c}7=1,3*({c}5/Inputs!$C$9)^2-2*({c}5/Inputs!$C$9)^3,1)", "0.0%", None, None),
    30: ("Construction spending", "EUR thousand", "=Inputs!$C$27*({c}29-{p}29)", "#,##0", "sum", "=Inputs!$C$27*{c}29"),
    31: ("Loan drawn", "EUR thousand", "=Inputs!$C$36*{c}30", "#,##0", "sum", None),
    32: ("Loan at the start", "EUR thousand", "={p}39", "#,##0", None, "=0"),
    33: ("Interest on the average balance", "EUR thousand", "=(Inputs!$C$37+Inputs!$C$38)/12*({c}32+{c}39)/2", "#,##0.0", "sum", None),
    34: ("Commitment fee", "EUR thousand", "={c}7*Inputs!$C$39/12*MAX(0,Inputs!$C$36*Inputs!$C$27*(1-{c}29))", "#,##0.0", "sum", None),
    35: ("Interest and fee added to the loan", "EUR thousand", "={c}7*({c}33+{c}34)", "#,##0.0", "sum", None),
    36: ("Repayment as agreed", "EUR thousand", "=IF(AND({c}8>0,{c}8<=12*Inputs!$C$40),{c}32/(12*Inputs!$C$40-{c}8+1),0)", "#,##0.0", "sum", None),
    37: ("Cash before tax after debt service", "EUR thousand", "={c}10*({c}24-{c}25-{c}27-{c}33-{c}36)", "#,##0.0", "sum", None),
    38: ("Cash swept to the loan", "EUR thousand", "=MIN({c}32-{c}36,MAX(0,Inputs!$C$41*{c}37))", "#,##0.0", "sum", None),
    39: ("Loan at the end", "EUR thousand", "={c}32+{c}31+{c}35-{c}36-{c}38", "#,##0", None, None),
    41: ("Depreciation", "EUR thousand", "=IF(AND({c}8>0,{c}8<=12*Inputs!$C$47),(Inputs!$C$27+$D$35)/(12*Inputs!$C$47),0)", "#,##0.0", "sum", None),
    42: ("Profit before tax", "EUR thousand", "={c}24-{c}41-{c}25-{c}10*{c}33", "#,##0.0", "sum", None),
    43: ("Losses at the start", "EUR thousand", "={p}43+{p}44-{p}45", "#,##0", None, "=0"),
    44: ("Loss made", "EUR thousand", "=MAX(-{c}42,0)", "#,##0.0", "sum", None),
    45: ("Losses used", "EUR thousand", "=MIN({c}43,MAX({c}42,0))", "#,##0.0", "sum", None),
    46: ("Tax", "EUR thousand", "=Inputs!$C$46*(MAX({c}42,0)-{c}45)", "#,##0.0", "sum", None),
    49: ("Cash flow available for debt service", "EUR thousand", "={c}24-{c}25-{c}27-{c}46", "#,##0.0", "sum", None),
    50: ("Debt service as agreed", "EUR thousand", "={c}10*({c}33+{c}36)", "#,##0.0", "sum", None),
    51: ("Cash at the start", "EUR thousand", "={p}56", "#,##0", None, "=0"),
    52: ("Cash before distribution", "EUR thousand", "={c}51+{c}49-{c}50-{c}38+IF({c}5=Inputs!$C$9,Inputs!$C$43,0)", "#,##0.0", None, None),
    53: ("Reserve to be kept", "EUR thousand", "=IF({c}7=1,Inputs!$C$43,MAX({c}10*Inputs!$C$50,IF({c}39>0.5,Inputs!$C$42*{c}50,0)))", "#,##0.0", None, None),
    54: ("Distribution", "EUR thousand", "=MAX(0,{c}52-{c}53)", "#,##0.0", "sum", None),
    55: ("Shortfall paid in by shareholders", "EUR thousand", "=MAX(0,-{c}52)", "#,##0.0", "sum", None),
    56: ("Cash at the end", "EUR thousand", "={c}52-{c}54+{c}55", "#,##0.0", None, None),
    58: ("Paid in by shareholders", "EUR thousand", "={c}30-{c}31+IF({c}5=Inputs!$C$9,Inputs!$C$43,0)+{c}55", "#,##0.0", "sum", None),
    59: ("Shareholders' cash flow", "EUR thousand", "={c}54-{c}58", "#,##0.0", "sum", None),
    60: ("Shareholders' cash flow so far", "EUR thousand", "={p}60+{c}59", "#,##0", None, "={c}59"),
    61: ("Project cash flow after tax", "EUR thousand", "={c}49-{c}30", "#,##0.0", "sum", None),
    63: ("Debt service cover, twelve months", "", '=IF(AND({c}8>=12,{c}32>0.5),SUM({far}49:{c}49)/SUM({far}50:{c}50),"")', "0.00", None, '=""'),
    64: ("Cover below the covenant", "flag", "=IF(ISNUMBER({c}63),IF({c}63<Inputs!$C$44,1,0),0)", "0", "sum", None),
    65: ("Within the term of the loan", "flag", "=IF(AND({c}8>0,{c}8<=12*Inputs!$C$40),1,0)", "0", "sum", None),
    66: ("Discount factor at the loan's rate", "", "=IF({c}8>0,{p}66/(1+(Inputs!$C$37+Inputs!$C$38)/12),1)", "0.000", None, "=1"),
    68: ("Plant at book value", "EUR thousand", "={p}68+{c}30+{c}35-{c}41", "#,##0", None, "={c}30+{c}35-{c}41"),
    69: ("Shareholders' funds", "EUR thousand", "={p}69+{c}58-{c}54+{c}42-{c}46", "#,##0", None, "={c}58-{c}54+{c}42-{c}46"),
    70: ("Assets less loan and shareholders' funds", "must be 0", "=ROUND({c}68+{c}26+{c}56-{c}39-{c}69,6)", "0", None, None),
}  # fmt: skip
SECTIONS = {
    3: "Timing", 12: "Operation", 28: "Construction and loan", 40: "Tax", 48: "Cash", 57: "Shareholders and project",
    62: "Cover", 67: "Balance sheet",
}  # fmt: skip


def heading(sheet: Worksheet, text: str, note: str) -> None:
    """A sheet's title and what it shows."""
    sheet["A1"] = text
    sheet["A1"].font = TITLE
    sheet["A2"] = note
    sheet["A2"].font = Font(italic=True, color="5B6B74")


def fill_guide(sheet: Worksheet) -> None:
    """What the workbook is, and the caution."""
    heading(
        sheet,
        "Brennhalde Solar: project finance by month",
        "An invented company with invented figures, made to try cellsim on.",
    )
    lines = [
        "Inputs: every number that may be changed, on a pale ground, with a price scenario and a delay of the start.",
        "Monthly: construction, then twenty-five years of operation, one formula a row; loan, tax, cash, shareholders, balance sheet.",
        "Annual: the months summed by calendar year.",
        "Returns: internal rates of return, present values, debt service cover, payback, and checks that must be zero.",
        "Interest is charged on the average of a month's opening and closing loan. The closing loan depends on the cash sweep and on",
        "interest added during construction, so that the month is circular; the workbook allows iteration (100 passes, change 1E-9).",
        "Amounts are in thousand EUR unless a unit says otherwise.",
        "The figures are no advice to buy, sell or lend. For a real decision ask licensed professionals and observe the local rules.",
    ]
    for place, line in enumerate(lines):
        sheet.cell(4 + place, 1, line).alignment = Alignment(wrap_text=True, vertical="top")
    sheet.column_dimensions["A"].width = 110


def fill_inputs(sheet: Worksheet) -> None:
    """Labels in B, values in C, units in D, notes in E; the monthly profile in G and H."""
    heading(sheet, "Inputs", "Change the numbers on a pale ground; the others are formulas.")
    for column, text in zip("BCDE", ("Input", "Value", "Unit", "Note"), strict=True):
        sheet[f"{column}4"] = text
    for row, label, value, code, unit, note in INPUTS:
        sheet[f"B{row}"], sheet[f"C{row}"] = label, value
        sheet[f"D{row}"], sheet[f"E{row}"] = unit or None, note or None
        sheet[f"D{row}"].alignment = Alignment(horizontal="left", indent=1)
        sheet[f"C{row}"].number_format = code
        if not isinstance(value, str) or value.startswith("=DATE"):
            sheet[f"C{row}"].fill = INPUT
    for row, text in {
        11: "Plant",
        17: "Prices",
        26: "Costs",
        35: "Loan",
        45: "Tax and payment terms",
        51: "Valuation",
    }.items():
        sheet[f"B{row}"] = text
        sheet[f"B{row}"].font = BOLD
    sheet["G4"], sheet["H4"] = "Month", "Share of the year's yield"
    for month, share in enumerate(PROFILE, start=1):
        sheet.cell(4 + month, 7, month)
        cell = sheet.cell(4 + month, 8, share)
        cell.number_format, cell.fill = "0.0%", INPUT
    sheet["G17"], sheet["H17"] = "Sum", "=SUM(H5:H16)"
    sheet["H17"].number_format = "0.0%"
    for column in "BCDEGH":
        sheet[f"{column}4"].font, sheet[f"{column}4"].fill = BOLD, HEADING
    for column, width in {
        "A": 3,
        "B": 48,
        "C": 14,
        "D": 22,
        "E": 32,
        "F": 3,
        "G": 9,
        "H": 26,
    }.items():
        sheet.column_dimensions[column].width = width
    sheet.freeze_panes = "C5"


def fill_monthly(sheet: Worksheet) -> None:
    """One formula a row, filled across the months; totals in D."""
    heading(sheet, "Monthly", "One formula a row, filled across.")
    sheet["D3"] = "Total"
    for row, text in SECTIONS.items():
        sheet.cell(row, 1, text).font = BOLD
        for column in range(1, LAST + 1):
            sheet.cell(row, column).fill = HEADING
    for row, (label, unit, formula, code, total, first) in ROWS.items():
        sheet.cell(row, 1, label)
        sheet.cell(row, 3, unit or None)
        if total == "sum":
            cell = sheet.cell(
                row, 4, f"=SUM({get_column_letter(FIRST)}{row}:{get_column_letter(LAST)}{row})"
            )
            cell.number_format, cell.font = "#,##0", BOLD
        for column in range(FIRST, LAST + 1):
            here, before = get_column_letter(column), get_column_letter(column - 1)
            far = get_column_letter(max(FIRST, column - 11))
            text = first if first is not None and column == FIRST else formula
            cell = sheet.cell(row, column, text.format(c=here, p=before, far=far))
            cell.number_format = code
    sheet.column_dimensions["A"].width = 38
    sheet.column_dimensions["B"].width = 2
    sheet.column_dimensions["C"].width = 14
    sheet.column_dimensions["D"].width = 12
    sheet.column_dimensions["E"].width = 2
    for column in range(FIRST, LAST + 1):
        sheet.column_dimensions[get_column_letter(column)].width = 9.5
    sheet.freeze_panes = "F5"
    sheet.print_title_cols, sheet.print_title_rows = "A:D", "3:4"


ANNUAL = [
    ("Energy sold, MWh", 13, "#,##0"), ("Revenue", 18, "#,##0"), ("Operating cost", 23, "#,##0"),
    ("Operating profit before depreciation", 24, "#,##0"), ("Construction spending", 30, "#,##0"), ("Tax", 46, "#,##0"),
    ("Cash flow for debt service", 49, "#,##0"), ("Debt service as agreed", 50, "#,##0"), ("Cash swept to the loan", 38, "#,##0"),
    ("Shareholders' cash flow", 59, "#,##0"),
]  # fmt: skip


def fill_annual(sheet: Worksheet) -> None:
    """The months summed by calendar year."""
    heading(sheet, "Annual", "Months summed by calendar year, thousand EUR unless said otherwise.")
    first, last = get_column_letter(FIRST), get_column_letter(LAST)
    sheet["A4"] = "Year"
    for place, (label, _, _) in enumerate(ANNUAL, start=2):
        sheet.cell(4, place, label)
    cover, loan = len(ANNUAL) + 2, len(ANNUAL) + 3
    sheet.cell(4, cover, "Debt service cover")
    sheet.cell(4, loan, "Loan at the year's end")
    for year in range(YEARS):
        row = 5 + year
        sheet.cell(row, 1, FIRST_YEAR if year == 0 else f"=A{row - 1}+1").number_format = "0"
        for place, (_, source, code) in enumerate(ANNUAL, start=2):
            formula = f"=SUMIFS(Monthly!${first}${source}:${last}${source},Monthly!${first}$6:${last}$6,$A{row})"
            sheet.cell(row, place, formula).number_format = code
        sheet.cell(row, cover, f'=IF(I{row}>0.5,H{row}/I{row},"")').number_format = "0.00"
        lookup = f"=IFERROR(INDEX(Monthly!${first}$39:${last}$39,MATCH(DATE($A{row},12,31),Monthly!${first}$4:${last}$4,0)),0)"
        sheet.cell(row, loan, lookup).number_format = "#,##0"
    total = 5 + YEARS
    sheet.cell(total, 1, "Total").font = BOLD
    for place in range(2, len(ANNUAL) + 2):
        letter = get_column_letter(place)
        cell = sheet.cell(total, place, f"=SUM({letter}5:{letter}{total - 1})")
        cell.number_format, cell.font = "#,##0", BOLD
    for column in range(1, loan + 1):
        cell = sheet.cell(4, column)
        cell.font, cell.fill = BOLD, HEADING
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        sheet.column_dimensions[get_column_letter(column)].width = 15 if column > 1 else 9
    sheet.row_dimensions[4].height = 44
    sheet.freeze_panes = "B5"


def fill_returns(sheet: Worksheet) -> None:
    """The answers and the checks."""
    heading(sheet, "Returns", "The answers, and checks that must be zero.")
    first, last = get_column_letter(FIRST), get_column_letter(LAST)

    def across(row: int) -> str:
        return f"Monthly!{first}{row}:{last}{row}"

    lines: list[tuple[int, str, str, str, str]] = [
        (4, "Shareholders' rate of return a year", f"=(1+IRR({across(59)},0.006))^12-1", "0.00%", ""),
        (5, "The same by dates", f"=XIRR({across(59)},{across(4)})", "0.00%", ""),
        (6, "Project rate of return a year, after tax", f"=(1+IRR({across(61)},0.005))^12-1", "0.00%", ""),
        (7, "Net present value for shareholders", f"=NPV((1+Inputs!C52)^(1/12)-1,{across(59)})", "#,##0", "EUR thousand"),
        (8, "Net present value of the project", f"=NPV((1+Inputs!C53)^(1/12)-1,{across(61)})", "#,##0", "EUR thousand"),
        (9, "Lowest debt service cover", f"=MIN({across(63)})", "0.00", ""),
        (10, "Average debt service cover", f"=AVERAGE({across(63)})", "0.00", ""),
        (11, "Months with cover below the covenant", "=Monthly!D64", "0", "months"),
        (12, "Largest loan", f"=MAX({across(39)})", "#,##0", "EUR thousand"),
        (13, "Month in which the loan is repaid", f'=IFERROR(INDEX({across(4)},MATCH(1,INDEX(({across(39)}<0.5)*({across(8)}>0),0),0)),"not repaid")', "mmm yyyy", ""),
        (14, "Month in which shareholders have their money back", f'=IFERROR(INDEX({across(4)},MATCH(1,INDEX(({across(60)}>=0)*({across(8)}>0),0),0)),"never")', "mmm yyyy", ""),
        (15, "Lowest cash at a month's end", f"=MIN({across(56)})", "#,##0", "EUR thousand"),
        (16, "Cost of energy, discounted", f"=SUMPRODUCT(({across(23)}+{across(30)}+{across(25)})/(1+Inputs!C53)^({across(5)}/12))/SUMPRODUCT({across(13)}/(1+Inputs!C53)^({across(5)}/12))*1000", "0.00", "EUR/MWh"),
        (17, "Verdict", '=IF(B9<Inputs!C44,"cover breaks the covenant",IF(B7>0,"worth more than it costs","worth less than it costs"))', "General", ""),
        (18, "Loan life cover at the start of operation", f"=SUMPRODUCT({across(49)},{across(65)},{across(66)})/SUMPRODUCT(({across(8)}=1)*{across(32)})", "0.00", ""),
        (20, "Spending less loan drawn less paid in", "=ROUND(Monthly!D30+Inputs!C43+Monthly!D55-Monthly!D31-Monthly!D58,6)", "0", "must be 0"),
        (21, "Loan drawn and added less repaid and swept", f"=ROUND(Monthly!D31+Monthly!D35-Monthly!D36-Monthly!D38-Monthly!{last}39,6)", "0", "must be 0"),
        (22, "Cash in less cash out", f"=ROUND(Monthly!D49+Inputs!C43+Monthly!D55-Monthly!D50-Monthly!D38-Monthly!D54-Monthly!{last}56,6)", "0", "must be 0"),
        (23, "Years against months", "=ROUND(Annual!C33-Monthly!D18,6)", "0", "must be 0"),
        (24, "Yield profile", "=ROUND(Inputs!H17-1,9)", "0", "must be 0"),
        (25, "Balance sheet, all months", f"=SUMPRODUCT(ABS({across(70)}))", "0", "must be 0"),
        (26, "Net present value by discount factors", f"=ROUND(B7-SUMPRODUCT({across(59)}/(1+Inputs!C52)^({across(5)}/12)),6)", "0", "must be 0"),
        (27, "Lowest cash, if below zero", "=MIN(0,ROUND(B15,6))", "0", "must be 0"),
        (28, "All checks hold", "=SUMPRODUCT(ABS(B20:B27))=0", "General", ""),
    ]  # fmt: skip
    sheet["A19"] = "Checks"
    sheet["A19"].font = BOLD
    for row, label, formula, code, unit in lines:
        sheet[f"A{row}"], sheet[f"B{row}"], sheet[f"C{row}"] = label, formula, unit or None
        sheet[f"B{row}"].number_format = code
        sheet[f"B{row}"].alignment = Alignment(horizontal="right")
        sheet[f"C{row}"].alignment = Alignment(horizontal="left", indent=1)
        for column in "ABC":
            sheet[f"{column}{row}"].border = LINE
    for column, width in {"A": 52, "B": 28, "C": 16}.items():
        sheet.column_dimensions[column].width = width


def build() -> Workbook:
    """The workbook, not yet calculated."""
    book = Workbook()
    fill_guide(book.active)
    book.active.title = "Guide"
    fill_inputs(book.create_sheet("Inputs"))
    fill_monthly(book.create_sheet("Monthly"))
    fill_annual(book.create_sheet("Annual"))
    fill_returns(book.create_sheet("Returns"))
    for sheet in book.worksheets:
        sheet.sheet_view.showGridLines = False
        sheet.page_setup.orientation = "landscape"
        if sheet.title == "Monthly":
            sheet.page_setup.scale = 55
        else:
            sheet.sheet_properties.pageSetUpPr.fitToPage = True
    book.defined_names["EquityReturn"] = DefinedName("EquityReturn", attr_text="Returns!$B$4")
    book.calculation = CalcProperties(
        iterate=True, iterateCount=100, iterateDelta=1e-9, fullCalcOnLoad=True
    )
    return book


if __name__ == "__main__":
    build().save(MODEL)
    recalculate(MODEL, rounds=8)
    print(f"{MODEL.name} built and calculated")
