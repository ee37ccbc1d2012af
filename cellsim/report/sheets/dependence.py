"""Inputs that move together: what was asked and what the draws have."""

from __future__ import annotations

from cellsim.report.book import Book
from cellsim.report.places import DEPENDENCE

NAME = DEPENDENCE
_WIDTHS = (32, 32, 18, 18, 18)
_CODE = "0.000"


def is_needed(book: Book) -> bool:
    """When the side-car asks for dependence."""
    return bool(book.results.dependence)


def write(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(NAME, _WIDTHS)
    lead = (
        "Pairs of inputs that the side-car lets move together, with the rank correlation (Spearman) that it asks for and "
        "that the draws have. Pairs that are not listed were drawn independently."
    )
    row = page.title("Dependence", lead, len(_WIDTHS) - 1)
    page.header(
        row,
        ("Input", "Input", "Rank correlation asked", "Rank correlation drawn", "Difference"),
        numbers_from=2,
    )
    page.repeat(row, row)
    titles = {item.record.name: item.title for item in book.figures.inputs}
    for pair in book.results.dependence:
        row += 1
        names = [titles.get(name, name) for name in (pair.first, pair.second)]
        for column, name in enumerate(names):
            page.text(row, column, name, "wrapped")
        page.fit_row(row, [(name, page.widths[0]) for name in names])
        page.number(row, 2, pair.asked, _CODE)
        page.number(row, 3, pair.achieved, _CODE)
        page.number(row, 4, pair.achieved - pair.asked, "+0.000;-0.000;0.000")
