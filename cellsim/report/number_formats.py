"""Number format codes: which are safe to store, and codes made to suit a quantity."""

from __future__ import annotations

import math
import re
from functools import lru_cache

GENERAL = "General"
LONGEST_CODE = 255
PERCENT = "0.0%"
SCIENTIFIC = "0.0000E+00"
COUNT = "#,##0"
_DAYS_OF_CALENDAR = 2_958_466  # the day after 31 December 9999

_TOKEN = re.compile(
    r'(?P<quoted>"[^"]*")'
    r"|(?P<escaped>\\.|_.|\*.)"
    r"|(?P<bracket>\[(?:Black|Blue|Cyan|Green|Magenta|Red|White|Yellow|Color ?(?:[1-9]|[1-4]\d|5[0-6])"
    r"|(?:<=|>=|<>|<|>|=)-?\d+(?:\.\d+)?|\$[^\[\]\x00-\x1f]{0,30}|h{1,2}|m{1,2}|s{1,2})\])"
    r"|(?P<general>General)"
    r"|(?P<noon>AM/PM|A/P)"
    r"|(?P<date>y{1,4}|m{1,5}|d{1,4}|h{1,2}|s{1,2})"
    r"|(?P<exponent>E[-+])"
    r"|(?P<digit>[0#?])"
    r"|(?P<point>\.)"
    r"|(?P<comma>,)"
    r"|(?P<percent>%)"
    r"|(?P<text>@)"
    r"|(?P<section>;)"
    r"|(?P<plain>[-$+/():!^&'~{}<>= €£¥\u00a0])",
    re.IGNORECASE,
)

Token = tuple[str, str]


def _tokens(code: str) -> list[Token] | None:
    """Kinds and spellings of a code's parts; None if it is no valid code."""
    tokens = []
    place = 0
    while place < len(code):
        match = _TOKEN.match(code, place)
        if match is None:
            return None
        tokens.append((match.lastgroup or "", match[0]))
        place = match.end()
    return tokens


def _sections(tokens: list[Token]) -> list[list[Token]]:
    sections: list[list[Token]] = [[]]
    for token in tokens:
        if token[0] == "section":
            sections.append([])
        else:
            sections[-1].append(token)
    return sections


def _is_sound(section: list[Token]) -> bool:
    """Whether the parts of a section go together."""
    kinds = [kind for kind, _ in section]
    has_date = "date" in kinds or "noon" in kinds
    numeric = {"digit", "percent", "exponent", "comma"} & set(kinds)
    if "general" in kinds and (
        numeric or has_date or "text" in kinds or kinds.count("general") > 1
    ):
        return False
    if "text" in kinds and (numeric or has_date):
        return False
    if has_date:
        rest = "".join(spelling for kind, spelling in section if kind in {"digit", "point"})
        return (
            not ({"percent", "exponent"} & set(kinds))
            and re.fullmatch(r"(\.0{1,3})?\.*", rest) is not None
        )
    if kinds.count("point") > 1 or kinds.count("exponent") > 1:
        return False
    if "exponent" in kinds:
        place = kinds.index("exponent")
        return "digit" in kinds[:place] and kinds[place + 1 : place + 2] == ["digit"]
    return True


def safe_code(code: str) -> str:
    """The code if a spreadsheet program is sure to accept it, else General.

    A code that a program rejects makes it call the whole workbook damaged; so what does not follow the
    grammar of ECMA-376 Part 1, 18.8.31 is not passed on.

    Args:
        code: A number format code of any origin.

    Returns:
        A code that can be stored.
    """
    tokens = _tokens(code) if 0 < len(code) <= LONGEST_CODE else None
    if tokens is None:
        return GENERAL
    sections = _sections(tokens)
    last_only_text = all(all(kind != "text" for kind, _ in section) for section in sections[:-1])
    if (
        len(sections) > 4
        or not last_only_text
        or not all(_is_sound(section) for section in sections)
    ):
        return GENERAL
    return code


