"""From tokens to a tree: precedence climbing over a table of operators.

Bounds: a formula has at most 8,192 characters (the file format's own limit) and is nested at most 128
levels deep. A chain of operators without parentheses is nested to the left without bound, one level
for each operator.
"""

from __future__ import annotations

import re

from cellsim.cells import LAST_COLUMN, LAST_ROW, column_number, parse_address
from cellsim.errors import FormulaSyntaxError, Problem
from cellsim.formula.lexer import LexicalError, Token, tokenize
from cellsim.formula.structured import parse_structured
from cellsim.formula.tree import (
    ArrayLiteral,
    Binary,
    Call,
    CellReference,
    ErrorLiteral,
    Invocation,
    LogicalLiteral,
    MissingArgument,
    NameReference,
    Node,
    NumberLiteral,
    Postfix,
    RangeReference,
    SheetPrefix,
    StructuredReference,
    TextLiteral,
    Unary,
)
from cellsim.values import ERROR_BY_SPELLING, ErrorValue, Scalar

LONGEST_FORMULA = 8_192
DEEPEST_NESTING = 128

# Binding powers from loose to tight; all infix operators are left-associative.
_INFIX = {
    "=": 1, "<>": 1, "<": 1, "<=": 1, ">": 1, ">=": 1,
    "&": 2,
    "+": 3, "-": 3,
    "*": 4, "/": 4,
    "^": 5,
    ",": 8,
    " ": 9,
    ":": 10,
}  # fmt: skip
_POSTFIX_POWER = {"%": 6, "#": 11}
_PREFIX_POWER = {"-": 7, "+": 7, "@": 7}
_FUNCTION_PREFIX = re.compile(r"(?:_xlfn\.|_xlws\.|_xludf\.|_xll\.)+", re.IGNORECASE)
_CELL = re.compile(r"(\$?)([A-Za-z]{1,3})(\$?)([0-9]{1,7})\Z")
_COLUMN = re.compile(r"(\$?)([A-Za-z]{1,3})\Z")
_ROW = re.compile(r"(\$?)([0-9]{1,7})\Z")
_PARAMETER_PREFIX = "_xlpm."
_REFERENCES = (CellReference, RangeReference, NameReference, StructuredReference, ErrorLiteral)


def parse_formula(text: str, row: int, column: int, place: str = "") -> Node:
    """The tree of a formula.

    Args:
        text: The formula, with or without its leading `=`.
        row: Row of the cell for which it is written, from 1.
        column: Column of that cell, from 1.
        place: What to call the cell in messages.

    Raises:
        FormulaSyntaxError: It does not follow the grammar; the message marks the spot.
    """
    body = text.removeprefix("=")
    if len(body) > LONGEST_FORMULA:
        raise FormulaSyntaxError(
            Problem(
                place,
                f"the formula has {len(body):,} characters; at most {LONGEST_FORMULA:,} are allowed",
            )
        )
    try:
        tokens = tokenize(body)
    except LexicalError as error:
        raise _syntax_error(
            body, error.spot, place, "this begins nothing that a formula can hold"
        ) from None
    return _Parser(body, tokens, row, column, place).parse()


def _syntax_error(text: str, spot: int, place: str, message: str) -> FormulaSyntaxError:
    start, end = max(0, spot - 50), spot + 50
    shown = text[start:end].replace("\n", " ").replace("\r", " ").replace("\t", " ")
    marked = f"{message}\n    ={shown}\n    {' ' * (spot - start + 1)}^"
    return FormulaSyntaxError(Problem(place, marked))


