"""References into tables: what stands between the square brackets."""

from __future__ import annotations

import re

from cellsim.formula.tree import StructuredReference

_ITEMS = frozenset({"#ALL", "#DATA", "#HEADERS", "#TOTALS", "#THIS ROW"})
_ESCAPE = re.compile(r"'(.)", re.DOTALL)


def parse_structured(table: str | None, bracket: str) -> StructuredReference | None:
    """The reference that a table's name and a bracket make, None if it is none.

    Args:
        table: The name before the bracket, or None.
        bracket: The bracket with all that it holds.
    """
    body = bracket[1:-1].strip()
    items: list[str] = []
    columns: list[str] = []
    if body.startswith("@"):
        items.append("#THIS ROW")
        body = body[1:].strip()
    if not body:
        return StructuredReference(table, tuple(items), None, None)
    if not body.startswith("["):
        name = _ESCAPE.sub(r"\1", body)
        if body.upper() in _ITEMS:
            return StructuredReference(table, (body.upper(),), None, None)
        return StructuredReference(table, tuple(items), name, None)
    parts = _parts(body)
    if parts is None:
        return None
    for part in parts:
        if part.upper() in _ITEMS:
            items.append(part.upper())
        else:
            columns.append(_ESCAPE.sub(r"\1", part))
    if len(columns) > 2:
        return None
    first = columns[0] if columns else None
    last = columns[1] if len(columns) > 1 else None
    return StructuredReference(table, tuple(items), first, last)


def _parts(body: str) -> list[str] | None:
    """The inner brackets, which commas or colons separate."""
    parts: list[str] = []
    spot = 0
    while spot < len(body):
        if body[spot] in ",: \r\n\t":
            spot += 1
            continue
        if body[spot] != "[":
            return None
        end = spot + 1
        while end < len(body) and body[end] != "]":
            end += 2 if body[end] == "'" else 1
        if end >= len(body):
            return None
        parts.append(body[spot + 1 : end])
        spot = end + 1
    return parts
