"""What every sheet is written from and into."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from xlsxwriter import Workbook

from cellsim.report.figures import Figures
from cellsim.report.page import Page
from cellsim.report.places import HEADLINE
from cellsim.report.styles import Styles
from cellsim.results import RunResults


@dataclass(frozen=True, slots=True)
class Book:
    """The results workbook while it is written.

    Attributes:
        workbook: The workbook.
        styles: Its styles.
        results: The run.
        figures: The run in figures.
        sheet_names: Names of the sheets that will be there, in order.
    """

    workbook: Workbook
    styles: Styles
    results: RunResults
    figures: Figures
    sheet_names: tuple[str, ...]

    def add_page(
        self, name: str, widths: Sequence[float], *, landscape: bool = False, way_back: bool = True
    ) -> Page:
        """A new sheet, with a way back to the first.

        Args:
            name: Its name.
            widths: Column widths in characters.
            landscape: Whether it prints sideways.
            way_back: Whether the link to the first sheet is written at once, into the third row.

        Returns:
            The page to write on.
        """
        worksheet = self.workbook.add_worksheet(name)
        page = Page(worksheet, self.styles, widths, landscape=landscape)
        if way_back and name != HEADLINE:
            page.link(2, 0, HEADLINE, "Back to Headline")
        return page
