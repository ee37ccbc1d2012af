"""How well the recalculated model agrees with the values stored in its file."""

from __future__ import annotations

from collections.abc import Sequence

from cellsim.report.book import Book
from cellsim.report.cell_groups import grouped
from cellsim.report.page import Page
from cellsim.report.places import MODEL_CHECK
from cellsim.results import ModelCheck

NAME = MODEL_CHECK
WIDTHS = (32, 46, 20, 20, 12, 26)
_LAST = len(WIDTHS) - 1
_MOST = 500


def is_needed(book: Book) -> bool:  # noqa: ARG001  (every sheet is asked)
    """Always."""
    return True


def write(book: Book) -> None:
    """Write the sheet."""
    lead = (
        "Before the first draw every formula of the model was recalculated from its constants and compared with the value "
        "that the spreadsheet program had stored in the file."
    )
    page = book.add_page(NAME, WIDTHS, landscape=True)
    write_check(page, book.results.check, lead, slow=book.results.record.slow_cells, most=_MOST)


def write_check(
    page: Page,
    check: ModelCheck,
    lead: str,
    *,
    slow: Sequence[tuple[str, str]] = (),
    most: int = _MOST,
) -> None:
    """Write a model check on a page.

    Args:
        page: The page, its columns as wide as WIDTHS.
        check: The model check.
        lead: What the page shows.
        slow: Cells evaluated draw by draw, each with the reason.
        most: The most differing formulas to list.
    """
    row = page.title("Model check", lead, _LAST)
    row = _write_counts(page, check, row)
    row = _write_sheets(page, check, row)
    row = _write_disagreements(page, check, row, most)
    row = _write_pairs(
        page, row, "Functions that are not calculated", ("Function", "Reason", "Cells"),
        [(name, reason, cells) for name, cells, reason in check.unsupported],
    )  # fmt: skip
    row = _write_pairs(
        page, row, "Slow cells, evaluated draw by draw or taken from the file", ("Where", "Reason", "Cells"),
        grouped(slow),
    )  # fmt: skip
    if check.notes:
        page.heading(row, "Notes", _LAST)
        for k, note in enumerate(check.notes):
            page.paragraph(row + 1 + k, note, _LAST)


def _write_counts(page: Page, check: ModelCheck, row: int) -> int:
    page.heading(row, "Agreement", _LAST)
    counts = (
        ("Formula cells compared", check.compared),
        ("Agreeing", check.agreeing),
        ("Differing", len(check.disagreements)),
        ("Left out: volatile or reading volatile cells", check.volatile),
        ("Left out: no stored value", check.without_value),
    )
    for k, (name, count) in enumerate(counts, start=1):
        page.text(row + k, 0, name, "wrapped")
        page.fit_row(row + k, [(name, page.widths[0])])
        page.count(row + k, 1, count)
    return row + len(counts) + 2


def _write_sheets(page: Page, check: ModelCheck, row: int) -> int:
    """A table by sheet; nothing where all of them agree."""
    if not check.disagreements:
        return row
    page.heading(row, "By sheet", _LAST)
    page.header(row + 1, ("Sheet", "Compared", "Agreeing", "Differing"), numbers_from=1)
    row += 2
    for sheet in check.sheets:
        page.text(row, 0, sheet.title, "wrapped")
        page.fit_row(row, [(sheet.title, page.widths[0])])
        for column, count in enumerate(
            (sheet.compared, sheet.agreeing, sheet.compared - sheet.agreeing), start=1
        ):
            page.count(row, column, count)
        row += 1
    return row + 1


def _write_disagreements(page: Page, check: ModelCheck, row: int, most: int) -> int:
    if not check.disagreements:
        return row
    page.heading(row, "Differing formulas; those where a difference starts come first", _LAST)
    page.header(
        row + 1,
        ("Cell", "Formula", "Stored", "Recalculated", "Starts here", "Cause"),
        numbers_from=2,
    )
    row += 2
    for found in sorted(check.disagreements, key=lambda d: not d.root)[:most]:
        page.text(row, 0, found.place, "wrapped")
        page.text(row, 1, found.formula, "wrapped")
        page.fit_row(row, [(found.place, page.widths[0]), (found.formula, page.widths[1])])
        page.scalar(row, 2, found.stored)
        page.scalar(row, 3, found.recalculated)
        page.text(row, 4, "yes" if found.root else "no", "number")
        page.text(row, 5, found.cause, "number")
        row += 1
    left = len(check.disagreements) - most
    if left > 0:
        page.paragraph(row, f"{left:,} more are not listed.", _LAST)
        row += 1
    return row + 1


def _write_pairs(
    page: Page,
    row: int,
    heading: str,
    titles: Sequence[str],
    rows: Sequence[tuple[str, str, int]],
) -> int:
    """A table of a name, a reason and a count; nothing if it is empty."""
    if not rows:
        return row
    page.heading(row, heading, _LAST)
    page.header(row + 1, titles, numbers_from=2)
    row += 2
    for name, reason, count in rows[:_MOST]:
        page.text(row, 0, name, "wrapped")
        page.text(row, 1, reason, "wrapped")
        page.fit_row(row, [(name, page.widths[0]), (reason, page.widths[1])])
        page.count(row, 2, count)
        row += 1
    if len(rows) > _MOST:
        page.paragraph(row, f"{len(rows) - _MOST:,} more are not listed.", _LAST)
        row += 1
    return row + 1
