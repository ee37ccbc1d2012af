"""What bounds texts: their length, and how characters are counted."""

from __future__ import annotations

from cellsim.values import ErrorValue, Fault

LONGEST = 32_767
"""The most characters that a cell holds (MS-OI29500)."""

_LAST_BASIC = "\uffff"


def bounded(text: str) -> str:
    """The text itself.

    Raises:
        Fault: It is longer than a cell may hold (#VALUE!).
    """
    if len(text) > LONGEST:
        raise Fault(ErrorValue.VALUE)
    return text


def to_units(text: str) -> str:
    """A text in which each UTF-16 unit is a character, as spreadsheet programs count them."""
    if text.isascii() or max(text) <= _LAST_BASIC:
        return text
    data = text.encode("utf-16-le", "surrogatepass")
    return "".join(chr(data[k] | data[k + 1] << 8) for k in range(0, len(data), 2))


def from_units(units: str) -> str:
    """The text of UTF-16 units; half a pair stays as it is."""
    if units.isascii():
        return units
    return units.encode("utf-16-le", "surrogatepass").decode("utf-16-le", "surrogatepass")
