"""Text from models and side-cars made safe to store, with nothing lost silently."""

from __future__ import annotations

import re

LONGEST = 32_767
_ENDING = " … (cut)"
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x84\x86-\x9f\ud800-\udfff\ufffe\uffff]")


def storable(text: str, longest: int = LONGEST) -> str:
    """The text as a cell can store it.

    Control characters show as their control picture, other characters that XML 1.0 forbids or
    discourages as U+FFFD. Text that is too long is cut and says so; the limit counts UTF-16 units.

    Args:
        text: Any text.
        longest: The most UTF-16 units.

    Returns:
        The text, whole or cut.
    """
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    text = _FORBIDDEN.sub(_picture, text)
    if text.startswith("<r>"):
        text = " " + text  # XlsxWriter takes text in <r>...</r> for markup of its own
    if len(text.encode("utf-16-le")) // 2 > longest:
        kept = text.encode("utf-16-le")[: (longest - len(_ENDING)) * 2]
        text = kept.decode("utf-16-le", errors="ignore") + _ENDING
    return text


def one_line(text: str, longest: int) -> str:
    """The text on one line, shortened for headings and axis titles.

    Args:
        text: Any text.
        longest: The most characters.

    Returns:
        The text with white space joined.
    """
    joined = " ".join(storable(text).split())
    return joined if len(joined) <= longest else joined[: longest - 1].rstrip() + "…"


def _picture(match: re.Match[str]) -> str:
    code = ord(match[0])
    if code < 0x20:
        return chr(0x2400 + code)
    return "\u2421" if code == 0x7F else "\ufffd"
