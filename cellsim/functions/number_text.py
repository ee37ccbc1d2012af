"""Numbers, percentages, amounts, dates and times read from text, as VALUE() and operators read them.

English (US) conventions, which is what a file's formulas are written in. Common practice of
spreadsheet programs, no source; ECMA-376 leaves it to the application.
"""

from __future__ import annotations

import re

from cellsim.functions.serial_dates import serial_from_date

_NUMBER = re.compile(
    r"(?P<sign>[-+]?)(?P<currency>[$]?)\s*(?P<sign2>[-+]?)"
    r"(?P<digits>\d+(?:\.\d*)?|\.\d+|\d{1,3}(?:,\d{3})+(?:\.\d*)?)"
    r"(?P<exponent>[eE][-+]?\d+)?\s*(?P<percent>%?)\Z"
)
_FRACTION = re.compile(r"(?P<sign>[-+]?)(?P<whole>\d+) +(?P<top>\d+)/(?P<bottom>[1-9]\d*)\Z")
_TIME = re.compile(
    r"(?P<hour>\d{1,4})"
    r"(?::(?P<minute>\d{1,4})(?:(?P<fraction>\.\d+)|:(?P<second>\d{1,4}(?:\.\d*)?)|\.)?)?"
    r"\s*(?P<half>[aApP][mM]?)?\Z"
)
_ISO = re.compile(r"(?P<year>\d{4})[-/](?P<month>\d{1,2})[-/](?P<day>\d{1,2})\Z")
_US = re.compile(r"(?P<month>\d{1,2})[-/](?P<day>\d{1,2})[-/](?P<year>\d{4}|\d{1,2})\Z")
_DAY_NAME = re.compile(r"(?P<day>\d{1,2})[- ](?P<name>[A-Za-z]{3,9})[- ,]+(?P<year>\d{4}|\d{2})\Z")
_NAME_DAY = re.compile(
    r"(?P<name>[A-Za-z]{3,9})[- ](?P<day>\d{1,2})(?:st|nd|rd|th)?[, -]+(?P<year>\d{4})\Z"
)
_NAME_YEAR = re.compile(r"(?P<name>[A-Za-z]{3,9})[- ,]+(?P<year>\d{4}|\d{2})\Z")
MONTHS = (
    "january", "february", "march", "april", "may", "june",
    "july", "august", "september", "october", "november", "december",
)  # fmt: skip
_CENTURY_SPLIT = 30
"""Two-digit years below this are in the 2000s."""


def number_from_text(text: str, *, date_1904: bool = False) -> float | None:
    """The number that a text stands for, or None.

    Reads `12`, `-1,234.5`, `$5`, `(5)`, `12%`, `1E3`, `1 1/2`, dates such as `2026-06-30`, `6/30/2026`,
    `30-Jun-2026` and times such as `13:45`, `1:45 PM`, alone or after a date.
    """
    text = text.strip()
    if not text:
        return None
    number = _plain_number(text)
    return number if number is not None else date_time_from_text(text, date_1904=date_1904)


def _plain_number(text: str) -> float | None:
    negative = text.startswith("(") and text.endswith(")")
    if negative:
        text = text[1:-1].strip()
    match = _NUMBER.match(text)
    if match is None:
        match = _FRACTION.match(text)
        if match is None or negative:
            return None
        value = int(match["whole"]) + int(match["top"]) / int(match["bottom"])
        return -value if match["sign"] == "-" else value
    if match["sign"] and match["sign2"]:
        return None
    value = float(match["digits"].replace(",", "") + (match["exponent"] or ""))
    if match["percent"]:
        value /= 100
    if "-" in (match["sign"], match["sign2"]):
        value = -value
    return -value if negative else value


def date_time_from_text(text: str, *, date_1904: bool = False) -> float | None:
    """The serial number of a date, a time, or a date followed by a time; None if it is neither."""
    text = text.strip()
    date = date_from_text(text, date_1904=date_1904)
    if date is not None:
        return date
    time = time_from_text(text)
    if time is not None:
        return time
    for match in re.finditer(r"[ T]+", text):
        date = date_from_text(text[: match.start()], date_1904=date_1904)
        time = time_from_text(text[match.end() :])
        if date is not None and time is not None:
            return date + time
    return None


def date_from_text(text: str, *, date_1904: bool = False) -> float | None:
    """The serial number of a date written as text, or None."""
    for pattern in (_ISO, _US, _DAY_NAME, _NAME_DAY, _NAME_YEAR):
        match = pattern.match(text)
        if match is None:
            continue
        parts = match.groupdict()
        month = _month(parts.get("name")) if parts.get("name") else int(parts["month"] or 0)
        if month is None:
            return None
        serial = serial_from_date(
            _year(parts["year"] or ""), month, int(parts.get("day") or 1), date_1904=date_1904
        )
        if serial is not None:
            return serial
    return None


def time_from_text(text: str) -> float | None:
    """The fraction of a day of a time written as text (more than a day allowed), or None.

    One of hours, minutes and seconds may run over what a clock shows: `30:00`, `0:90`, `0:0:100`.
    """
    match = _TIME.match(text.strip())
    if match is None or (match["minute"] is None and match["half"] is None):
        return None
    hour, minute = float(match["hour"]), float(match["minute"] or 0)
    second = float(match["second"] or 0)
    if match["fraction"] and match["second"] is None:  # minutes and seconds
        hour, minute, second = 0.0, hour, minute + float(match["fraction"])
    if match["half"]:
        if hour > 12:
            return None
        hour = hour % 12 + (12 if match["half"].lower().startswith("p") else 0)
    if (hour >= 24) + (minute >= 60) + (second >= 60) > 1:
        return None
    return (hour * 3600 + minute * 60 + second) / 86400


def _month(name: str | None) -> int | None:
    word = (name or "").lower()
    for number, month in enumerate(MONTHS, start=1):
        if month.startswith(word) and len(word) >= 3:
            return number
    return None


def _year(text: str) -> int:
    year = int(text)
    if len(text) > 2:
        return year
    return year + (2000 if year < _CENTURY_SPLIT else 1900)
