"""Draws in which an output was an error or not finite."""

from __future__ import annotations

from cellsim.analysis.shares import wilson_share
from cellsim.report.book import Book
from cellsim.report.page import Page
from cellsim.report.places import FAILED_DRAWS
from cellsim.report.wording import counted

NAME = FAILED_DRAWS
_WIDTHS = (28, 14, 22, 44)
_INPUT_WIDTH = 15
_MOST_INPUTS = 200


def is_needed(book: Book) -> bool:
    """When draws failed."""
    return book.results.failures.draws > 0 or bool(book.results.failures.counts)


def write(book: Book) -> None:
    """Write the sheet."""
    inputs = book.figures.inputs[:_MOST_INPUTS]
    shown = len(inputs) if book.results.failures.examples else 1
    page = book.add_page(NAME, (*_WIDTHS, *[_INPUT_WIDTH] * max(shown, 1)), landscape=True)
    failures, draws = book.results.failures, book.results.record.draws
    share = failures.draws / draws if draws else 0.0
    lead = (
        f"In {counted(failures.draws, 'draw', 'draws')} of {draws:,} ({share:.2%}) at least one output was a spreadsheet error "
        "or not finite. These draws are left out of that output's figures; if they have something in common, the figures are "
        "one-sided."
    )
    row = page.title("Failed draws", lead, 3)
    row = _write_counts(book, page, row)
    _write_examples(book, page, row)


def _write_counts(book: Book, page: Page, row: int) -> int:
    titles = {output.record.name: output.title for output in book.figures.outputs}
    draws = book.results.record.draws
    page.heading(row, "How many", 3)
    page.header(
        row + 1,
        ("Output", "Error", "Failed draws", "Share of draws (95 % interval)"),
        numbers_from=2,
    )
    row += 2
    for (name, error), count in book.results.failures.counts.items():
        page.text(row, 0, titles.get(name, name), "wrapped")
        page.text(row, 1, error)
        page.count(row, 2, count)
        found = wilson_share(min(count, draws), draws) if draws else None
        text = f"{found.share:.2%} ({found.lower:.2%} to {found.upper:.2%})" if found else ""
        page.text(row, 3, text, "number")
        row += 1
    return row + 1


def _write_examples(book: Book, page: Page, row: int) -> None:
    examples = book.results.failures.examples
    if not examples:
        return
    inputs = book.figures.inputs[:_MOST_INPUTS]
    page.heading(
        row,
        "Examples, replayed: where the error first arose, and the inputs of the draw",
        3 + len(inputs),
    )
    titles = (
        "Output and draw",
        "Error",
        "First arose in",
        "Formula there",
        *[item.title for item in inputs],
    )
    page.header(row + 1, titles, numbers_from=4)
    page.worksheet.repeat_rows(row + 1)
    titles_of = {output.record.name: output.title for output in book.figures.outputs}
    row += 2
    for example in examples:
        name = f"{titles_of.get(example.output, example.output)}, draw {example.draw:,}"
        page.text(row, 0, name, "wrapped")
        page.text(row, 1, example.error)
        page.text(row, 2, example.place, "wrapped")
        page.text(row, 3, example.formula, "wrapped")
        page.fit_row(
            row,
            [
                (name, page.widths[0]),
                (example.place, page.widths[2]),
                (example.formula, page.widths[3]),
            ],
        )
        for k, item in enumerate(inputs):
            page.number(row, 4 + k, example.inputs.get(item.record.name), item.scale.code)
        row += 1
    left = len(book.figures.inputs) - len(inputs)
    if left:
        page.paragraph(row, f"{left:,} more inputs are not listed.", 3)
