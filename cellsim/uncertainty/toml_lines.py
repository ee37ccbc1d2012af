"""Finds the line of every key and list element of a TOML text, which `tomllib` does not tell."""

from __future__ import annotations

import bisect
import re
import tomllib
from typing import TypeAlias

KeyPath: TypeAlias = tuple[str | int, ...]
"""The way to a value: keys, and positions (from 0) in lists and arrays of tables."""

_SPACE = re.compile(r"[ \t]*")
_SPACE_AND_LINES = re.compile(r"(?:[ \t\r\n]+|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_STRING = re.compile(
    r'"""(?:[^\\]|\\.)*?"{3,5}'  # closing quotes may be preceded by up to two quotes of the text
    r"|'''.*?'{3,5}"
    r'|"(?:[^"\\\n]|\\.)*"'
    r"|'[^'\n]*'",
    re.DOTALL,
)
_SCALAR = re.compile(r"[^,\]}#\n]+")


def locate_lines(text: str) -> dict[KeyPath, int]:
    """The line, counted from 1, on which each key, section or list element first stands.

    Args:
        text: A TOML document that `tomllib.loads` accepts.

    Returns:
        One entry for every table, key and element; sections that a dotted name only implies stand
        at the line of that name.
    """
    return _Scanner(text).scan()


class _Scanner:
    """Walks a valid document once; knows strings, comments and brackets, not values."""

    def __init__(self, text: str) -> None:
        self._text = text
        self._at = 0
        self._ends = [match.start() for match in re.finditer("\n", text)]
        self._lines: dict[KeyPath, int] = {}
        self._tables_in_array: dict[KeyPath, int] = {}

    def scan(self) -> dict[KeyPath, int]:
        section: KeyPath = ()
        self._skip(_SPACE_AND_LINES)
        while self._at < len(self._text):
            if self._text.startswith("[[", self._at):
                section = self._array_section()
            elif self._text[self._at] == "[":
                section = self._table_section()
            else:
                self._key_and_value(section)
            self._skip(_SPACE_AND_LINES)
        return self._lines

    def _array_section(self) -> KeyPath:
        line = self._line()
        self._at += 2
        *parents, last = self._key()
        self._at += 2
        array = (*self._enter((), parents, line), last)
        position = self._tables_in_array.get(array, 0)
        self._tables_in_array[array] = position + 1
        self._lines.setdefault(array, line)
        self._lines[(*array, position)] = line
        return (*array, position)

    def _table_section(self) -> KeyPath:
        line = self._line()
        self._at += 1
        parts = self._key()
        self._at += 1
        return self._enter((), parts, line)

    def _key_and_value(self, section: KeyPath) -> None:
        line = self._line()
        path = self._enter(section, self._key(), line)
        self._at += 1  # the equals sign
        self._skip(_SPACE)
        self._value(path)

    def _enter(self, path: KeyPath, parts: list[str], line: int) -> KeyPath:
        """Follows keys downward, into the latest table of an array of tables."""
        for part in parts:
            path = (*path, part)
            self._lines.setdefault(path, line)
            if path in self._tables_in_array:
                path = (*path, self._tables_in_array[path] - 1)
        return path

    def _key(self) -> list[str]:
        """The parts of a key; leaves the position at the `=` or `]` that follows it."""
        parts: list[str] = []
        while True:
            self._skip(_SPACE)
            quoted = self._text[self._at] in "\"'"
            match = (_STRING if quoted else _BARE_KEY).match(self._text, self._at)
            if match is None:
                raise ValueError(f"no TOML key at position {self._at}")
            self._at = match.end()
            parts.append(_unquote(match[0]) if quoted else match[0])
            self._skip(_SPACE)
            if self._text[self._at] != ".":
                return parts
            self._at += 1

    def _value(self, path: KeyPath) -> None:
        match self._text[self._at]:
            case '"' | "'":
                self._skip(_STRING)
            case "[":
                self._list(path)
            case "{":
                self._inline_table(path)
            case _:
                self._skip(_SCALAR)

    def _list(self, path: KeyPath) -> None:
        position = 0
        self._at += 1
        while self._next_item("]"):
            element = (*path, position)
            self._lines[element] = self._line()
            self._value(element)
            position += 1

    def _inline_table(self, path: KeyPath) -> None:
        self._at += 1
        while self._next_item("}"):
            self._key_and_value(path)

    def _next_item(self, closing: str) -> bool:
        """Moves past commas to the next item; False once past the closing bracket."""
        self._skip(_SPACE_AND_LINES)
        while self._text[self._at] == ",":
            self._at += 1
            self._skip(_SPACE_AND_LINES)
        if self._text[self._at] == closing:
            self._at += 1
            return False
        return True

    def _skip(self, pattern: re.Pattern[str]) -> None:
        match = pattern.match(self._text, self._at)
        if match is not None:
            self._at = match.end()

    def _line(self) -> int:
        return bisect.bisect_left(self._ends, self._at) + 1


def _unquote(key: str) -> str:
    (name,) = tomllib.loads(f"{key} = 0")
    return name
