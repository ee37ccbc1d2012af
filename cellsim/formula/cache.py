"""One tree for all formulas of a shape: filled formulas differ only in where they stand."""

from __future__ import annotations

import re

from cellsim.cells import column_number
from cellsim.formula.parser import parse_formula
from cellsim.formula.tree import Node

_SHAPE = re.compile(
    r'"(?:[^"]|"")*"'
    r"|'(?:[^']|'')*'!"
    r"|\[[^\]]*\]"
    r"|(?<![\w.$\\?])(\$?)([A-Za-z]{1,3})(\$?)([0-9]{1,7})(?![\w.(!\\?])"
)


class FormulaCache:
    """Parses each shape of formula once: filled formulas differ only in where they stand."""

    def __init__(self) -> None:
        self._trees: dict[str, Node] = {}

    def parse(self, text: str, row: int, column: int, place: str) -> Node:
        """The tree of a formula; the same object for all formulas of one shape.

        Args:
            text: The formula, with or without its leading `=`.
            row: Row of the cell for which it is written.
            column: Column of that cell.
            place: What to call the cell in messages.

        Raises:
            FormulaSyntaxError: It does not follow the grammar.
        """

        def relative(match: re.Match[str]) -> str:
            letters = match[2]
            if letters is None:
                return match[0]
            r = match[4] if match[3] else f"[{int(match[4]) - row}]"
            c = match[2].upper() if match[1] else f"[{column_number(letters) - column}]"
            return f"\x01{r}\x02{c}"

        shape = _SHAPE.sub(relative, text)
        if ":" in text and _WHOLE.search(text):
            shape += f"\x03{row}\x03{column}"  # whole columns and rows are not normalised
        tree = self._trees.get(shape)
        if tree is None:
            tree = parse_formula(text, row, column, place)
            self._trees[shape] = tree
        return tree


_WHOLE = re.compile(r"(?<![\w.])(?:\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}|\$?\d+:\$?\d+)(?![\w.(])")
