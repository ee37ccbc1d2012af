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
    parts: list[str] = []
    spot = 0
    while spot < len(pattern):
        character = pattern[spot]
        if character == "~" and spot + 1 < len(pattern) and pattern[spot + 1] in "?*~":
            parts.append(re.escape(pattern[spot + 1]))
            spot += 2
            continue
        if character == "?":
            parts.append(".")
        elif character == "*":
            parts.append(".*" if anchored or spot + 1 < len(pattern) else "")
        else:
            parts.append(re.escape(character))
        spot += 1
    if anchored:
        parts.append(r"\Z")
    return re.compile("".join(parts), re.IGNORECASE | re.DOTALL)
