"""Wildcards in text: `?` is one character, `*` any run, `~` takes the next one as it is."""

from __future__ import annotations

import re
from functools import lru_cache


def has_wildcards(text: str) -> bool:
    """Whether a text holds `?`, `*` or an escape."""
    return "?" in text or "*" in text or "~" in text


@lru_cache(maxsize=4096)
def wildcard_regex(pattern: str, *, anchored: bool = True) -> re.Pattern[str]:
    """The regular expression for a wildcard pattern, without regard to case.

    Args:
        pattern: The pattern.
        anchored: Whether the whole text must match, or a part of it may.
    """
    runs: list[str] = [""]  # what stands between the asterisks
    spot = 0
    while spot < len(pattern):
        character = pattern[spot]
        if character == "~" and spot + 1 < len(pattern) and pattern[spot + 1] in "?*~":
            runs[-1] += re.escape(pattern[spot + 1])
            spot += 2
            continue
        if character == "*":
            runs.append("")
        else:
            runs[-1] += "." if character == "?" else re.escape(character)
        spot += 1
    # Each run is taken where it first occurs and never given back: later runs find no less behind it, and
    # many asterisks take no longer than one.
    first, *others = runs
    if not others:
        expression = first + (r"\Z" if anchored else "")
    elif anchored:
        between = "".join(f"(?>.*?{run})" for run in others[:-1])
        expression = f"{first}{between}.*{others[-1]}\\Z"
    else:
        expression = first + "".join(f"(?>.*?{run})" for run in others if run)
    return re.compile(expression, re.IGNORECASE | re.DOTALL)
