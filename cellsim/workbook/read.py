"""Reading a workbook file into frozen records; the only place that knows openpyxl."""

from __future__ import annotations

import datetime as dt
import posixpath
from collections.abc import Mapping
from pathlib import Path
from xml.etree.ElementTree import Element

from openpyxl.styles.numbers import BUILTIN_FORMATS

from cellsim.cells import RangeRef, parse_address
from cellsim.errors import ModelError, Problem
from cellsim.values import ERROR_BY_SPELLING, ErrorValue, Scalar
from cellsim.workbook.cells_xml import read_cells, read_shared_strings
from cellsim.workbook.model import (
    DefinedName,
    ExternalWorkbook,
    Iteration,
    Position,
    Sheet,
    Table,
    Workbook,
)
from cellsim.workbook.package import Package
from cellsim.workbook.xml_parts import (
    attribute,
    child,
    children,
    is_on,
    local,
    parse_part,
    unescape,
)

GENERAL = "General"


def read_workbook(path: Path | str) -> Workbook:
    """Read an .xlsx or .xlsm file; macros are ignored, the file is never changed.

    Raises:
        ModelError: The file is missing, of another kind, encrypted, damaged or too large.
    """
    path = Path(path)
    with Package(path) as package:
        return _Reader(package).read()


class _Reader:
    def __init__(self, package: Package) -> None:
        self._package = package
        self._file = package.path.name

    def read(self) -> Workbook:
        """Everything that is kept of the file."""
        part = self._workbook_part()
        root = self._root(part)
        links = self._links(part)
        properties = child(root, "workbookPr")
        date_1904 = properties is not None and is_on(attribute(properties, "date1904"))
        strings = self._shared_strings(links)
        formats = self._number_formats(links)
        titles: list[str] = []
        sheets: list[Sheet] = []
        tables: list[Table] = []
        for element in self._sheet_elements(root):
            title = attribute(element, "name") or ""
            titles.append(title)
            kind, target = links.get(attribute(element, "id") or "", ("", ""))
            if kind != "worksheet" or not self._package.has(target):
                continue
            sheets.append(
                self._sheet(title, element, target, strings, formats, date_1904=date_1904)
            )
            tables += self._tables(title, target)
        if not sheets:
            raise ModelError(Problem(self._file, "the workbook holds no worksheet"))
        return Workbook(
            path=self._package.path,
            sheets=tuple(sheets),
            names=self._names(root, titles),
            tables=tuple(tables),
            date_1904=date_1904,
            iteration=_iteration(root),
            external=self._external(root, links),
            last_saved=self._last_saved(),
            application=self._application(),
            has_macros=any(kind == "vbaProject" for kind, _ in links.values()),
            full_precision=_full_precision(root),
        )

    def _root(self, part: str) -> Element:
        return parse_part(self._package.read(part), self._file, part)

    def _workbook_part(self) -> str:
        if self._package.has("_rels/.rels"):
            for kind, target in self._links("").values():
                if kind == "officeDocument":
                    if target.endswith(".bin"):
                        raise ModelError(
                            Problem(
                                self._file,
                                "this is a workbook in the binary .xlsb format",
                                "save it as .xlsx",
                            )
                        )
                    return target
        if self._package.has("content.xml"):
            raise ModelError(
                Problem(self._file, "this is an OpenDocument file", "save it as .xlsx")
            )
        raise ModelError(Problem(self._file, "this is a zip package, but it holds no workbook"))

    def _links(self, part: str) -> dict[str, tuple[str, str]]:
        """The relations of a part: kind and target by their id."""
        folder, name = posixpath.split(part)
        relations = posixpath.join(folder, "_rels", f"{name}.rels")
        if not self._package.has(relations):
            return {}
        links: dict[str, tuple[str, str]] = {}
        for element in self._root(relations):
            target = attribute(element, "Target") or ""
            if attribute(element, "TargetMode") != "External":
                target = (
                    target.lstrip("/")
                    if target.startswith("/")
                    else posixpath.normpath(posixpath.join(folder, target))
                )
            kind = (attribute(element, "Type") or "").rpartition("/")[2]
            links[attribute(element, "Id") or ""] = (kind, target)
        return links

    @staticmethod
    def _sheet_elements(root: Element) -> list[Element]:
        holder = child(root, "sheets")
        return list(children(holder, "sheet")) if holder is not None else []

    def _shared_strings(self, links: Mapping[str, tuple[str, str]]) -> list[str]:
        for kind, target in links.values():
            if kind == "sharedStrings" and self._package.has(target):
                return read_shared_strings(self._package.read(target), self._file, target)
        return []

    def _number_formats(self, links: Mapping[str, tuple[str, str]]) -> list[str]:
        """The number format code of each cell format."""
        for kind, target in links.values():
            if kind != "styles" or not self._package.has(target):
                continue
            root = self._root(target)
            codes: dict[int, str] = dict(BUILTIN_FORMATS)
            custom = child(root, "numFmts")
            for element in children(custom, "numFmt") if custom is not None else ():
                codes[int(attribute(element, "numFmtId") or 0)] = (
                    attribute(element, "formatCode") or GENERAL
                )
            formats = child(root, "cellXfs")
            return [
                codes.get(int(attribute(element, "numFmtId") or 0), GENERAL)
                for element in (children(formats, "xf") if formats is not None else ())
            ]
        return []

    def _sheet(
        self,
        title: str,
        element: Element,
        target: str,
        strings: list[str],
        formats: list[str],
        *,
        date_1904: bool,
    ) -> Sheet:
        content = self._package.read(target)
        cells = read_cells(
            content, title, strings, date_1904=date_1904, file=self._file, part=target
        )
        positions = [*cells.constants, *cells.formulas]
        filtered: frozenset[int] = frozenset()
        area = _area(title, cells.filter_area)
        if area is not None:
            filtered = frozenset(
                row for row in cells.hidden_rows if area.first_row < row <= area.last_row
            )
        codes = {
            position: formats[style]
            for position, style in cells.styles.items()
            if style < len(formats) and formats[style] != GENERAL
        }
        return Sheet(
            title=title,
            state=attribute(element, "state") or "visible",
            constants=cells.constants,
            formulas=cells.formulas,
            number_formats=codes,
            hidden_rows=frozenset(cells.hidden_rows),
            filtered_rows=filtered,
            hidden_columns=frozenset(cells.hidden_columns),
            last_row=max((row for row, _ in positions), default=0),
            last_column=max((column for _, column in positions), default=0),
        )

    def _tables(self, title: str, target: str) -> list[Table]:
        tables: list[Table] = []
        for kind, part in self._links(target).values():
            if kind != "table" or not self._package.has(part):
                continue
            root = self._root(part)
            area = _area(title, attribute(root, "ref") or "")
            if area is None:
                continue
            holder = child(root, "tableColumns")
            columns = children(holder, "tableColumn") if holder is not None else ()
            tables.append(
                Table(
                    name=attribute(root, "displayName") or attribute(root, "name") or "",
                    area=area,
                    columns=tuple(unescape(attribute(column, "name") or "") for column in columns),
                    header_rows=int(attribute(root, "headerRowCount") or 1),
                    totals_rows=int(attribute(root, "totalsRowCount") or 0),
                )
            )
        return tables

    @staticmethod
    def _names(root: Element, titles: list[str]) -> tuple[DefinedName, ...]:
        holder = child(root, "definedNames")
        names: list[DefinedName] = []
        for element in children(holder, "definedName") if holder is not None else ():
            scope = attribute(element, "localSheetId")
            place = int(scope) if scope is not None and scope.isdigit() else -1
            names.append(
                DefinedName(
                    name=attribute(element, "name") or "",
                    scope=titles[place] if 0 <= place < len(titles) else None,
                    text=unescape("".join(element.itertext())).strip(),
                    hidden=is_on(attribute(element, "hidden")),
                )
            )
        return tuple(names)

    def _external(
        self, root: Element, links: Mapping[str, tuple[str, str]]
    ) -> tuple[ExternalWorkbook, ...]:
        holder = child(root, "externalReferences")
        found: list[ExternalWorkbook] = []
        references = list(children(holder, "externalReference")) if holder is not None else []
        for number, element in enumerate(references, start=1):
            _, part = links.get(attribute(element, "id") or "", ("", ""))
            if not part or not self._package.has(part):
                continue
            book = child(self._root(part), "externalBook")
            if book is None:
                continue
            _, target = self._links(part).get(attribute(book, "id") or "", ("", ""))
            found.append(_external_book(number, target, book))
        return tuple(found)

    def _last_saved(self) -> dt.datetime | None:
        part = "docProps/core.xml"
        if not self._package.has(part):
            return None
        for element in self._root(part):
            if local(element.tag) == "modified" and element.text:
                try:
                    moment = dt.datetime.fromisoformat(element.text.strip())
                except ValueError:
                    return None
                return moment if moment.tzinfo else moment.replace(tzinfo=dt.UTC)
        return None

    def _application(self) -> str:
        part = "docProps/app.xml"
        if not self._package.has(part):
            return ""
        element = child(self._root(part), "Application")
        return (element.text or "") if element is not None else ""


