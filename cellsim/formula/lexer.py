"""From text to tokens: a dumb lexer that knows shapes, not meaning."""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Token:
    """A piece of a formula.

    Attributes:
        kind: "number", "text", "error", "word", "quoted", "bracket", "operator", "open", "close",
            "brace", "comma", "semicolon", "space", "bang" or "end".
        text: As written.
        start: Where it begins.
    """

    kind: str
    text: str
    start: int


_PATTERNS = (
    ("space", r"[ \t\r\n\u00a0]+"),
    ("text", r'"(?:[^"]|"")*"'),
    (
        "error",
        r"#(?:NULL!|DIV/0!|VALUE!|REF!|NAME\?|NUM!|N/A|GETTING_DATA|SPILL!|CONNECT!|BLOCKED!|UNKNOWN!|FIELD!|CALC!|BUSY!)",
    ),
    ("number", r"(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?(?![\w.])"),
    ("word", r"[$\w\\?.]+"),
    ("quoted", r"'(?:[^']|'')*'"),
    ("operator", r"<>|<=|>=|[-+*/^&=<>%:@#]"),
    ("open", r"\("),
    ("close", r"\)"),
    ("brace", r"[{}]"),
    ("comma", r","),
    ("semicolon", r";"),
    ("bang", r"!"),
)
_TOKEN = re.compile(
    "|".join(f"(?P<{name}>{pattern})" for name, pattern in _PATTERNS), re.IGNORECASE
)


class LexicalError(Exception):
    """A character that begins no token.

    Attributes:
        spot: Where it stands.
    """

    def __init__(self, spot: int) -> None:
        super().__init__(spot)
        self.spot = spot


def tokenize(text: str) -> list[Token]:
    """The tokens of a formula, blanks included, with an "end" token last.

    Raises:
        LexicalError: Something begins no token, or a quotation or bracket does not end.
    """
    tokens: list[Token] = []
    spot = 0
    match_at = _TOKEN.match
    while spot < len(text):
        if text[spot] == "[":
            end = _bracket_end(text, spot)
            tokens.append(Token("bracket", text[spot:end], spot))
            spot = end
            continue
        match = match_at(text, spot)
        if match is None:
            raise LexicalError(spot)
        tokens.append(Token(match.lastgroup or "", match[0], spot))
        spot = match.end()
    tokens.append(Token("end", "", spot))
    return tokens


def _bracket_end(text: str, start: int) -> int:
    """Where a bracket that may hold others ends; an apostrophe takes the next character as it is."""
    depth = 0
    spot = start
    while spot < len(text):
        character = text[spot]
        if character == "'":
            spot += 2
            continue
        if character == "[":
            depth += 1
        elif character == "]":
            depth -= 1
            if depth == 0:
                return spot + 1
        spot += 1
    raise LexicalError(start)
