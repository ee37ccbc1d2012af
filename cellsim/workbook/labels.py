"""Labels and units: the text by which a person knows a cell."""

from __future__ import annotations

import re

from cellsim.workbook.model import Sheet

_FARTHEST = 40
"""Cells to look at in one direction."""
_LITERAL = re.compile(r'"([^"]*)"|\[\$([^\]-]*)[^\]]*\]|\\(.)')
_CURRENCIES = "$€£¥₹₩₽₺₴₦₪฿₫"
_HAS_LETTER = re.compile(r"[^\W\d_]")


def find_label(sheet: Sheet, row: int, column: int) -> str:
    """The text nearest to the left in the cell's row, else above it in its column, or "".

    Numbers, formulas and texts without a letter in between are passed over.
    """
    for left in range(column - 1, max(0, column - _FARTHEST), -1):
        text = _text(sheet, row, left)
        if text:
            return text
    for above in range(row - 1, max(0, row - _FARTHEST), -1):
        text = _text(sheet, above, column)
        if text:
            return text
    return ""


def _text(sheet: Sheet, row: int, column: int) -> str:
    value = sheet.constants.get((row, column))
    if value is None:
        formula = sheet.formulas.get((row, column))
        value = formula.stored if formula is not None else None
    if isinstance(value, str) and _HAS_LETTER.search(value):
        return " ".join(value.split())
    return ""


def unit_of(number_format: str) -> str:
    """The unit that a number format shows, such as `%`, `EUR` or `x`, or ""."""
    section = number_format.split(";", maxsplit=1)[0]
    literals = [next(part for part in match if part is not None) for match in _groups(section)]
    words = [word.strip() for word in literals if word.strip(" ()-+_,./:*")]
    if words:
        return " ".join(words)
    bare = _LITERAL.sub("", section)
    if "%" in bare:
        return "%"
    return next((character for character in bare if character in _CURRENCIES), "")


def _groups(section: str) -> list[tuple[str | None, ...]]:
    return [
        tuple(g for g in match.groups() if g is not None)
        for match in _LITERAL.finditer(section)
        if any(match.groups())
    ]
