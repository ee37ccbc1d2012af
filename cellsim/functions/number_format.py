"""Values as number format codes show them (ECMA-376 Part 1, 18.8.31, in English)."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache

from cellsim.functions.coercion import general_text
from cellsim.functions.number_text import MONTHS
from cellsim.functions.rounding_rules import round_half_away
from cellsim.functions.serial_dates import date_from_serial
from cellsim.values import ErrorValue, Scalar

_TOKEN = re.compile(
    r'"[^"]*"'
    r"|\\."
    r"|_."
    r"|\*."
    r"|\[[^\]]*\]"
    r"|General"
    r"|AM/PM|A/P"
    r"|y+|m+|d+|h+|s+"
    r"|[eE][-+]"
    r"|[0#?]"
    r"|.",
    re.IGNORECASE | re.DOTALL,
)
_CONDITION = re.compile(r"\[(<=|>=|<>|<|>|=)(-?[\d.]+)\]")
_ELAPSED = re.compile(r"\[(h+|m+|s+)\]", re.IGNORECASE)
_WEEKDAYS = ("Sunday", "Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday")
_MOST_DECIMALS = 30


@dataclass(frozen=True, slots=True)
class _Section:
    condition: tuple[str, float] | None
    tokens: tuple[str, ...]

    @property
    def is_date(self) -> bool:
        return any(
            token[0].lower() in "ymdhs" or (token[:1] == "[" and _ELAPSED.match(token))
            for token in self.tokens
            if _is_code(token)
        )

    @property
    def is_text(self) -> bool:
        return "@" in self.tokens


def _is_code(token: str) -> bool:
    if token[:1] in {'"', "\\", "_", "*"}:
        return False
    lowered = token.lower()
    return (lowered[0] in "ymdhs" and set(lowered) <= {lowered[0]}) or bool(_ELAPSED.match(token))


@lru_cache(maxsize=2048)
def _sections(code: str) -> tuple[_Section, ...]:
    parts: list[list[str]] = [[]]
    for token in _TOKEN.findall(code):
        if token == ";":
            parts.append([])
        else:
            parts[-1].append(token)
    sections = []
    for part in parts:
        condition = None
        kept = []
        for token in part:
            match = _CONDITION.match(token)
            if match is not None:
                condition = (match[1], float(match[2]))
            elif token.startswith("[$"):
                kept.append('"' + token[2:-1].split("-")[0] + '"')
            elif not (token.startswith("[") and not _ELAPSED.match(token)):
                kept.append(token)
        sections.append(_Section(condition, tuple(kept)))
    return tuple(sections)


def format_value(value: Scalar, code: str, *, date_1904: bool = False) -> str | ErrorValue:
    """A value as a number format shows it.

    Args:
        value: What is shown; logicals as words, blanks as 0.
        code: The format code, in English.
        date_1904: The date system.

    Returns:
        The text, or #VALUE! for a code that makes no sense or a date out of range.
    """
    if isinstance(value, ErrorValue):
        return value
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    sections = _sections(code)
    if isinstance(value, str):
        return _format_text(value, sections)
    number = 0.0 if value is None else value
    if not code:
        return ""
    section, shown = _choose(sections, number)
    if section is None:
        return "#" * 8
    if section.is_text and not section.is_date:
        return "".join(general_text(number) if t == "@" else _literal(t) for t in section.tokens)
    if section.is_date:
        return _format_date(number, section.tokens, date_1904=date_1904)
    return _format_number(shown, section.tokens)


def _format_text(text: str, sections: tuple[_Section, ...]) -> str:
    for section in sections:
        if section.is_text:
            return "".join(text if token == "@" else _literal(token) for token in section.tokens)
    if len(sections) >= 4:
        return "".join(_literal(token) for token in sections[3].tokens)
    return text


def _literal(token: str) -> str:
    if token.startswith('"'):
        return token[1:-1]
    if token.startswith("\\"):
        return token[1:]
    if token.startswith("_"):
        return " "
    if token.startswith("*"):
        return ""
    return token


_HOLDS = {
    "<": lambda a, b: a < b,
    "<=": lambda a, b: a <= b,
    ">": lambda a, b: a > b,
    ">=": lambda a, b: a >= b,
    "=": lambda a, b: a == b,
    "<>": lambda a, b: a != b,
}


def _choose(sections: tuple[_Section, ...], number: float) -> tuple[_Section | None, float]:
    """The section for a number, and the number as it is to be shown: without sign where the section says it."""
    numeric = [
        section for section in sections[:3] if not (section.is_text and len(sections) > 1)
    ] or list(sections)
    if any(section.condition for section in numeric):
        for section in numeric:
            if section.condition is None:
                return section, abs(number) if len(
                    numeric
                ) > 1 and number < 0 and section is not numeric[0] else number
            operator, bound = section.condition
            if _HOLDS[operator](number, bound):
                return section, abs(number) if number < 0 and operator in {
                    "<",
                    "<=",
                } and bound <= 0 else number
        return None, number
    if len(numeric) == 1:
        return numeric[0], number
    if number > 0 or (number == 0 and len(numeric) < 3):
        return numeric[0], number
    if number < 0:
        return numeric[1], abs(number)
    return numeric[2], number


def _format_number(number: float, tokens: tuple[str, ...]) -> str:
    if any(token.lower() == "general" for token in tokens):
        return "".join(
            general_text(number) if token.lower() == "general" else _literal(token)
            for token in tokens
        )
    if not any(token in {"0", "#", "?"} for token in tokens):
        sign = "-" if number < 0 and any(token == "%" for token in tokens) else ""
        return ("-" if number < 0 else sign) + "".join(_literal(token) for token in tokens)
    if any(token[0] in "eE" and len(token) == 2 and token[1] in "+-" for token in tokens):
        return _format_scientific(number, tokens)
    slash = _fraction_place(tokens)
    if slash is not None:
        return _format_fraction(number, tokens, slash)
    return _format_decimal(number, tokens)


def _format_decimal(number: float, tokens: tuple[str, ...]) -> str:
    number *= 100.0 ** sum(token == "%" for token in tokens)
    places = [place for place, token in enumerate(tokens) if token in {"0", "#", "?"}]
    last = places[-1]
    trailing = last + 1
    while trailing < len(tokens) and tokens[trailing] == ",":
        number /= 1000
        trailing += 1
    scaling = range(last + 1, trailing)
    point = next((place for place, token in enumerate(tokens) if token == "."), None)
    grouped = any(
        token == "," and places[0] < place < last and (point is None or place < point)
        for place, token in enumerate(tokens)
    )
    whole_places = [place for place in places if point is None or place < point]
    decimal_places = [place for place in places if point is not None and place > point]
    digits = min(len(decimal_places), _MOST_DECIMALS)
    rounded = round_half_away(abs(number), digits)
    whole, _, fraction = f"{rounded:.{digits}f}".partition(".")
    whole = "" if whole == "0" else whole
    shown = _whole_digits(whole, [tokens[place] for place in whole_places], grouped=grouped)
    decimals = _decimal_digits(fraction, [tokens[place] for place in decimal_places])
    result: list[str] = []
    for place, token in enumerate(tokens):
        if place in scaling or (token == "," and grouped and place < last):
            continue
        if place in whole_places:
            result.append(shown[whole_places.index(place)])
        elif place in decimal_places:
            result.append(decimals[decimal_places.index(place)])
        elif place == point:
            if not whole_places:
                result.append(whole)
            result.append(".")
        else:
            result.append(_literal(token))
    text = "".join(result)
    return f"-{text}" if number < 0 and rounded != 0 else text


def _whole_digits(digits: str, marks: list[str], *, grouped: bool) -> list[str]:
    """What stands in place of each digit mark before the point; the first takes all digits left over."""
    if not marks:
        return []
    count = len(marks)
    padded = digits.rjust(count)
    extra = len(padded) - count
    cells = [padded[: extra + 1], *padded[extra + 1 :]]
    result = []
    for mark, cell in zip(marks, cells, strict=True):
        if cell.strip():
            result.append(cell.strip())
        else:
            result.append({"0": "0", "?": " ", "#": ""}[mark])
    if not grouped:
        return result
    total = "".join(result)
    seen = 0
    spread: list[str] = []
    remaining = len(total)
    for part in result:
        text = ""
        for character in part:
            text += character
            seen += 1
            left = remaining - seen
            if left and left % 3 == 0 and character.strip():
                text += ","
        spread.append(text)
    return spread


def _decimal_digits(digits: str, marks: list[str]) -> list[str]:
    kept = list(digits.ljust(len(marks), "0"))
    for place in range(len(marks) - 1, -1, -1):
        if kept[place] != "0" or marks[place] == "0":
            break
        kept[place] = " " if marks[place] == "?" else ""
    return kept


def _format_scientific(number: float, tokens: tuple[str, ...]) -> str:
    place = next(k for k, token in enumerate(tokens) if token[0] in "eE" and len(token) == 2)
    head, tail = tokens[:place], tokens[place + 1 :]
    point = head.index(".") if "." in head else len(head)
    whole_marks = max(1, sum(token in {"0", "#", "?"} for token in head[:point]))
    decimals = sum(token in {"0", "#", "?"} for token in head[point:])
    exponent = math.floor(math.log10(abs(number))) if number else 0
    exponent = math.floor(exponent / whole_marks) * whole_marks if whole_marks > 1 else exponent
    mantissa = round_half_away(number / 10.0**exponent, decimals)
    if abs(mantissa) >= 10**whole_marks:
        exponent += whole_marks
        mantissa = round_half_away(number / 10.0**exponent, decimals)
    width = sum(token in {"0", "#", "?"} for token in tail)
    sign = "-" if exponent < 0 else "+" if tokens[place][1] == "+" else ""
    letter = tokens[place][0]
    rest = "".join(_literal(token) for token in tail if token not in {"0", "#", "?"})
    return f"{_format_decimal(mantissa, head)}{letter}{sign}{abs(exponent):0{width}d}{rest}"


def _fraction_place(tokens: tuple[str, ...]) -> int | None:
    for place, token in enumerate(tokens):
        if token == "/" and 0 < place < len(tokens) - 1 and tokens[place - 1] in {"0", "#", "?"}:
            return place
    return None


def _format_fraction(number: float, tokens: tuple[str, ...], slash: int) -> str:
    start = slash - 1
    while start >= 0 and tokens[start] in {"0", "#", "?"}:
        start -= 1
    top_marks = tokens[start + 1 : slash]
    end = slash + 1
    while end < len(tokens) and (tokens[end] in {"0", "#", "?"} or tokens[end].isdigit()):
        end += 1
    bottom_marks = tokens[slash + 1 : end]
    whole_marks = [token for token in tokens[: start + 1] if token in {"0", "#", "?"}]
    fixed = "".join(bottom_marks)
    size = abs(number)
    whole = math.floor(size) if whole_marks else 0
    rest = size - whole
    if fixed.isdigit() and int(fixed) > 0:
        bottom = int(fixed)
        top = round(rest * bottom)
    else:
        top, bottom = _nearest_fraction(rest, 10 ** len(bottom_marks) - 1)
    if whole_marks and top == bottom:
        whole, top = whole + 1, 0
    sign = "-" if number < 0 else ""
    width, below = len(top_marks), max(len(bottom_marks), 1)
    if top == 0 and whole_marks:
        fraction = " " * (width + 1 + below) if "?" in top_marks else ""
        return f"{sign}{whole or 0}{' ' if fraction else ''}{fraction}"
    lead = f"{whole} " if whole_marks and (whole or "0" in whole_marks) else ""
    return f"{sign}{lead}{str(top).rjust(width) if '?' in top_marks else top}/{str(bottom).ljust(below) if '?' in bottom_marks else bottom}"


def _nearest_fraction(number: float, largest: int) -> tuple[int, int]:
    """The fraction nearest to a number with a bottom up to a limit."""
    best = (round(number), 1)
    for bottom in range(1, min(largest, 9999) + 1):
        top = round(number * bottom)
        if abs(number - top / bottom) < abs(number - best[0] / best[1]) - 1e-12:
            best = (top, bottom)
    return best


def _format_date(number: float, tokens: tuple[str, ...], *, date_1904: bool) -> str | ErrorValue:
    if number < 0:
        return ErrorValue.VALUE
    decimals = _second_decimals(tokens)
    seconds = round_half_away(number * 86_400, decimals)
    if decimals == 0:
        seconds = round(seconds)
    day = math.floor(seconds / 86_400)
    date = date_from_serial(float(day), date_1904=date_1904)
    if date is None:
        return ErrorValue.VALUE
    clock = _Clock(
        seconds, day, date, any(token.upper() in {"AM/PM", "A/P"} for token in tokens), date_1904
    )
    result: list[str] = []
    for place, token in enumerate(tokens):
        result.append(clock.show(token, tokens, place))
    return "".join(result)


def _second_decimals(tokens: tuple[str, ...]) -> int:
    for place, token in enumerate(tokens):
        if (
            token == "."
            and place
            and (
                tokens[place - 1].lower().startswith("s")
                or tokens[place - 1].lower().startswith("[s")
            )
        ):
            count = 0
            while place + 1 + count < len(tokens) and tokens[place + 1 + count] == "0":
                count += 1
            return count
    return 0


class _Clock:
    """A moment, shown one token at a time."""

    def __init__(
        self, seconds: float, day: int, date: tuple[int, int, int], half_days: bool, date_1904: bool
    ) -> None:
        self._seconds = seconds
        self._of_day = seconds - day * 86_400
        self._date = date
        self._half_days = half_days
        self._weekday = (day + (1462 if date_1904 else 0) - 1) % 7
        self._decimals = 0

    def show(self, token: str, tokens: tuple[str, ...], place: int) -> str:
        """The text for a token."""
        lowered = token.lower()
        elapsed = _ELAPSED.match(token)
        if elapsed is not None:
            unit = elapsed[1].lower()
            value = math.floor(self._seconds / {"h": 3600, "m": 60, "s": 1}[unit[0]])
            return f"{value:0{len(unit)}d}"
        if lowered in {"am/pm", "a/p"}:
            word = "AM" if self._of_day < 43_200 else "PM"
            return word if lowered == "am/pm" else word[0]
        if not _is_code(token):
            return self._other(token, tokens, place)
        if lowered[0] == "m" and _is_minute(tokens, place):
            return f"{int(self._of_day // 60 % 60):0{min(len(token), 2)}d}"
        return self._part(lowered)

    def _other(self, token: str, tokens: tuple[str, ...], place: int) -> str:
        if token == "0":
            back = place
            while back >= 0 and tokens[back] == "0":
                back -= 1
            if back >= 0 and tokens[back] == ".":
                digit = place - back
                fraction = self._of_day - math.floor(self._of_day)
                return f"{fraction:.9f}"[1 + digit]
        return _literal(token)

    def _part(self, code: str) -> str:
        year, month, day = self._date
        size = len(code)
        if code[0] == "y":
            return f"{year % 100:02d}" if size <= 2 else f"{year:04d}"
        if code[0] == "m":
            name = MONTHS[month - 1].capitalize()
            return [str(month), f"{month:02d}", name[:3], name, name[0]][min(size, 5) - 1]
        if code[0] == "d":
            word = _WEEKDAYS[self._weekday]
            return [str(day), f"{day:02d}", word[:3], word][min(size, 4) - 1]
        if code[0] == "h":
            hour = int(self._of_day // 3600)
            if self._half_days:
                hour = hour % 12 or 12
            return f"{hour:0{min(size, 2)}d}"
        return f"{int(self._of_day % 60):0{min(size, 2)}d}"


def _is_minute(tokens: tuple[str, ...], place: int) -> bool:
    """Whether an `m` stands for minutes: after hours or before seconds."""
    if len(tokens[place]) > 2:
        return False
    before = next((t.lower() for t in reversed(tokens[:place]) if _is_code(t)), "")
    after = next((t.lower() for t in tokens[place + 1 :] if _is_code(t)), "")
    return before.strip("[]").startswith("h") or after.strip("[]").startswith("s")
