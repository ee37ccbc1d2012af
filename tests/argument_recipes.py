"""Sensible arguments for every function of the registry, by the names and kinds of its parameters.

A new function needs no entry here as long as its parameters are named as those of its relatives or
do with what their kind gives; `OVERRIDES` holds whole calls for the few that do not.
"""

from __future__ import annotations

from dataclasses import dataclass

from cellsim.functions.registry import ArgumentKind, FunctionRecord

FLOWS = "K1:K4"
SORTED = "J1:J4"
DATES = "L1:L4"
NUMBERS = "F1:F4"
RANGES = ("F1:F4", "G1:G4", "H1:H4", "I1:I4", "M1:M4", "J1:J4")
"""Numbers; text and numbers mixed; errors in some draws; numbers in text; flags; the same in all draws."""

CELLS: dict[str, object] = {
    "A1": 1, "A2": 2, "A3": 3, "A4": 0.25,
    "F1": "=3+A4", "F2": "=A1*2", "F3": 5.5, "F4": "=A2+1",
    "G1": '=IF(A1>0.5,"text",A1)', "G2": '=IF(A1>1,"",A4)', "G3": "=A1>0", "G4": "=A2",
    "H1": "=A1", "H2": "=IF(A1>2,NA(),A1)", "H3": "=1/A2", "H4": 4,
    "I1": '=A2&""', "I2": 3, "I3": '=TEXT(A1,"0.0")', "I4": "=A2",
    "J1": 1, "J2": 2, "J3": 3, "J4": 4,
    "K1": "=-100-A4*5", "K2": "=40+A4", "K3": "=45+A2", "K4": 50,
    "L1": "=45000+A2", "L2": "=45100+A2", "L3": 45300, "L4": "=45500+A2*2",
    "M1": "=A1>0", "M3": "x", "M4": "=A2>1",
    "O1": "=0.02+A4/100", "O2": 0.03, "O3": "=0.04+A4/50", "O4": 0.05,
    "P1": "=2+A4", "P2": 1, "Q1": 1, "Q2": "=3+A2/10",
    "S1": "=1/A2>0", "S2": "=IF(A1>0,1/A2>1,A2)", "S3": "=IF(1/A2>0,A1,\"low\")", "S4": "=A1=A2",
    "R1": "apple", "R2": '=IF(A1>0,"pear","plum")', "R3": '="a"&A2', "R4": 7,
}  # fmt: skip
"""The cells that all models share; A1 to A4 are uncertain, what depends on them as well."""

_BY_NAME: dict[str, str] = {
    # finance
    "rate": "0.06", "bond_yield": "0.05", "periods": "12", "period": "3", "present": "1000", "paid": "-100",
    "future": "500", "nominal": "0.06", "effective": "0.06", "cost": "10000", "salvage": "1000", "life": "10",
    "months": "6", "factor": "2", "guess": "0.1", "finance_rate": "0.08", "reinvestment_rate": "0.1",
    "principal": "1000", "rates": "O1:O4", "flows": FLOWS, "dates": DATES, "frequency": "2", "basis": "1",
    "settlement": "45000", "maturity": "45300", "issue": "44800", "first_coupon": "45200",
    "last_coupon": "44900", "price": "95.25", "redemption": "100", "par": "1000", "discount": "0.05",
    "invested": "95", "bought": "44000", "first_end": "44100", "fraction": "16",
    # dates
    "date": "45000", "time": "0.6", "start": "2", "end": "5", "year": "2024", "month": "2", "day": "28",
    "hour": "5", "minute": "40", "second": "30", "days": "10", "unit": '"m"', "holidays": DATES, "weekend": "1",
    # statistics
    "probability": "0.4", "share": "0.4", "quarter": "1", "alpha": "0.05", "size": "3", "deviation": "1.5",
    "mean": "0.5", "place": "2", "numbers": NUMBERS, "probabilities": "{0.2;0.3;0.1;0.4}",
    "known_y": NUMBERS, "known_x": SORTED, "new_x": SORTED, "low": "1", "high": "3",
    # rounding, trigonometry
    "significance": "0.5", "multiple": "0.5", "divisor": "3", "digits": "1", "decimals": "1", "mode": "1",
    "angle": "0.7", "base": "2", "exponent": "3", "number": "0.7", "coefficients": NUMBERS,
    # text
    "text": '"ab12,cd"', "wanted": '"b"', "old": '"b"', "new": '"xy"', "which": "1", "times": "3", "count": "2",
    "pattern": '"[a-z]+"', "number_format": '"0.00"', "separator": '","', "code": "65", "decimal": '"."',
    "group": '","', "form": "0", "ignore_case": "0", "left": '"ab"', "right": '"cd"', "texts": "R1:R4",
    # references, conditions
    "where": NUMBERS, "criterion": '">2"', "table": "J1:L4", "key": "2", "values": SORTED, "results": NUMBERS,
    "row": "2", "column": "1", "columns": "1", "rows": "2", "area": "1", "index": "2", "cell": "F1",
    "condition": "TRUE", "sheet": '"Sheet1"', "target": '"top"', "matrix": "P1:Q2", "ranges": NUMBERS,
    "search": "1", "kind": "0", "ignore": "0",
}  # fmt: skip

