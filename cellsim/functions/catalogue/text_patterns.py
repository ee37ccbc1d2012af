"""Text by regular expressions.

Spreadsheet programs use the PCRE2 dialect; Python's own is used here, which agrees with it but for rare
constructs.
"""

from __future__ import annotations

import re
from functools import lru_cache

from cellsim.functions.registry import Text, Whole, spreadsheet_function
from cellsim.functions.text_limits import bounded
from cellsim.values import Array, ErrorValue, Fault, Value

_NAMED_GROUP = re.compile(r"\(\?<(?=[A-Za-z_])")
_IN_REPLACEMENT = re.compile(r"\$(?:\$|(?P<number>\d+)|\{(?P<name>\w+)\})")


@lru_cache(maxsize=512)
def _regex(pattern: str, ignore_case: int) -> re.Pattern[str]:
    """A compiled pattern.

    Raises:
        Fault: It is none, or the choice of case is neither 0 nor 1 (#VALUE!).
    """
    if ignore_case not in (0, 1):
        raise Fault(ErrorValue.VALUE)
    try:
        return re.compile(_NAMED_GROUP.sub("(?P<", pattern), re.IGNORECASE if ignore_case else 0)
    except re.error:
        raise Fault(ErrorValue.VALUE) from None


@spreadsheet_function("REGEXTEST")
def matches_pattern(text: Text, pattern: Text, ignore_case: Whole = 0) -> bool:
    """Whether a regular expression matches a part of a text."""
    return _regex(pattern, ignore_case).search(text) is not None


@spreadsheet_function("REGEXEXTRACT")
def extract_by_pattern(text: Text, pattern: Text, mode: Whole = 0, ignore_case: Whole = 0) -> Value:
    """What a regular expression matches: 0 the first match, 1 all, 2 the groups of the first."""
    if mode not in (0, 1, 2):
        return ErrorValue.VALUE
    matches = list(_regex(pattern, ignore_case).finditer(text))
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
    regex = _regex(pattern, ignore_case)

    def filled(match: re.Match[str]) -> str:
        return _IN_REPLACEMENT.sub(lambda mark: _part(match, mark), new)

    if which == 0:
        return bounded(regex.sub(filled, text))
    matches = list(regex.finditer(text))
    place = which - 1 if which > 0 else which
    if not -len(matches) <= place < len(matches):
        return text
    match = matches[place]
    return bounded(text[: match.start()] + filled(match) + text[match.end() :])


def _part(match: re.Match[str], mark: re.Match[str]) -> str:
    """What a `$1`, `${name}` or `$$` in a replacement stands for."""
    key = mark["number"] or mark["name"]
    if key is None:
        return "$"
    try:
        return match[int(key) if key.isdigit() else key] or ""
    except IndexError:
        raise Fault(ErrorValue.VALUE) from None