def _iteration(root: Element) -> Iteration:
    settings = child(root, "calcPr")
    if settings is None:
        return Iteration()
    return Iteration(
        enabled=is_on(attribute(settings, "iterate")),
        passes=int(attribute(settings, "iterateCount") or 100),
        change=float(attribute(settings, "iterateDelta") or 0.001),
    )


def _full_precision(root: Element) -> bool:
    settings = child(root, "calcPr")
    return settings is None or is_on(attribute(settings, "fullPrecision"), default=True)


def _area(title: str, text: str) -> RangeRef | None:
    first, _, last = text.partition(":")
    start, end = parse_address(first), parse_address(last or first)
    return RangeRef(title, *start, *end) if start is not None and end is not None else None


def _external_book(number: int, target: str, book: Element) -> ExternalWorkbook:
    holder = child(book, "sheetNames")
    titles = (
        [attribute(e, "val") or "" for e in children(holder, "sheetName")]
        if holder is not None
        else []
    )
    sheets: dict[
        str, dict[Position, Scalar]
    ] = {}  # sheets whose values the file does not keep are left out
    data = child(book, "sheetDataSet")
    for sheet in children(data, "sheetData") if data is not None else ():
        place = int(attribute(sheet, "sheetId") or -1)
        if not 0 <= place < len(titles) or is_on(attribute(sheet, "refreshError")):
            continue
        values = sheets.setdefault(titles[place], {})
        for row in children(sheet, "row"):
            for cell in children(row, "cell"):
                position = parse_address(attribute(cell, "r") or "")
                value = child(cell, "v")
                if position is not None and value is not None:
                    values[position] = _external_value(
                        attribute(cell, "t") or "n", value.text or ""
                    )
    names = child(book, "definedNames")
    texts = {
        attribute(e, "name") or "": attribute(e, "refersTo") or ""
        for e in (children(names, "definedName") if names is not None else ())
    }
    return ExternalWorkbook(number, target, sheets, texts)


def _external_value(kind: str, text: str) -> Scalar:
    if kind == "n":
        return float(text) if text.strip() else None
    if kind == "b":
        return is_on(text)
    if kind == "e":
        return ERROR_BY_SPELLING.get(text, ErrorValue.VALUE)
    return unescape(text)