_BY_KIND: dict[ArgumentKind, str] = {
    ArgumentKind.NUMBER: "2.5",
    ArgumentKind.WHOLE: "2",
    ArgumentKind.TEXT: '"ab12"',
    ArgumentKind.LOGICAL: "TRUE",
    ArgumentKind.SCALAR: "2",
    ArgumentKind.ANY_SCALAR: "2",
    ArgumentKind.NUMBER_ITEMS: NUMBERS,
    ArgumentKind.VALUES: NUMBERS,
    ArgumentKind.ARRAY_VALUES: NUMBERS,
    ArgumentKind.MATRIX: "P1:Q2",
    ArgumentKind.OPERAND: "F1",
    ArgumentKind.CELL_AREA: NUMBERS,
    ArgumentKind.LAZY: "A4",
    ArgumentKind.FUNCTION: "LAMBDA(x,SUM(x)+A4)",
}
_RANGE_KINDS = frozenset(
    {
        ArgumentKind.NUMBER_ITEMS,
        ArgumentKind.VALUES,
        ArgumentKind.ARRAY_VALUES,
        ArgumentKind.MATRIX,
        ArgumentKind.OPERAND,
        ArgumentKind.CELL_AREA,
    }
)

OVERRIDES: dict[str, list[str]] = {
    "ACCRINT": ["44800", "45200", "45000", "0.06", "1000", "2", "1", "TRUE"],
    "ACOSH": ["1.7"],
    "ACOTH": ["1.7"],
    "AMORDEGRC": ["10000", "44000", "44100", "1000", "2", "0.15", "1"],
    "AMORLINC": ["10000", "44000", "44100", "1000", "2", "0.15", "1"],
    "ARABIC": ['"XIV"'],
    "AVERAGEIFS": [NUMBERS, SORTED, '">1"', "F1:F4", '"<>5"'],
    "CELL": ['"row"', "F2"],
    "CHAR": ["66"],
    "CHOOSE": ["2", "A4", '"two"', "1/A2"],
    "COMBIN": ["8", "3"],
    "COMBINA": ["8", "3"],
    "COUNTIFS": [NUMBERS, '">2"', SORTED, '"<4"'],
    "CUMIPMT": ["0.06", "12", "1000", "2", "5", "0"],
    "CUMPRINC": ["0.06", "12", "1000", "2", "5", "0"],
    "DATEDIF": ["45000", "45500", '"m"'],
    "DATEVALUE": ['"2024-03-05"'],
    "DAYS": ["45200", "45000"],
    "DAYS360": ["45000", "45200", "FALSE"],
    "DURATION": ["45000", "46000", "0.06", "0.05", "2", "1"],
    "FORMULATEXT": ["F1"],
    "FREQUENCY": [NUMBERS, SORTED],
    "GCD": ["12", "18"],
    "GEOMEAN": ["O1:O4", "2"],
    "HARMEAN": ["O1:O4", "2"],
    "HLOOKUP": ["1", "J1:L4", "2", "TRUE"],
    "HYPERLINK": ['"top"', "A4"],
    "IF": ["A1>0", "A4", "1/A2"],
    "IFERROR": ["1/A2", "A4"],
    "IFNA": ["IF(A1>0,NA(),A2)", "A4"],
    "IFS": ["A1>1", "A4", "A1>0", '"some"', "TRUE", "1/A2"],
    "INDEX": [NUMBERS, "2", "1"],
    "INDIRECT": ['"F"&2', "TRUE"],
    "INFO": ['"numfile"'],
    "LCM": ["4", "6"],
    "LOOKUP": ["2", SORTED, NUMBERS],
    "MAKEARRAY": ["2", "2", "LAMBDA(r,c,r*c+A4)"],
    "MAP": [NUMBERS, SORTED, "LAMBDA(x,y,x*y)"],
    "MATCH": ["2", SORTED, "1"],
    "MAXIFS": [NUMBERS, SORTED, '">1"', "F1:F4", '"<>5"'],
    "MDURATION": ["45000", "46000", "0.06", "0.05", "2", "1"],
    "MINIFS": [NUMBERS, SORTED, '">1"', "F1:F4", '"<>5"'],
    "MIRR": [FLOWS, "0.08", "0.1"],
    "MMULT": ["P1:Q2", "P1:Q2"],
    "MODE": ["H1:H1", "2", "2"],
    "MODE.MULT": ["J1:J4", "2", "3", "3"],
    "MODE.SNGL": ["J1:J4", "2"],
    "MULTINOMIAL": ["2", "3"],
    "NETWORKDAYS": ["45000", "45100", DATES],
    "NETWORKDAYS.INTL": ["45000", "45100", "1", DATES],
    "NUMBERVALUE": ['"1,234.5"', '"."', '","'],
    "ODDFPRICE": ["44900", "46296", "44800", "45200", "0.06", "0.05", "100", "2", "1"],
    "ODDFYIELD": ["44900", "46296", "44800", "45200", "0.06", "98", "100", "2", "1"],
    "ODDLPRICE": ["45000", "45100", "44900", "0.06", "0.05", "100", "2", "1"],
    "ODDLYIELD": ["45000", "45100", "44900", "0.06", "98", "100", "2", "1"],
    "OFFSET": ["F1", "1", "0", "1", "1"],
    "PERCENTRANK": [SORTED, "2.5", "3"],
    "PERCENTRANK.EXC": [SORTED, "2.5", "3"],
    "PERCENTRANK.INC": [SORTED, "2.5", "3"],
    "PERMUT": ["8", "3"],
    "PERMUTATIONA": ["8", "3"],
    "PRICE": ["45000", "46000", "0.06", "0.05", "100", "2", "1"],
    "PRICEMAT": ["45000", "45300", "44800", "0.06", "0.05", "1"],
    "PROB": [SORTED, "{0.2;0.3;0.1;0.4}", "1", "3"],
    "RANK": ["5.5", NUMBERS, "FALSE"],
    "RANK.AVG": ["5.5", NUMBERS, "FALSE"],
    "RANK.EQ": ["5.5", NUMBERS, "FALSE"],
    "RATE": ["12", "-100", "1000", "0", "0", "0.1"],
    "REDUCE": ["1", NUMBERS, "LAMBDA(a,x,a+x)"],
    "ROMAN": ["14", "0"],
    "SCAN": ["1", NUMBERS, "LAMBDA(a,x,a+x)"],
    "SERIESSUM": ["0.5", "0", "1", NUMBERS],
    "SUBTOTAL": ["9", NUMBERS],
    "SUMIFS": [NUMBERS, SORTED, '">1"', "F1:F4", '"<>5"'],
    "SWITCH": ["A2", "1", "A4", "2", '"two"', "1/A1"],
    "TBILLEQ": ["45000", "45100", "0.05"],
    "TBILLPRICE": ["45000", "45100", "0.05"],
    "TBILLYIELD": ["45000", "45100", "98"],
    "TEXT": ["12.5", '"0.00"'],
    "TIMEVALUE": ['"13:45"'],
    "TRIMMEAN": [NUMBERS, "0.5"],
    "VALUE": ['"12.5"'],
    "VLOOKUP": ["2", "J1:L4", "2", "TRUE"],
    "WEEKDAY": ["45000", "2"],
    "WEEKNUM": ["45000", "2"],
    "WORKDAY": ["45000", "10", DATES],
    "WORKDAY.INTL": ["45000", "10", "1", DATES],
    "XIRR": [FLOWS, DATES, "0.1"],
    "XLOOKUP": ["2", SORTED, NUMBERS, "A4", "0", "1"],
    "XNPV": ["0.08", FLOWS, DATES],
    "YEARFRAC": ["45000", "45500", "1"],
    "YIELD": ["45000", "46000", "0.06", "98", "100", "2", "1"],
}
"""By function: arguments that stand for a sensible call, ranges from `CELLS`."""


