"""Text by regular expressions.

Spreadsheet programs use the PCRE2 dialect; that of the `regex` library is used here, which agrees with
it but for rare constructs. A pattern that would search for ever is given up after a second (#VALUE!).
"""

from __future__ import annotations

import re
from collections.abc import Callable
from functools import lru_cache
from typing import TypeVar

import regex

from cellsim.functions.registry import Text, Whole, spreadsheet_function
from cellsim.functions.text_limits import bounded
from cellsim.values import Array, ErrorValue, Fault, Value

_IN_REPLACEMENT = re.compile(r"\$(?:\$|(?P<number>\d+)|\{(?P<name>\w+)\})")


@lru_cache(maxsize=512)
def _regex(pattern: str, ignore_case: int) -> regex.Pattern[str]:
    """A compiled pattern.

    Raises:
        Fault: It is none, or the choice of case is neither 0 nor 1 (#VALUE!).
    """
    if ignore_case not in (0, 1):
        raise Fault(ErrorValue.VALUE)
    try:
        return regex.compile(pattern, regex.IGNORECASE if ignore_case else 0)
    except regex.error:
        raise Fault(ErrorValue.VALUE) from None


_MOST_SECONDS = 1.0
Result = TypeVar("Result")


def _in_time(search: Callable[[], Result]) -> Result:
    """What a search finds.

    Raises:
        Fault: It takes too long (#VALUE!).
    """
    try:
        return search()
    except TimeoutError:
        raise Fault(ErrorValue.VALUE) from None


@spreadsheet_function("REGEXTEST")
def matches_pattern(text: Text, pattern: Text, ignore_case: Whole = 0) -> bool:
    """Whether a regular expression matches a part of a text."""
    compiled = _regex(pattern, ignore_case)
    return _in_time(lambda: compiled.search(text, timeout=_MOST_SECONDS)) is not None


@spreadsheet_function("REGEXEXTRACT")
def extract_by_pattern(text: Text, pattern: Text, mode: Whole = 0, ignore_case: Whole = 0) -> Value:
    """What a regular expression matches: 0 the first match, 1 all, 2 the groups of the first."""
    if mode not in (0, 1, 2):
        return ErrorValue.VALUE
    compiled = _regex(pattern, ignore_case)
    matches = _in_time(lambda: list(compiled.finditer(text, timeout=_MOST_SECONDS)))
    if not matches:
        return ErrorValue.NA
    if mode == 1:
        return Array(1, len(matches), [match[0] for match in matches])
    if mode == 0:
        return matches[0][0]
    groups = list(matches[0].groups())
    while groups and groups[-1] is None:
        groups.pop()
    if not groups:
        return ErrorValue.VALUE
    return Array(1, len(groups), [group or "" for group in groups])


@spreadsheet_function("REGEXREPLACE")
def replace_by_pattern(
    text: Text, pattern: Text, new: Text, which: Whole = 0, ignore_case: Whole = 0
) -> str:
    """Text with what a regular expression matches replaced, everywhere or at one place."""
    compiled = _regex(pattern, ignore_case)

    def filled(match: regex.Match[str]) -> str:
        return _IN_REPLACEMENT.sub(lambda mark: _part(match, mark), new)

    if which == 0:
        return bounded(_in_time(lambda: compiled.sub(filled, text, timeout=_MOST_SECONDS)))
    matches = _in_time(lambda: list(compiled.finditer(text, timeout=_MOST_SECONDS)))
    place = which - 1 if which > 0 else which
    if not -len(matches) <= place < len(matches):
        return text
    match = matches[place]
    return bounded(text[: match.start()] + filled(match) + text[match.end() :])


def _part(match: regex.Match[str], mark: re.Match[str]) -> str:
    """What a `$1`, `${name}` or `$$` in a replacement stands for."""
    key = mark["number"] or mark["name"]
    if key is None:
        return "$"
    try:
        return match[int(key) if key.isdigit() else key] or ""
    except IndexError:
        raise Fault(ErrorValue.VALUE) from None
