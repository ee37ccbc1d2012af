"""Tables and figures for the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich import box
from rich.console import Console
from rich.table import Table
from rich.text import Text

from cellsim.values import ErrorValue, Scalar

_PLAIN_WIDTH = 160


def print_table(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> None:
    """Print a table as wide as the terminal; text from a workbook is shown as it is."""
    console = Console(width=None if Console().is_terminal else _PLAIN_WIDTH, highlight=False)
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False)
    for head in heads:
        table.add_column(head, overflow="ellipsis", no_wrap=True)
    for row in rows:
        table.add_row(*(Text(_one_line(cell)) for cell in row))
    console.print(table)


def _one_line(text: str) -> str:
    return "".join(character if character.isprintable() else " " for character in text)


def shown_value(value: Scalar) -> str:
    """A value as a person reads it."""
    if value is None:
        return "(blank)"
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, float):
        return f"{value:.12g}"
    if isinstance(value, ErrorValue):
        return str(value)
    return f'"{value}"'


def shown_number(number: float, unit: str = "") -> str:
    """A figure with about six significant digits and thousands separators; in hundredths if the unit is %."""
    if number != number:
        return "-"
    if unit == "%":
        number *= 100
    if number == 0:
        return "0"
    if number and not 1e-4 <= abs(number) < 1e12:
        return f"{number:.5e}"
    digits = max(0, 5 - len(str(int(abs(number))))) if abs(number) >= 1 else 6
    return f"{number:,.{digits}f}"