@dataclass(frozen=True)
class Sample:
    """A call to test.

    Attributes:
        label: What is uncertain about it.
        formula: The formula.
        area: Where it stands if it is an array formula, from its own cell: rows and columns.
    """

    label: str
    formula: str
    area: tuple[int, int] | None = None


def base_arguments(function: FunctionRecord) -> list[str]:
    """Arguments of a sensible call."""
    if function.name in OVERRIDES:
        return list(OVERRIDES[function.name])
    arguments: list[str] = []
    for parameter in function.parameters:
        text = _BY_NAME.get(parameter.name, _BY_KIND[parameter.kind])
        if parameter.kind in _RANGE_KINDS or ":" not in text:
            arguments += [text] * (function.group if parameter.variadic else 1)
        else:
            arguments.append(_BY_KIND[parameter.kind])
    while len(arguments) < function.least:
        arguments.append(arguments[-1])
    return arguments[: function.most]


def _moved(argument: str) -> dict[str, str]:
    """Uncertain cells in place of a fixed argument, by label."""
    try:
        float(argument)
        near = f"={argument}+A4"
    except ValueError:
        near = f"={argument}"
    plain = near[1:]
    found = {
        "near": near,
        "wild": "=A3",
        "whole": "=A2",
        "text in some draws": f'=IF(A1>0.5,"text",{plain})',
        "#N/A in some draws": f"=IF(A1>1,NA(),{plain})",
        "#DIV/0! in some draws": f"=IF(A2>1,{plain},1/A2)",
        "empty text in some draws": f'=IF(A1>1,"",{plain})',
        "flag": "=A1>0",
        "flag in some draws": f"=IF(A1>0,A1>1,{plain})",
        "number in text": f'=({plain})&""',
    }
    if argument.startswith('"'):
        found["text of two"] = f'=IF(A1>0,{plain},"b")'
        found["text and number"] = f"={plain}&A2"
    return found