class _Parser:
    def __init__(self, text: str, tokens: list[Token], row: int, column: int, place: str) -> None:
        self._text = text
        self._tokens = tokens
        self._row = row
        self._column = column
        self._place = place
        self._position = 0
        self._depth = 0

    def parse(self) -> Node:
        """The whole formula."""
        self._skip_space()
        node = self._expression(0, in_arguments=False)
        self._skip_space()
        if self._token.kind != "end":
            raise self._error("expected an operator or the end of the formula")
        return node

    @property
    def _token(self) -> Token:
        return self._tokens[self._position]

    def _peek(self, ahead: int = 1) -> Token:
        return self._tokens[min(self._position + ahead, len(self._tokens) - 1)]

    def _error(self, message: str) -> FormulaSyntaxError:
        return _syntax_error(self._text, self._token.start, self._place, message)

    def _skip_space(self) -> bool:
        skipped = False
        while self._token.kind == "space":
            self._position += 1
            skipped = True
        return skipped

    def _expression(self, least: int, *, in_arguments: bool) -> Node:
        self._depth += 1
        if self._depth > DEEPEST_NESTING:
            raise self._error(f"the formula is nested more than {DEEPEST_NESTING} levels deep")
        node = self._prefixed(in_arguments=in_arguments)
        while True:
            before = self._position
            spaced = self._skip_space()
            operator = self._infix_operator(node, spaced=spaced, in_arguments=in_arguments)
            if operator in _POSTFIX_POWER:
                if _POSTFIX_POWER[operator] < least:
                    self._position = before
                    break
                self._position += 1
                node = Postfix(operator, node)
                continue
            power = _INFIX.get(operator, -1)
            if power <= least and not (least == 0 and power == 0):
                self._position = before
                break
            if operator != " ":
                self._position += 1
            self._skip_space()
            right = self._expression(power, in_arguments=in_arguments)
            node = self._combine(operator, node, right)
        self._depth -= 1
        return node

    def _infix_operator(self, left: Node, *, spaced: bool, in_arguments: bool) -> str:
        token = self._token
        if token.kind == "operator":
            if spaced and token.text == "@" and self._is_reference(left):
                return " "
            return token.text
        if token.kind == "comma" and not in_arguments:
            return ","
        if (
            spaced
            and self._is_reference(left)
            and token.kind in {"word", "quoted", "open", "bracket", "error"}
        ):
            return " "
        return ""

    @staticmethod
    def _is_reference(node: Node) -> bool:
        if isinstance(node, Binary):
            return node.operator in {":", " ", ","}
        return isinstance(node, (*_REFERENCES, Call, Invocation)) or (
            isinstance(node, Postfix) and node.operator == "#"
        )

    def _combine(self, operator: str, left: Node, right: Node) -> Node:
        if (
            operator == ":"
            and isinstance(left, CellReference)
            and isinstance(right, CellReference)
            and (right.prefix is None or right.prefix == left.prefix)
        ):
            prefix = left.prefix
            return RangeReference(prefix, _bare(left), _bare(right))
        return Binary(operator, left, right)

    def _prefixed(self, *, in_arguments: bool) -> Node:
        self._skip_space()
        token = self._token
        if token.kind == "operator" and token.text in _PREFIX_POWER:
            self._position += 1
            operand = self._expression(_PREFIX_POWER[token.text], in_arguments=in_arguments)
            return Unary(token.text, operand)
        node = self._primary()
        while self._token.kind == "open" and isinstance(node, (Call, Invocation)):
            node = Invocation(node, self._arguments())
        return node

    def _primary(self) -> Node:
        token = self._token
        kind = token.kind
        if kind == "number":
            return self._number_or_rows()
        if kind == "text":
            self._position += 1
            return TextLiteral(token.text[1:-1].replace('""', '"'))
        if kind == "error":
            return self._error_literal()
        if kind == "open":
            return self._parenthesis()
        if kind == "brace" and token.text == "{":
            return self._array()
        if kind in {"quoted", "bracket"} or kind == "word":
            return self._named()
        if kind == "end":
            raise self._error("the formula ends too early")
        raise self._error("expected a value, a reference or a function")

    def _number_or_rows(self) -> Node:
        token = self._token
        if self._peek().text == ":" and token.text.isdigit():
            rows = self._whole_rows(None)
            if rows is not None:
                return rows
        if (
            self._peek().text == ":"
            and self._peek(2).kind == "word"
            and self._peek(3).kind == "bang"
        ):
            return self._named()
        if self._peek().kind == "bang":
            return self._named()
        self._position += 1
        return NumberLiteral(float(token.text))

    def _error_literal(self) -> Node:
        token = self._token
        self._position += 1
        value = ERROR_BY_SPELLING[token.text.upper()]
        if (
            value is ErrorValue.REF
            and self._token.kind == "word"
            and parse_address(self._token.text)
        ):
            self._position += 1  # what is left of a reference whose sheet is lost
        return ErrorLiteral(value)

    def _parenthesis(self) -> Node:
        self._position += 1
        node = self._expression(0, in_arguments=False)
        self._skip_space()
        if self._token.kind != "close":
            raise self._error("expected a closing parenthesis")
        self._position += 1
        return node

    def _array(self) -> Node:
        self._position += 1
        rows: list[tuple[Scalar, ...]] = []
        items: list[Scalar] = []
        while True:
            items.append(self._array_item())
            token = self._token
            self._position += 1
            if token.kind == "comma":
                continue
            rows.append(tuple(items))
            items = []
            if token.kind == "semicolon":
                continue
            if token.text == "}":
                break
            self._position -= 1
            raise self._error("expected a comma, a semicolon or a closing brace")
        if len({len(items) for items in rows}) != 1:
            self._position -= 1
            raise self._error("the rows of an array constant differ in length")
        return ArrayLiteral(tuple(rows))

    def _array_item(self) -> Scalar:
        self._skip_space()
        sign = 1.0
        while self._token.text in {"-", "+"}:
            sign = -sign if self._token.text == "-" else sign
            self._position += 1
        token = self._token
        value: Scalar
        if token.kind == "number":
            value = sign * float(token.text)
        elif token.kind == "text":
            value = token.text[1:-1].replace('""', '"')
        elif token.kind == "error":
            value = ERROR_BY_SPELLING[token.text.upper()]
        elif token.text.upper() in {"TRUE", "FALSE"}:
            value = token.text.upper() == "TRUE"
        elif token.kind in {"comma", "semicolon"} or token.text == "}":
            return None
        else:
            raise self._error("expected a constant")
        self._position += 1
        if self._token.text == "%" and isinstance(value, float):
            self._position += 1
            value /= 100
        self._skip_space()
        return value

    def _arguments(self) -> tuple[Node, ...]:
        self._position += 1
        self._skip_space()
        if self._token.kind == "close":
            self._position += 1
            return ()
        arguments: list[Node] = []
        while True:
            self._skip_space()
            if self._token.kind in {"comma", "close"}:
                arguments.append(MissingArgument())
            else:
                arguments.append(self._expression(0, in_arguments=True))
            self._skip_space()
            token = self._token
            if token.kind == "close":
                self._position += 1
                return tuple(arguments)
            if token.kind != "comma":
                raise self._error("expected a comma or a closing parenthesis")
            self._position += 1

    # References and names.

    def _named(self) -> Node:
        prefix = self._sheet_prefix()
        token = self._token
        if prefix is not None:
            if token.kind == "error":
                self._position += 1
                return ErrorLiteral(ERROR_BY_SPELLING[token.text.upper()])
            if token.kind == "number":
                rows = self._whole_rows(prefix)
                if rows is not None:
                    return rows
        if token.kind == "bracket":
            self._position += 1
            return self._structured(None, token)
        if token.kind != "word":
            raise self._error("expected a reference or a name")
        following = self._peek()
        if following.kind == "open":
            self._position += 1
            return self._call(token, prefix)
        if following.kind == "bracket":
            self._position += 2
            return self._structured(token.text, following)
        return self._word(prefix)

    def _word(self, prefix: SheetPrefix | None) -> Node:
        token = self._token
        cell = self._cell(token.text, prefix)
        if cell is not None:
            self._position += 1
            return cell
        whole = self._whole_columns(prefix) or self._whole_rows(prefix)
        if whole is not None:
            return whole
        self._position += 1
        upper = token.text.upper()
        if prefix is None and upper in {"TRUE", "FALSE"}:
            return LogicalLiteral(upper == "TRUE")
        name = token.text
        if name.lower().startswith(_PARAMETER_PREFIX):
            name = name[len(_PARAMETER_PREFIX) :]
        if "$" in name or name[0].isdigit() or name[0] in "?.":
            self._position -= 1
            raise self._error("this is no reference, name or number")
        return NameReference(prefix, name)

    def _sheet_prefix(self) -> SheetPrefix | None:
        """The sheet before a `!`, if there is one at this place."""
        start = self._position
        token = self._token
        workbook: str | None = None
        if token.kind == "quoted":
            if self._peek().kind != "bang":
                raise self._error("expected a `!` after a quoted sheet name")
            self._position += 2
            return _quoted_prefix(token.text[1:-1].replace("''", "'"))
        if token.kind == "bracket":
            workbook = token.text[1:-1]
            self._position += 1
            if self._token.kind == "bang":
                self._position += 1
                return SheetPrefix(workbook, "")
        first = self._title()
        if first and self._token.kind == "bang":
            self._position += 1
            return SheetPrefix(workbook, first)
        if first and self._token.text == ":":
            self._position += 1
            last = self._title()
            if last and self._token.kind == "bang":
                self._position += 1
                return SheetPrefix(workbook, first, last)
        self._position = start
        return None

    def _title(self) -> str:
        """An unquoted sheet title: words and numbers without a break."""
        parts: list[str] = []
        while self._token.kind in {"word", "number"}:
            parts.append(self._token.text)
            self._position += 1
        return "".join(parts)

    def _cell(self, text: str, prefix: SheetPrefix | None) -> CellReference | None:
        match = _CELL.match(text)
        if match is None:
            return None
        column, row = column_number(match[2]), int(match[4])
        if column > LAST_COLUMN or not 1 <= row <= LAST_ROW:
            return None
        return self._reference(prefix, row, column, not match[3], not match[1])

    def _reference(
        self,
        prefix: SheetPrefix | None,
        row: int,
        column: int,
        row_relative: bool,
        column_relative: bool,
    ) -> CellReference:
        return CellReference(
            prefix,
            row - self._row if row_relative else row,
            column - self._column if column_relative else column,
            row_relative,
            column_relative,
        )

    def _whole_columns(self, prefix: SheetPrefix | None) -> RangeReference | None:
        first, last = _COLUMN.match(self._token.text), _COLUMN.match(self._peek(2).text)
        if self._peek().text != ":" or first is None or last is None:
            return None
        columns = column_number(first[2]), column_number(last[2])
        if max(columns) > LAST_COLUMN:
            return None
        self._position += 3
        return RangeReference(
            prefix,
            self._reference(None, 1, columns[0], False, not first[1]),
            self._reference(None, LAST_ROW, columns[1], False, not last[1]),
            "columns",
        )

    def _whole_rows(self, prefix: SheetPrefix | None) -> RangeReference | None:
        first, last = _ROW.match(self._token.text), _ROW.match(self._peek(2).text)
        if self._peek().text != ":" or first is None or last is None:
            return None
        rows = int(first[2]), int(last[2])
        if not (min(rows) >= 1 and max(rows) <= LAST_ROW):
            return None
        self._position += 3
        return RangeReference(
            prefix,
            self._reference(None, rows[0], 1, not first[1], False),
            self._reference(None, rows[1], LAST_COLUMN, not last[1], False),
            "rows",
        )

    def _structured(self, table: str | None, bracket: Token) -> Node:
        node = parse_structured(table, bracket.text)
        if node is None:
            raise _syntax_error(
                self._text, bracket.start, self._place, "this is no reference into a table"
            )
        return node

    def _call(self, token: Token, prefix: SheetPrefix | None) -> Node:
        name = _FUNCTION_PREFIX.sub("", token.text)
        if name.lower().startswith(_PARAMETER_PREFIX):
            name = name[len(_PARAMETER_PREFIX) :]
        arguments = self._arguments()
        upper = name.upper()
        if upper == "SINGLE" and len(arguments) == 1:
            return Unary("@", arguments[0])
        if upper == "ANCHORARRAY" and len(arguments) == 1:
            return Postfix("#", arguments[0])
        if prefix is not None and prefix.workbook is None and prefix.first:
            return Invocation(NameReference(prefix, name), arguments)
        return Call(upper, arguments)


def _bare(cell: CellReference) -> CellReference:
    if cell.prefix is None:
        return cell
    return CellReference(None, cell.row, cell.column, cell.row_relative, cell.column_relative)


def _quoted_prefix(text: str) -> SheetPrefix:
    workbook: str | None = None
    end = text.rfind("]")
    start = text.find("[")
    if start >= 0 and end > start:
        workbook = text[start + 1 : end] if start == 0 else text[:start] + text[start + 1 : end]
        text = text[end + 1 :]
    first, colon, last = text.partition(":")
    return SheetPrefix(workbook, first, last if colon else None)
