"""The first sheet: one printed page with what most readers want to know."""

from __future__ import annotations

from cellsim.report.book import Book
from cellsim.report.figures import OutputFigures, central_range
from cellsim.report.output_charts import (
    cumulative_alt_text,
    cumulative_chart,
    histogram_alt_text,
    histogram_chart,
)
from cellsim.report.page import Page
from cellsim.report.places import (
    HEADLINE,
    QUANTILES,
    distribution_blocks,
    quantile_blocks,
)
from cellsim.report.plain_text import one_line
from cellsim.report.wording import CAUTION, asked, cautions, output_sentences

NAME = HEADLINE
_WIDTHS = (25, 10, 14, 14, 14, 14, 14, 12)
_LAST = len(_WIDTHS) - 1
_LINKED = (0, 2, 3, 4, 5, 6, 7)
_MOST_ON_ONE_PAGE = 8
_MOST_WORDED = 6
_MOST_CAUTIONS = 8
_CHART_ROWS = 19


def is_needed(book: Book) -> bool:  # noqa: ARG001  (every sheet is asked)
    """Always."""
    return True


def write(book: Book) -> None:
    """Write the sheet."""
    page = book.add_page(NAME, _WIDTHS)
    row = (
        page.title(
            f"Results: {one_line(book.results.record.model, 60)}", asked(book.results), _LAST
        )
        - 1
    )
    row = _write_outputs(book, page, row)
    row = _write_thresholds(book, page, row)
    row = _write_charts(book, page, row)
    row = _write_words(book, page, row)
    row = _write_cautions(book, page, row)
    page.paragraph(row, CAUTION, _LAST, kind="caution")
    _write_links(book, page, row + 2)
    if len(book.figures.outputs) <= _MOST_ON_ONE_PAGE:
        page.worksheet.fit_to_pages(1, 1)


def _write_outputs(book: Book, page: Page, row: int) -> int:
    page.heading(row, "Outputs", _LAST)
    titles = (
        "Output",
        "Unit",
        "Base case",
        "Mean",
        "Median",
        "Central 80 %\nfrom",
        "Central 80 %\nto",
        "Draws below\nbase case",
    )
    page.header(row + 1, titles, numbers_from=2)
    row += 2
    blocks = quantile_blocks(book.figures)
    for output, block in zip(book.figures.outputs, blocks, strict=True):
        _write_output(page, row, output, block.top)
        row += 1
    return row + 1


def _write_output(page: Page, row: int, output: OutputFigures, top: int) -> None:
    code = output.scale.code
    page.link(row, 0, QUANTILES, one_line(output.title, 30), f"A{top + 1}")
    page.fit_row(row, [(output.scale.unit, page.widths[1])])
    page.text(row, 1, output.scale.unit, "wrapped")
    page.scalar(row, 2, output.record.base, code)
    summary = output.summary
    low, middle, high = central_range(summary) if summary is not None else (None, None, None)
    page.number(
        row, 3, summary.moments.mean if summary is not None else None, output.scale.mean_code
    )
    page.number(row, 4, middle, code)
    page.number(row, 5, low, code)
    page.number(row, 6, high, code)
    page.share(row, 7, output.at_base.below.share if output.at_base is not None else None)


def _write_thresholds(book: Book, page: Page, row: int) -> int:
    rows = [
        (output, threshold, about)
        for output in book.figures.outputs
        for threshold, about in zip(output.record.thresholds, output.thresholds, strict=True)
    ]
    if not rows:
        return row
    page.heading(row, "Thresholds", _LAST)
    titles = (
        "Output",
        "Unit",
        "Threshold",
        "Set by",
        "Draws above",
        "95 % from",
        "95 % to",
        "Draws at\nor below",
    )
    page.header(row + 1, titles, numbers_from=2)
    row += 2
    for output, threshold, about in rows:
        page.text(row, 0, output.title, "wrapped")
        page.text(row, 1, output.scale.unit, "wrapped")
        page.number(row, 2, threshold.value, output.scale.code)
        origin = threshold.text if threshold.text.startswith("=") else "side-car"
        page.text(row, 3, origin, "wrapped_right")
        wrapped = ((output.title, 0), (output.scale.unit, 1), (origin, 3))
        page.fit_row(row, [(text, page.widths[column]) for text, column in wrapped])
        page.share(row, 4, about.above.share if about else None)
        page.share(row, 5, about.above.lower if about else None)
        page.share(row, 6, about.above.upper if about else None)
        page.share(row, 7, 1 - about.above.share if about else None)
        row += 1
    return row + 1


def _write_charts(book: Book, page: Page, row: int) -> int:
    places = zip(
        book.figures.outputs,
        quantile_blocks(book.figures),
        distribution_blocks(book.figures),
        strict=True,
    )
    found = next((place for place in places if place[0].summary is not None), None)
    if found is None:
        return row
    output, quantiles, bins = found
    size = {"width": 425, "height": 320}
    curve = cumulative_chart(book.workbook, output, quantiles)
    curve.set_size(size)
    page.chart(row, 0, curve, cumulative_alt_text(output))
    columns = histogram_chart(book.workbook, output, bins)
    columns.set_size(size)
    page.chart(row, 3, columns, histogram_alt_text(output), x_offset=74)
    return row + _CHART_ROWS


def _write_words(book: Book, page: Page, row: int) -> int:
    page.heading(row, "In words", _LAST)
    row += 1
    outputs = book.figures.outputs
    for output in outputs[:_MOST_WORDED]:
        page.paragraph(row, output_sentences(output), _LAST)
        row += 1
    if len(outputs) > _MOST_WORDED:
        page.paragraph(
            row, f"{len(outputs) - _MOST_WORDED:,} more outputs are in the table above.", _LAST
        )
        row += 1
    return row + 1


def _write_cautions(book: Book, page: Page, row: int) -> int:
    page.heading(row, "To be careful of", _LAST)
    row += 1
    found = cautions(book.results, book.figures)
    for text in found[:_MOST_CAUTIONS] or [
        "Nothing stood out in the draws, the inputs or the model check."
    ]:
        page.paragraph(row, text, _LAST)
        row += 1
    if len(found) > _MOST_CAUTIONS:
        page.paragraph(
            row,
            f"{len(found) - _MOST_CAUTIONS:,} more remarks like these; see the other sheets.",
            _LAST,
        )
        row += 1
    return row + 1


def _write_links(book: Book, page: Page, row: int) -> None:
    page.text(row, 0, "In this workbook", "strong")
    for k, name in enumerate(book.sheet_names[1:]):
        page.link(row + 1 + k // len(_LINKED), _LINKED[k % len(_LINKED)], name, name)
