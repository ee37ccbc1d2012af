"""One sheet being written: text, numbers, tables, notes, links and its print set-up."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence

from xlsxwriter.chart import Chart
from xlsxwriter.worksheet import Worksheet

from cellsim.report.number_formats import COUNT, PERCENT, safe_code, showable_code
from cellsim.report.plain_text import storable
from cellsim.report.styles import Styles
from cellsim.values import ErrorValue, Scalar

NO_NUMBER = "\N{EN DASH}"
_LINE_HEIGHT = 13.5
_CHARACTER = 0.88  # width of a usual letter in those of a digit, on the safe side
_BOLD_CHARACTER = 1.02
_MEASURED = 5000
_CHART_GAP = 4  # pixels above a chart
_A4 = 9
_POINTS, _PADDING = (
    5.25,
    3.75,
)  # a character of a column's width, and what each column has beside them
_PRINTABLE = {
    False: (523.0, 740.0),
    True: (770.0, 495.0),
}  # points of A4 within the margins, by landscape


class Page:
    """Writes one sheet, by rows and columns counted from 0.

    Text always goes in as text. Numbers that are not finite go in as a dash.

    Args:
        worksheet: The sheet.
        styles: The workbook's styles.
        widths: Column widths in characters, from column A.
        landscape: Whether it prints sideways.
    """

    def __init__(
        self,
        worksheet: Worksheet,
        styles: Styles,
        widths: Sequence[float],
        *,
        landscape: bool = False,
    ) -> None:
        self.worksheet = worksheet
        self._styles = styles
        self.widths = tuple(widths)
        for column, width in enumerate(widths):
            worksheet.set_column(column, column, width, styles.get("plain"))
        self._heights: dict[int, float] = {}
        self._printable = _PRINTABLE[landscape]
        worksheet.set_default_row(_LINE_HEIGHT)
        worksheet.hide_gridlines(2)
        worksheet.set_paper(_A4)
        worksheet.set_margins(left=0.5, right=0.5, top=0.6, bottom=0.7)
        worksheet.fit_to_pages(1, 0)
        worksheet.set_footer("&L&8&A&R&8Page &P of &N")
        if landscape:
            worksheet.set_landscape()

    @property
    def name(self) -> str:
        """The sheet's name."""
        return str(self.worksheet.get_name())

    def text(self, row: int, column: int, text: str, kind: str = "text") -> None:
        """Write text as text, whatever it looks like."""
        self.worksheet.write_string(row, column, storable(text), self._styles.get(kind))

    def number(
        self, row: int, column: int, value: float | None, code: str = "", kind: str = "number"
    ) -> None:
        """Write a number, or a dash if there is none or it is not finite."""
        if value is None or not math.isfinite(value):
            self.text(row, column, NO_NUMBER, kind)
        else:
            code = showable_code(safe_code(code), value) if code else ""
            self.worksheet.write_number(row, column, value, self._styles.get(kind, code))

    def count(self, row: int, column: int, value: int) -> None:
        """Write a whole number."""
        self.number(row, column, value, COUNT)

    def share(self, row: int, column: int, value: float | None, code: str = PERCENT) -> None:
        """Write a share as per cent."""
        self.number(row, column, value, code)

    def scalar(self, row: int, column: int, value: Scalar, code: str = "") -> None:
        """Write any cell value; errors and logicals as text, so that they are not recalculated."""
        if isinstance(value, bool):
            self.text(row, column, "TRUE" if value else "FALSE", "number")
        elif isinstance(value, int | float):
            self.number(row, column, value, code)
        elif isinstance(value, ErrorValue):
            self.text(row, column, str(value), "number")
        else:
            self.text(row, column, "(blank)" if value is None else value, "number")

    def formula(self, row: int, column: int, formula: str, shown: float, code: str) -> None:
        """Write a formula of this package's own making, with its value at the time of writing."""
        code = showable_code(safe_code(code), shown)
        self.worksheet.write_formula(row, column, formula, self._styles.get("answer", code), shown)

    def header(
        self, row: int, titles: Sequence[str], first: int = 0, *, numbers_from: int = 1
    ) -> None:
        """Write a table's header; titles from `numbers_from` on are set right."""
        for k, title in enumerate(titles):
            self.text(row, first + k, title, "header_right" if k >= numbers_from else "header")
        lines = max(
            (
                _lines(title, self.widths[first + k] - 1, _BOLD_CHARACTER)
                for k, title in enumerate(titles)
                if title
            ),
            default=1,
        )
        self._heighten(row, _LINE_HEIGHT * lines + 3)

    def heading(self, row: int, text: str, last: int, first: int = 0) -> None:
        """Write a heading with a line under it, over several columns."""
        for column in range(first, last + 1):
            self.worksheet.write_blank(row, column, None, self._styles.get("heading"))
        self.text(row, first, text, "heading")
        self._heighten(row, 20)

    def paragraph(
        self, row: int, text: str, last: int, *, first: int = 0, kind: str = "lead"
    ) -> None:
        """Write a paragraph over several columns, the row made high enough."""
        style = self._styles.get(kind)
        if last > first:
            self.worksheet.merge_range(row, first, row, last, "", style)
        self.worksheet.write_string(row, first, storable(text), style)
        width = sum(self.widths[first : last + 1])
        self.fit_row(row, [(text, width)])

    def fit_row(self, row: int, texts: Sequence[tuple[str, float]]) -> None:
        """Make a row high enough for wrapped texts, each with the width that it has in characters."""
        lines = max((_lines(text, width) for text, width in texts), default=1)
        self._heighten(row, _LINE_HEIGHT * lines)

    def _heighten(self, row: int, height: float) -> None:
        """Make a row at least so high; a spreadsheet program takes 409 points at most."""
        self._heights[row] = min(max(height, self._heights.get(row, _LINE_HEIGHT)), 400)
        self.worksheet.set_row(row, self._heights[row])

    def title(self, text: str, lead: str, last: int) -> int:
        """Write the sheet's title and what it shows; the row for what follows is given back."""
        self.text(0, 0, text, "title")
        self._heighten(0, 24)
        self.paragraph(1, lead, last)
        return 4

    def link(self, row: int, column: int, sheet: str, text: str, cell: str = "A1") -> None:
        """Write a link to a place in this workbook; sheet and text are this package's own words."""
        self.worksheet.write_url(
            row, column, f"internal:'{sheet}'!{cell}", self._styles.get("link"), storable(text)
        )

    def chart(self, row: int, column: int, chart: Chart, alt_text: str, x_offset: int = 0) -> None:
        """Place a chart, with words for those who cannot see it."""
        self.worksheet.insert_chart(
            row,
            column,
            chart,
            {
                "description": storable(alt_text, 1000),
                "object_position": 1,
                "x_offset": x_offset,
                "y_offset": _CHART_GAP,
            },
        )

    def keep_whole(self, blocks: Sequence[tuple[int, int]], *, repeated: int = 0) -> None:
        """Begin a new printed page before every block of rows that would be cut in two.

        Args:
            blocks: First row of each block and the row after it, from the top.
            repeated: How many rows are repeated on every page.
        """
        breaks = []
        end = self._rows_on_a_page(0)
        for first, after in blocks:
            if after > end and first > 0:
                breaks.append(first)
                end = first + self._rows_on_a_page(first) - repeated
            while end < after:
                end += max(self._rows_on_a_page(end) - repeated, 1)
        self.worksheet.set_h_pagebreaks(breaks)

    def _rows_on_a_page(self, first: int) -> int:
        """How many rows from a row on go on one printed page, the sheet fitted to its width."""
        points = sum(_POINTS * width + _PADDING for width in self.widths)
        across, down = self._printable
        left = down * max(points / across, 1.0)
        row = first
        while (left := left - self._heights.get(row, _LINE_HEIGHT)) >= 0:
            row += 1
        return row - first

    def repeat(self, first: int, last: int) -> None:
        """Freeze the rows up to the last and print rows first to last on each page."""
        self.worksheet.freeze_panes(last + 1, 0)
        self.worksheet.repeat_rows(first, last)


def _lines(text: str, width: float, character: float = _CHARACTER) -> int:
    """How many lines wrapped text takes."""
    letters = max(int(width / character), 1)
    if len(text) > _MEASURED:
        return math.ceil(len(text) / letters) + text.count("\n")
    return sum(max(len(textwrap.wrap(line, letters)), 1) for line in text.split("\n"))
