"""Dates and times as format codes show them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from cellsim.functions.format_codes import Kind, Token
from cellsim.functions.number_text import MONTHS
from cellsim.functions.serial_dates import OFFSET_1904, date_from_serial
from cellsim.values import ErrorValue, Fault

_WEEKDAYS = ("Saturday", "Sunday", "Monday", "Tuesday", "Wednesday", "Thursday", "Friday")
_UNITS = {"h": 3600, "m": 60, "s": 1}
_DAY = 86_400


@dataclass(frozen=True, slots=True)
class _Moment:
    """A moment as it is shown.

    Attributes:
        date: Year, month and day.
        in_calendar: Whether there is such a date.
        weekday: From Saturday as 0.
        seconds: Whole seconds since serial 0.
        fraction: The decimals of the second, as many as are shown.
        half_days: Whether hours are counted to 12.
        elapsed: Units that are not cut at the next larger one.
    """

    date: tuple[int, int, int]
    in_calendar: bool
    weekday: int
    seconds: int
    fraction: str
    half_days: bool
    elapsed: frozenset[str]

    def show(self, code: str) -> str:
        """The text for a code in small letters; `n` stands for minutes."""
        year, month, day = self.date
        size = len(code)
        if code[0] == "y":
            return f"{year % 100:02d}" if size <= 2 else f"{year:04d}"
        if code[0] == "m":
            name = MONTHS[month - 1].capitalize()
            return {1: str(month), 2: f"{month:02d}", 3: name[:3], 5: name[0]}.get(size, name)
        if code[0] == "d":
            name = _WEEKDAYS[self.weekday]
            return {1: str(day), 2: f"{day:02d}", 3: name[:3]}.get(size, name)
        return self._clock("m" if code[0] == "n" else code[0], size)

    def _clock(self, unit: str, size: int) -> str:
        if unit in self.elapsed:
            return f"{self.seconds // _UNITS[unit]:0{size}d}"
        value = self.seconds % _DAY // _UNITS[unit]
        if unit != "h":
            value %= 60
        elif self.half_days:
            value = value % 12 or 12
        return f"{value:0{min(size, 2)}d}"

    def half(self, code: str) -> str:
        """AM or PM; of `a/p` the letter as it is written."""
        second = self.seconds % _DAY >= _DAY // 2
        if len(code) > 3:
            return "PM" if second else "AM"
        return code[2] if second else code[0]


def format_date(number: float, tokens: Sequence[Token], *, date_1904: bool) -> str:
    """A serial number by date and time codes.

    Raises:
        Fault: It is before or after the calendar, or digit codes stand among those of dates (#VALUE!).
    """
    decimals = _second_decimals(tokens)
    if any(token.kind is Kind.DIGIT for k, token in enumerate(tokens) if k not in decimals):
        raise Fault(ErrorValue.VALUE)
    codes = [token for token in tokens if token.kind in (Kind.DATE, Kind.ELAPSED, Kind.HALF_DAY)]
    elapsed = frozenset(token.text[0] for token in codes if token.kind is Kind.ELAPSED)
    only_elapsed = bool(elapsed) and len(codes) == 1 and not decimals
    if number < 0 and not only_elapsed and not date_1904:
        raise Fault(ErrorValue.VALUE)
    moment = _moment(abs(number), tokens, elapsed, date_1904=date_1904)
    if not moment.in_calendar and not only_elapsed:
        raise Fault(ErrorValue.VALUE)
    shown = []
    for place, token in enumerate(tokens):
        if place in decimals:
            shown.append(f".{moment.fraction}" if token.kind is Kind.POINT else "")
        elif token.kind is Kind.HALF_DAY:
            shown.append(moment.half(token.text))
        elif token.kind in (Kind.DATE, Kind.ELAPSED):
            code = token.text
            shown.append(moment.show("n" * len(code) if _is_minute(tokens, place) else code))
        else:
            shown.append(token.text)
    return f"{'-' if number < 0 else ''}{''.join(shown)}"


def _moment(
    number: float, tokens: Sequence[Token], elapsed: frozenset[str], *, date_1904: bool
) -> _Moment:
    digits = max(len(_second_decimals(tokens)) - 1, 0)
    scale = 10**digits
    ticks = math.floor(number * _DAY * scale + 0.5)
    seconds, fraction = divmod(ticks, scale)
    day = seconds // _DAY
    date = date_from_serial(float(day), date_1904=date_1904)
    return _Moment(
        date=date or (0, 1, 0),
        in_calendar=date is not None,
        weekday=(day + (OFFSET_1904 if date_1904 else 0)) % 7,
        seconds=seconds,
        fraction=f"{fraction:0{digits}d}" if digits else "",
        half_days=any(token.kind is Kind.HALF_DAY for token in tokens),
        elapsed=elapsed,
    )


def _second_decimals(tokens: Sequence[Token]) -> range:
    """Places of the point and the zeros after a code for seconds."""
    for place in range(1, len(tokens)):
        before = tokens[place - 1]
        is_second = before.kind in (Kind.DATE, Kind.ELAPSED) and before.text[0] == "s"
        if tokens[place].kind is Kind.POINT and is_second:
            end = place + 1
            while end < len(tokens) and tokens[end] == Token(Kind.DIGIT, "0"):
                end += 1
            return range(place, end) if end > place + 1 else range(0)
    return range(0)


def _is_minute(tokens: Sequence[Token], place: int) -> bool:
    """Whether an `m` stands for minutes: elapsed ones, after hours or seconds, or before seconds."""
    code = tokens[place]
    if code.text[0] != "m":
        return False
    if code.kind is Kind.ELAPSED:
        return True
    letters = [token.text[0] if token.kind in (Kind.DATE, Kind.ELAPSED) else "" for token in tokens]
    before = next((letter for letter in reversed(letters[:place]) if letter), "")
    after = next((letter for letter in letters[place + 1 :] if letter), "")
    return len(code.text) <= 2 and (before in {"h", "s"} or after == "s")
