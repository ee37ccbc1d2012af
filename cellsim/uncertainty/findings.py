"""Collects everything that is wrong with a side-car, and reads values of the expected kind."""

from __future__ import annotations

import datetime as dt
import difflib
import re
import sys
from collections.abc import Collection, Iterable, Mapping
from decimal import Decimal
from typing import Any

from cellsim.errors import Problem
from cellsim.uncertainty.specs import Formula, Number
from cellsim.uncertainty.toml_lines import KeyPath

_PERCENT = re.compile(r"\s*([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+))\s*%\s*\Z")
_NUMERIC = re.compile(r"\s*[+-]?(?:[0-9]+[.,]?[0-9]*|[.,][0-9]+)(?:[eE][+-]?[0-9]+)?\s*\Z")
_NUMBER_EXPECTED = 'a number, a percentage such as "2.5%" or a formula such as "=Inputs!C6"'


class Findings:
    """The problems of one side-car, each at its line.

    Args:
        file: The file's name as it is shown.
        lines: The line of every key path.
    """

    def __init__(self, file: str, lines: Mapping[KeyPath, int]) -> None:
        self._file = file
        self._lines = lines
        self._found: list[tuple[int, Problem]] = []

    def add(self, path: KeyPath, message: str, hint: str = "") -> None:
        """Notes a problem at a key path, or at the nearest one above it that the file spells out."""
        line = self.line(path)
        place = f"{self._file}, line {line}" if line else self._file
        self._found.append((line, Problem(place, message, hint)))

    def problems(self) -> tuple[Problem, ...]:
        """All problems by line, those of one line in the order found."""
        return tuple(problem for _, problem in sorted(self._found, key=lambda found: found[0]))

    def line(self, path: KeyPath) -> int:
        """The line of a key path, or of the nearest one above it; 0 for the whole file."""
        while path and path not in self._lines:
            path = path[:-1]
        return self._lines.get(path, 0)

    def key_lines(self, path: KeyPath, keys: Iterable[str]) -> dict[str, int]:
        """The line of each key of a table."""
        return {key: self.line((*path, key)) for key in keys}

    def unknown_key(self, path: KeyPath, known: Collection[str]) -> None:
        """Notes a key that means nothing where it stands, with the nearest one that does."""
        section = _section_name(path[:-1])
        hint = nearest(str(path[-1]), known) or f"known here: {', '.join(sorted(known))}"
        self.add(path, f"unknown key {path[-1]!r} in {section}", hint)

    def table(self, path: KeyPath, value: Any) -> dict[str, Any] | None:
        """The value if it is a table."""
        if isinstance(value, dict):
            return value
        self.wrong_kind(path, "a table", value)
        return None

    def text(self, path: KeyPath, value: Any) -> str | None:
        """The value, without outer spaces, if it is text that is not empty."""
        if isinstance(value, str) and value.strip():
            return value.strip()
        self.wrong_kind(path, "text", value)
        return None

    def flag(self, path: KeyPath, value: Any) -> bool | None:
        """The value if it is true or false."""
        if isinstance(value, bool):
            return value
        self.wrong_kind(path, "true or false", value)
        return None

    def whole_number(self, path: KeyPath, value: Any, least: int, most: int) -> int | None:
        """The value if it is a whole number within bounds."""
        if isinstance(value, int) and not isinstance(value, bool) and least <= value <= most:
            return value
        self.wrong_kind(path, f"a whole number from {least} to {most}", value)
        return None

    def number(self, path: KeyPath, value: Any) -> Number | None:
        """The value if it is a finite number, a percentage or a formula."""
        if isinstance(value, (int, float)) and not isinstance(value, bool):
            if abs(value) <= sys.float_info.max:
                return float(value)
            self.add(path, f"{_value_name(path)} must be a finite number, read {spell_toml(value)}")
            return None
        if isinstance(value, str):
            return self._number_from_text(path, value)
        self.wrong_kind(path, _NUMBER_EXPECTED, value)
        return None

    def plain_number(self, path: KeyPath, value: Any) -> float | None:
        """The value if it is a finite number or a percentage."""
        number = self.number(path, value)
        if isinstance(number, Formula):
            self.wrong_kind(path, "a number; a formula is not available here yet", value)
            return None
        return number

    def wrong_kind(self, path: KeyPath, expected: str, value: Any) -> None:
        """Notes that something else was expected."""
        self.add(path, f"{_value_name(path)} must be {expected}, read {spell_toml(value)}")

    def _number_from_text(self, path: KeyPath, text: str) -> Number | None:
        if text.startswith("=") and text[1:].strip():
            return Formula(text[1:].strip(), self.line(path))
        percent = _PERCENT.match(text)
        if percent:
            return float(Decimal(percent[1]) / 100)
        hint = f"write {text.strip().replace(',', '.')} without quotes" * bool(_NUMERIC.match(text))
        read = spell_toml(text)
        self.add(path, f"{_value_name(path)} must be {_NUMBER_EXPECTED}, read {read}", hint)
        return None


def nearest(word: str, known: Collection[str]) -> str:
    """`did you mean 'draws'?`, or "" if no known word is near."""
    match = nearest_word(word, known)
    return f"did you mean {match!r}?" if match else ""


def nearest_word(word: str, known: Collection[str]) -> str | None:
    """The known word that is nearest in spelling, or None if none is near."""
    by_folded = {one.casefold(): one for one in known}
    matches = difflib.get_close_matches(word.casefold(), by_folded, n=1)
    return by_folded[matches[0]] if matches else None


def spell_toml(value: Any) -> str:
    """A TOML value as a message shows it."""
    match value:
        case bool():
            return str(value).lower()
        case str():
            return f'"{value}"' if len(value) <= 60 else f'"{value[:57]}..."'
        case int() if abs(value) >= 10**30:
            return "a number of more than 30 digits"
        case int() | float() | dt.date() | dt.time():
            return str(value)
        case list():
            return "an empty list" if not value else "a list"
        case _:
            return "a table"


def _value_name(path: KeyPath) -> str:
    """`mean`, or `values, item 2` for a list's element."""
    last = path[-1]
    if isinstance(last, int) and len(path) > 1:
        return f"{_value_name(path[:-1])}, item {last + 1}"
    return str(last)


def _section_name(path: KeyPath) -> str:
    if not path:
        return "the side-car"
    if isinstance(path[-1], int):
        return f"[[{path[-2]}]]"
    return f"[{'.'.join(str(part) for part in path)}]"