@lru_cache(maxsize=256)
def is_date_code(code: str) -> bool:
    """Whether the code shows numbers as dates or times."""
    tokens = _tokens(code) or []
    return any(
        kind == "date"
        or (
            kind == "bracket"
            and spelling[1].lower() in "hms"
            and spelling[1:-1].lower() in {"h", "hh", "m", "mm", "s", "ss"}
        )
        for kind, spelling in tokens
    )


def showable_code(code: str, value: float) -> str:
    """The code, or General where the code shows dates and the value is none.

    Spreadsheet programs fill the cell with ##### for a date before their calendar's first or after its
    last day.

    Args:
        code: A stored code.
        value: The value to show.

    Returns:
        The code or General.
    """
    return GENERAL if is_date_code(code) and not 0 <= value < _DAYS_OF_CALENDAR else code


def is_number_code(code: str) -> bool:
    """Whether the code has digits to show a number with."""
    return not is_date_code(code) and any(kind == "digit" for kind, _ in _tokens(code) or [])


def zero_showing_code(code: str) -> str:
    """The code with zero written as a number where it would be a dash or nothing.

    Accounting formats such as `#,##0;-#,##0;-` suit a table that is read in columns. On an axis, in a
    sentence and as a threshold a zero must be seen.

    Args:
        code: A stored code.

    Returns:
        The code, its section for zero replaced by that for positive numbers if it has no digit.
    """
    sections = _sections(_tokens(code) or [])
    conditional = any(
        kind == "bracket" and spelling[1] in "<>=" for part in sections for kind, spelling in part
    )
    if len(sections) < 3 or conditional or any(kind == "digit" for kind, _ in sections[2]):
        return code
    sections[2] = sections[0]
    shown = ";".join("".join(spelling for _, spelling in section) for section in sections)
    return shown if len(shown) <= LONGEST_CODE else code


def suited_code(largest: float, spread: float) -> str:
    """A code for numbers without one: three significant digits of their spread.

    Args:
        largest: Largest size of the numbers, not negative.
        spread: Their standard deviation, or 0.

    Returns:
        A decimal code, or a scientific one for very large and very small numbers.
    """
    size = max(largest, spread)
    if size == 0:
        return "0"
    if size >= 1e10 or size < 1e-4:
        return SCIENTIFIC
    fine = spread if spread > 0 else size / 100
    decimals = min(max(2 - math.floor(math.log10(fine)), 0), 8)
    return "#,##0" + ("." + "0" * decimals if decimals else "")


def finer_code(code: str, value: float) -> str:
    """The code with decimals added until a small value shows two significant digits.

    Args:
        code: A stored code.
        value: The value to show.

    Returns:
        The code, unchanged where the value shows already or the code has no plain decimals.
    """
    tokens = _tokens(code)
    if not tokens or not is_number_code(code) or not math.isfinite(value) or value == 0:
        return code
    if any(kind == "exponent" or (kind, spelling) == ("plain", "/") for kind, spelling in tokens):
        return code
    sections = [_with_decimals(section, abs(value)) for section in _sections(tokens)]
    longer = ";".join("".join(spelling for _, spelling in section) for section in sections)
    return longer if len(longer) <= LONGEST_CODE else code


def _with_decimals(section: list[Token], value: float) -> list[Token]:
    digits = [k for k, (kind, _) in enumerate(section) if kind == "digit"]
    if not digits:
        return section
    point = next((k for k, (kind, _) in enumerate(section) if kind == "point"), None)
    last = digits[-1]
    scale = 100.0 ** sum(kind == "percent" for kind, _ in section)
    after = last
    while after + 1 < len(section) and section[after + 1][0] == "comma":
        after += 1
        scale /= 1000.0
    shown = 0 if point is None else sum(k > point for k in digits)
    wanted = min(max(1 - math.floor(math.log10(value * scale)), 0), 12) if value * scale > 0 else 0
    if wanted <= shown:
        return section
    if point is not None:
        place = max(point, last) + 1
        return [*section[:place], *[("digit", "0")] * (wanted - shown), *section[place:]]
    return [
        *section[: after + 1],
        ("point", "."),
        *[("digit", "0")] * wanted,
        *section[after + 1 :],
    ]
