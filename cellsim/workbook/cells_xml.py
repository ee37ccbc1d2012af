"""One pass over a sheet's XML: constants, formulas and stored values together, by the expat parser."""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass, field
from typing import Any
from xml.parsers import expat

from cellsim.cells import RangeRef, column_number, parse_address
from cellsim.errors import ModelError, Problem
from cellsim.values import ERROR_BY_SPELLING, ErrorValue, Scalar
from cellsim.workbook.model import DataTable, FormulaCell, Position
from cellsim.workbook.xml_parts import is_on, refused, unescape

_EPOCH_1900 = dt.datetime(1899, 12, 30)  # noqa: DTZ001  (serial numbers have no time zone)
_EPOCH_1904 = dt.datetime(1904, 1, 1)  # noqa: DTZ001


@dataclass(slots=True)
class SheetCells:
    """What one sheet's XML holds.

    Attributes:
        constants: Values of cells without a formula.
        formulas: Cells with a formula.
        styles: Index of the cell format by position, where it is not 0.
        hidden_rows: Hidden rows.
        hidden_columns: Hidden columns.
        filter_area: The autofilter's area as written, or "".
    """

    constants: dict[Position, Scalar] = field(default_factory=dict)
    formulas: dict[Position, FormulaCell] = field(default_factory=dict)
    styles: dict[Position, int] = field(default_factory=dict)
    hidden_rows: set[int] = field(default_factory=set)
    hidden_columns: set[int] = field(default_factory=set)
    filter_area: str = ""


class _RefusedError(Exception):
    """The XML declares a document type."""


def read_cells(
    content: bytes, title: str, shared_strings: list[str], *, date_1904: bool, file: str, part: str
) -> SheetCells:
    """Read a sheet's XML.

    Args:
        content: The XML.
        title: The sheet's title.
        shared_strings: The workbook's shared strings.
        date_1904: Whether dates count from 1904.
        file: The file's name, for messages.
        part: The part's name, for messages.

    Raises:
        ModelError: It is not well-formed, or declares entities.
    """
    reader = _SheetReader(title, shared_strings, date_1904=date_1904)
    _parse(content, reader, file, part)
    reader.finish()
    return reader.cells


def read_shared_strings(content: bytes, file: str, part: str) -> list[str]:
    """The shared strings, rich text as plain text, phonetic readings left out.

    Raises:
        ModelError: The part is not well-formed, or declares entities.
    """
    reader = _StringReader()
    _parse(content, reader, file, part)
    return reader.strings


def _parse(content: bytes, reader: Any, file: str, part: str) -> None:
    parser = expat.ParserCreate(namespace_separator="}")
    parser.buffer_text = True
    parser.StartElementHandler = reader.start
    parser.EndElementHandler = reader.end
    parser.CharacterDataHandler = reader.text

    def refuse(*_: object) -> None:
        raise _RefusedError

    parser.StartDoctypeDeclHandler = refuse
    parser.EntityDeclHandler = refuse
    try:
        parser.Parse(content, True)
    except expat.ExpatError as error:
        raise ModelError(
            Problem(file, f"the part {part} is not well-formed XML: {error}")
        ) from error
    except _RefusedError as error:
        raise refused(file, part) from error


class _StringReader:
    def __init__(self) -> None:
        self.strings: list[str] = []
        self._parts: list[str] = []
        self._in_text = False
        self._phonetic = 0

    def start(self, name: str, _attributes: dict[str, str]) -> None:
        """An element begins."""
        tag = name.rpartition("}")[2]
        if tag == "si":
            self._parts = []
        elif tag == "t":
            self._in_text = not self._phonetic
        elif tag == "rPh":
            self._phonetic += 1

    def end(self, name: str) -> None:
        """An element ends."""
        tag = name.rpartition("}")[2]
        if tag == "si":
            self.strings.append(unescape("".join(self._parts)))
        elif tag == "t":
            self._in_text = False
        elif tag == "rPh":
            self._phonetic -= 1

    def text(self, data: str) -> None:
        """Characters inside an element."""
        if self._in_text:
            self._parts.append(data)


