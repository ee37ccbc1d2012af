"""Number format codes taken apart (ECMA-376 Part 1, 18.8.31, in English)."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum
from functools import lru_cache

from cellsim.values import ErrorValue, Fault


class Kind(Enum):
    """What a token of a format code is."""

    LITERAL = "literal"
    DIGIT = "digit"
    POINT = "point"
    COMMA = "comma"
    PERCENT = "percent"
    EXPONENT = "exponent"
    SLASH = "slash"
    TEXT = "text"
    GENERAL = "general"
    DATE = "date"
    ELAPSED = "elapsed"
    HALF_DAY = "half day"


@dataclass(frozen=True, slots=True)
class Token:
    """A token of a format code.

    Attributes:
        kind: What it is.
        text: A literal's text without its quotes, else the code; date codes in small letters.
    """

    kind: Kind
    text: str


@dataclass(frozen=True, slots=True)
class Section:
    """One of the parts of a format code between semicolons.

    Attributes:
        condition: Operator and bound that a number must satisfy, or None.
        tokens: What it shows.
    """

    condition: tuple[str, float] | None
    tokens: tuple[Token, ...]

    def has(self, *kinds: Kind) -> bool:
        """Whether a token of one of some kinds is in it."""
        return any(token.kind in kinds for token in self.tokens)

    @property
    def is_date(self) -> bool:
        """Whether it shows a date or a time."""
        return self.has(Kind.DATE, Kind.ELAPSED, Kind.HALF_DAY)

    @property
    def is_text(self) -> bool:
        """Whether it shows a text."""
        return self.has(Kind.TEXT)


_TOKEN = re.compile(
    r'"(?P<quoted>[^"]*)"'
    r"|\\(?P<escaped>.)"
    r"|(?P<skip>_.)"
    r"|(?P<fill>\*.)"
    r"|\[(?P<elapsed>h+|m+|s+)\]"
    r"|\[\s*(?P<operator><=|>=|<>|<|>|=)\s*(?P<bound>-?[\d.]+(?:E[-+]?\d+)?)\s*\]"
    r"|\[\$(?P<currency>[^\]-]*)(?:-[^\]]*)?\]"
    r"|(?P<colour>\[[^\]]*\])"
    r"|(?P<general>General)"
    r"|(?P<half>AM/PM|A/P)"
    r"|(?P<date>y+|m+|d+|h+|s+)"
    r"|(?P<exponent>E[-+])"
    r"|(?P<digit>[0#?])"
    r"|(?P<section>;)"
    r"|(?P<other>.)",
    re.IGNORECASE | re.DOTALL,
)
_OTHERS = {
    ".": Kind.POINT,
    ",": Kind.COMMA,
    "%": Kind.PERCENT,
    "/": Kind.SLASH,
    "@": Kind.TEXT,
}
_KINDS = {
    "quoted": Kind.LITERAL,
    "escaped": Kind.LITERAL,
    "currency": Kind.LITERAL,
    "elapsed": Kind.ELAPSED,
    "general": Kind.GENERAL,
    "half": Kind.HALF_DAY,
    "date": Kind.DATE,
    "exponent": Kind.EXPONENT,
    "digit": Kind.DIGIT,
}
_LEFT_OUT = {"fill", "colour"}


@lru_cache(maxsize=2048)
def parse_format(code: str) -> tuple[Section, ...]:
    """The sections of a format code.

    Raises:
        Fault: A quote is not closed, or a text code stands where none may (#VALUE!).
    """
    sections: list[Section] = []
    condition: tuple[str, float] | None = None
    tokens: list[Token] = []
    for match in _TOKEN.finditer(code):
        name = match.lastgroup or ""
        if name == "section":
            sections.append(Section(condition, tuple(tokens)))
            condition, tokens = None, []
        elif name == "bound":
            condition = match["operator"], float(match["bound"])
        else:
            tokens.extend(_tokens_of(name, match[name]))
    sections.append(Section(condition, tuple(tokens)))
    early = any(section.is_text for section in sections[:-1])
    mixed = sections[-1].is_text and sections[-1].has(Kind.DIGIT)
    if early or mixed:
        raise Fault(ErrorValue.VALUE)
    return tuple(sections)


def _tokens_of(name: str, text: str) -> Iterator[Token]:
    """The token of a match; none for what is not shown in plain text."""
    if name in _LEFT_OUT:
        return
    if name == "skip":  # the width of a character
        yield Token(Kind.LITERAL, " ")
    elif name == "other":
        if text == '"':
            raise Fault(ErrorValue.VALUE)
        yield Token(_OTHERS.get(text, Kind.LITERAL), text)
    else:
        kind = _KINDS[name]
        yield Token(kind, text.lower() if kind in (Kind.DATE, Kind.ELAPSED) else text)