def samples(function: FunctionRecord) -> tuple[dict[str, object], list[Sample]]:
    """The cells of a model and the calls to test in it."""
    cells = dict(CELLS)
    name = function.name
    base = base_arguments(function)
    places = [p for p, text in enumerate(base) if not is_cells(text) and not is_code(text)]
    near: dict[int, str] = {}
    found = [Sample("fixed", _call(name, base))]
    for place in places:
        for label, formula in _moved(base[place]).items():
            address = f"T{len(cells)}"
            cells[address] = formula
            if label == "near":
                near[place] = address
            found.append(_changed(name, base, place, address, f"argument {place + 1}: {label}"))
    for place, text in enumerate(base):
        if is_cells(text):
            found += _other_cells(name, base, place, text)
    all_near = [near.get(place, text) for place, text in enumerate(base)]
    found.append(Sample("all near", _call(name, all_near)))
    found.append(Sample("all near, inside", _call(name, [_inside(text) for text in base])))
    found.append(Sample("fewest arguments", _call(name, all_near[: function.least])))
    if len(base) > 1:
        found.append(Sample("an argument left out", _call(name, [*all_near[:-1], ""])))
    if not function.volatile:
        found.append(Sample("spilt", _call(name, all_near), (2, 2)))
    for place in places[:2]:
        for other in ("F1:F4", "G1:G4", "H1:H4"):
            label = f"argument {place + 1}: each of {other}"
            found.append(_changed(name, all_near, place, other, label, (2, 1)))
    return cells, found


def _changed(  # the call with one argument replaced
    name: str,
    arguments: list[str],
    place: int,
    argument: str,
    label: str,
    area: tuple[int, int] | None = None,
) -> Sample:
    changed = [*arguments[:place], argument, *arguments[place + 1 :]]
    return Sample(label, _call(name, changed), area)


def _other_cells(name: str, base: list[str], place: int, text: str) -> list[Sample]:
    """The call with other cells in place of a cell or range, and with arrays of its cells."""
    which = f"argument {place + 1}"
    if ":" not in text:
        return [_changed(name, base, place, o, f"{which}: {o}") for o in ("G1", "H2", "M2")]
    found = [_changed(name, base, place, other, f"{which}: {other}") for other in RANGES]
    either = f"IF(A1>0,{text},{text}*2)"
    found.append(_changed(name, base, place, either, f"{which}: one of two ranges"))
    found.append(_changed(name, base, place, f"-{text}", f"{which}: an array", (2, 2)))
    return found


def is_cells(text: str) -> bool:
    """Whether an argument is a cell or a range."""
    head = text.split(":", maxsplit=1)[0]
    return 2 <= len(head) <= 3 and head[0].isalpha() and head[1:].isdigit()


def is_code(text: str) -> bool:
    """Whether an argument is a function or an array as written."""
    return text.startswith(("LAMBDA", "{"))


def _inside(text: str) -> str:
    try:
        float(text)
    except ValueError:
        return text
    return f"{text}+A4"


def _call(name: str, arguments: list[str]) -> str:
    return f"={name}({','.join(arguments)})"