class _SheetReader:
    def __init__(self, title: str, shared_strings: list[str], *, date_1904: bool) -> None:
        self.cells = SheetCells()
        self._title = title
        self._strings = shared_strings
        self._epoch = _EPOCH_1904 if date_1904 else _EPOCH_1900
        self._masters: dict[str, tuple[str, Position]] = {}
        self._followers: list[tuple[Position, str, Scalar, bool]] = []
        self._tags: dict[str, str] = {}
        self._columns: dict[str, int] = {}
        self._row = 0
        self._column = 0
        self._cell: dict[str, str] | None = None
        self._formula: dict[str, str] | None = None
        self._formula_text: list[str] = []
        self._value: list[str] | None = None
        self._inline: list[str] = []
        self._sink: list[str] | None = None
        self._phonetic = 0

    def start(self, name: str, attributes: dict[str, str]) -> None:  # noqa: C901  (the parser's hot spot)
        """An element begins."""
        tag = self._tags.get(name)
        if tag is None:
            tag = self._tags[name] = name.rpartition("}")[2]
        if tag == "c":
            self._start_cell(attributes)
        elif tag == "v":
            if self._cell is not None:
                self._value = self._sink = []
        elif tag == "f":
            if self._cell is not None:
                self._formula = attributes
                self._formula_text = self._sink = []
        elif tag == "row":
            self._start_row(attributes)
        elif tag == "t":
            if self._cell is not None and not self._phonetic:
                self._sink = self._inline
        elif tag == "rPh":
            self._phonetic += 1
        elif tag == "col" and is_on(attributes.get("hidden")):
            first, last = int(attributes["min"]), int(attributes["max"])
            self.cells.hidden_columns.update(range(first, last + 1))
        elif tag == "autoFilter" and not self.cells.filter_area:
            self.cells.filter_area = attributes.get("ref", "")

    def end(self, name: str) -> None:
        """An element ends."""
        tag = self._tags[name]
        if tag == "c":
            self._end_cell()
        elif tag in {"v", "f", "t"}:
            self._sink = None
        elif tag == "rPh":
            self._phonetic -= 1

    def text(self, data: str) -> None:
        """Characters inside an element."""
        if self._sink is not None:
            self._sink.append(data)

    def _start_row(self, attributes: dict[str, str]) -> None:
        number = attributes.get("r")
        self._row = int(number) if number is not None else self._row + 1
        self._column = 0
        if "hidden" in attributes and is_on(attributes["hidden"]):
            self.cells.hidden_rows.add(self._row)

    def _start_cell(self, attributes: dict[str, str]) -> None:
        address = attributes.get("r")
        if address is None:
            self._column += 1
        else:
            letters = address.rstrip("0123456789")
            column = self._columns.get(letters)
            if column is None:
                column = self._columns[letters] = column_number(letters)
            self._column = column
            self._row = int(address[len(letters) :])
        self._cell = attributes
        self._formula = None
        self._value = None
        self._inline = []

    def _end_cell(self) -> None:
        attributes = self._cell
        if attributes is None:
            return
        position = (self._row, self._column)
        style = attributes.get("s")
        if style is not None and style != "0":
            self.cells.styles[position] = int(style)
        value, has_value = self._scalar(attributes.get("t", "n"))
        if self._formula is None:
            if has_value and value is not None:
                self.cells.constants[position] = value
        else:
            self._add_formula(position, attributes, value, has_value)
        self._cell = None
        self._sink = None

    def _scalar(self, kind: str) -> tuple[Scalar, bool]:
        if kind == "inlineStr":
            return unescape("".join(self._inline)), True
        if self._value is None:
            return None, False
        text = "".join(self._value)
        if kind == "n":
            return (float(text), True) if text.strip() else (None, False)
        if kind == "s":
            place = int(text) if text.strip() else -1
            return (self._strings[place] if 0 <= place < len(self._strings) else ""), True
        if kind == "b":
            return is_on(text), True
        if kind == "e":
            return ERROR_BY_SPELLING.get(text.strip(), ErrorValue.VALUE), True
        if kind == "d":
            return self._serial(text), True
        return unescape(text), True

    def _serial(self, text: str) -> Scalar:
        try:
            moment = dt.datetime.fromisoformat(text.strip().removesuffix("Z"))
        except ValueError:
            return text
        return (moment.replace(tzinfo=None) - self._epoch) / dt.timedelta(days=1)

    def _add_formula(
        self, position: Position, attributes: dict[str, str], value: Scalar, has_value: bool
    ) -> None:
        formula = self._formula or {}
        text = "".join(self._formula_text)
        kind = formula.get("t", "normal")
        shared = formula.get("si")
        if kind == "dataTable":
            table = self._data_table(formula)
            if table is not None:
                self.cells.formulas[position] = FormulaCell(
                    "", position, value, None, False, table, has_value
                )
                return
        if kind == "shared" and shared is not None:
            if text.strip():
                self._masters[shared] = (text, position)
            else:
                self._followers.append((position, shared, value, has_value))
                return
        if not text.strip():
            if has_value and value is not None:
                self.cells.constants[position] = value  # the inside of an array or spill
            return
        area = self._area(formula.get("ref")) if kind == "array" else None
        if kind == "array" and area is None:
            area = RangeRef(self._title, *position, *position)
        dynamic = kind == "array" and "cm" in attributes
        self.cells.formulas[position] = FormulaCell(
            text, position, value, area, dynamic, None, has_value
        )

    def _area(self, text: str | None) -> RangeRef | None:
        if not text:
            return None
        first, _, last = text.partition(":")
        start, end = parse_address(first), parse_address(last or first)
        if start is None or end is None:
            return None
        return RangeRef(self._title, *start, *end)

    def _data_table(self, formula: dict[str, str]) -> DataTable | None:
        """A data table (ECMA-376 Part 1, 18.3.1.40): r1 is the row input cell if it has two inputs or `dtr`."""
        area = self._area(formula.get("ref"))
        first = parse_address(formula.get("r1", ""))
        second = parse_address(formula.get("r2", ""))
        if area is None:
            return None
        if is_on(formula.get("dt2D")):
            return DataTable(area, first, second)
        return (
            DataTable(area, first, None)
            if is_on(formula.get("dtr"))
            else DataTable(area, None, first)
        )

    def finish(self) -> None:
        """Give the members of shared formulas their master's text."""
        for position, shared, value, has_value in self._followers:
            master = self._masters.get(shared)
            if master is None:
                if has_value and value is not None:
                    self.cells.constants[position] = value
                continue
            text, origin = master
            self.cells.formulas[position] = FormulaCell(
                text, origin, value, None, False, None, has_value
            )
