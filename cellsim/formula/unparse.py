"""From a tree back to text, with no more parentheses than needed."""

from __future__ import annotations

from cellsim.cells import LAST_COLUMN, LAST_ROW, column_letters, quote_title
from cellsim.formula.tree import (
    ArrayLiteral,
    Binary,
    Call,
    CellReference,
    Invocation,
    MissingArgument,
    NameReference,
    Node,
    Postfix,
    RangeReference,
    SheetPrefix,
    StructuredReference,
    Unary,
)
from cellsim.values import ErrorValue, Scalar

_POWERS = {
    "=": 1, "<>": 1, "<": 1, "<=": 1, ">": 1, ">=": 1,
    "&": 2, "+": 3, "-": 3, "*": 4, "/": 4, "^": 5, "%": 6, ",": 8, " ": 9, ":": 10, "#": 11,
}  # fmt: skip
_UNARY_POWER = 7
_TIGHTEST = 12


def unparse(node: Node, row: int, column: int) -> str:
    """The text of a formula without its `=`, for a cell at a row and column counted from 1."""
    return _text(node, row, column, 0)


def _text(node: Node, row: int, column: int, least: int) -> str:
    text, power = _with_power(node, row, column)
    return f"({text})" if power < least else text


def _with_power(node: Node, row: int, column: int) -> tuple[str, int]:
    if isinstance(node, Binary):
        power = _POWERS[node.operator]
        left = _text(node.left, row, column, power)
        right = _text(node.right, row, column, power + 1)
        return f"{left}{node.operator}{right}", power
    if isinstance(node, Unary):
        return node.operator + _text(node.operand, row, column, _UNARY_POWER), _UNARY_POWER
    if isinstance(node, Postfix):
        power = _POWERS[node.operator]
        return _text(node.operand, row, column, power) + node.operator, power
    return _atom(node, row, column), _TIGHTEST


def _atom(node: Node, row: int, column: int) -> str:
    if isinstance(node, (CellReference, RangeReference)):
        return _prefix(node.prefix) + _reference(node, row, column)
    if isinstance(node, (Call, Invocation)):
        head = node.name if isinstance(node, Call) else _text(node.function, row, column, _TIGHTEST)
        return f"{head}({','.join(_text(argument, row, column, _POWERS[','] + 1 if _is_union(argument) else 0) for argument in node.arguments)})"
    if isinstance(node, NameReference):
        return _prefix(node.prefix) + node.name
    if isinstance(node, StructuredReference):
        return _structured(node)
    if isinstance(node, ArrayLiteral):
        return (
            "{" + ";".join(",".join(_scalar(item) for item in items) for items in node.rows) + "}"
        )
    if isinstance(node, MissingArgument):
        return ""
    return _scalar(getattr(node, "value"))  # noqa: B009  (the literals; operators were handled before)


def _is_union(node: Node) -> bool:
    return isinstance(node, Binary) and node.operator == ","


def _scalar(value: Scalar) -> str:
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, float):
        return (
            f"{int(value)}"
            if value == int(value) and abs(value) < 1e15
            else repr(value).upper().replace("E+", "E")
        )
    if isinstance(value, ErrorValue):
        return str(value)
    if value is None:
        return ""
    return '"' + value.replace('"', '""') + '"'


def _prefix(prefix: SheetPrefix | None) -> str:
    if prefix is None:
        return ""
    sheets = prefix.first if prefix.last is None else f"{prefix.first}:{prefix.last}"
    if prefix.workbook is not None:
        plain = quote_title(prefix.first) == prefix.first and prefix.workbook.isdigit()
        inner = f"[{prefix.workbook}]{sheets}"
        return f"{inner}!" if plain or not sheets else "'" + inner.replace("'", "''") + "'!"
    plain = all(quote_title(title) == title for title in (prefix.first, prefix.last) if title)
    return f"{sheets}!" if plain else "'" + sheets.replace("'", "''") + "'!"


def _reference(node: CellReference | RangeReference, row: int, column: int) -> str:
    if isinstance(node, CellReference):
        return _column(node, column) + _row(node, row)
    if node.whole == "columns":
        return f"{_column(node.first, column)}:{_column(node.last, column)}"
    if node.whole == "rows":
        return f"{_row(node.first, row)}:{_row(node.last, row)}"
    return f"{_reference(node.first, row, column)}:{_reference(node.last, row, column)}"


def _column(cell: CellReference, column: int) -> str:
    if not cell.column_relative:
        return "$" + column_letters(cell.column)
    return column_letters((cell.column + column - 1) % LAST_COLUMN + 1)


def _row(cell: CellReference, row: int) -> str:
    if not cell.row_relative:
        return f"${cell.row}"
    return f"{(cell.row + row - 1) % LAST_ROW + 1}"


def _structured(node: StructuredReference) -> str:
    head = node.table or ""
    columns = [c for c in (node.first_column, node.last_column) if c is not None]
    escaped = [_escape(c) for c in columns]
    if not node.items and len(escaped) <= 1:
        return f"{head}[{escaped[0] if escaped else ''}]"
    if len(node.items) == 1 and not escaped:
        return f"{head}[{_item(node.items[0])}]"
    parts = [f"[{_item(item)}]" for item in node.items]
    if escaped:
        parts.append(":".join(f"[{c}]" for c in escaped))
    return f"{head}[{','.join(parts)}]"


def _item(item: str) -> str:
    return {"#THIS ROW": "#This Row"}.get(item, "#" + item[1:].capitalize())


def _escape(heading: str) -> str:
    return "".join("'" + c if c in "[]#'@" else c for c in heading)
