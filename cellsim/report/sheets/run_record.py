"""Everything needed to repeat the run."""

from __future__ import annotations

from collections.abc import Iterator

from cellsim.report.book import Book
from cellsim.report.places import RUN_RECORD
from cellsim.report.plain_text import LONGEST, storable
from cellsim.report.wording import CAUTION, precision_note
from cellsim.results import RunRecord

NAME = RUN_RECORD
_WIDTHS = (30, 84)
_LAST = len(_WIDTHS) - 1


def is_needed(book: Book) -> bool:  # noqa: ARG001  (every sheet is asked)
    """Always."""
    return True


def write(book: Book) -> None:
    """Write the sheet."""
    record = book.results.record
    page = book.add_page(NAME, _WIDTHS)
    row = page.title(
        "Run record",
        "Everything needed to repeat the run and to tell whether it is the same.",
        _LAST,
    )
    page.paragraph(row, CAUTION, _LAST, kind="caution")
    page.paragraph(row + 1, precision_note(record.sampling), _LAST)
    row += 3
    page.header(row, ("What", "Value"), numbers_from=2)
    page.repeat(row, row)
    row += 1
    for name, value in _entries(record):
        page.text(row, 0, name, "wrapped")
        page.text(row, 1, value, "wrapped")
        page.fit_row(row, [(name, page.widths[0]), (value, page.widths[1])])
        row += 1
    row += 1
    page.heading(row, "Side-car, line by line", _LAST)
    for line in sidecar_lines(record.sidecar_text):
        row += 1
        page.text(row, 0, line, "code")


def _entries(record: RunRecord) -> Iterator[tuple[str, str]]:
    yield "Model", record.model
    yield "Model, SHA-256", record.model_sha256
    yield "Side-car", record.sidecar
    yield "Side-car, SHA-256", record.sidecar_sha256
    yield "Draws", str(record.draws)
    yield "Seed", str(record.seed)
    yield "Sampling", record.sampling
    yield "TODAY() and NOW()", record.as_of.isoformat(sep=" ", timespec="seconds")
    yield "Started (UTC)", record.started.isoformat(sep=" ", timespec="seconds")
    yield "Command", record.command or "none: run from Python"
    for name, version in record.versions.items():
        yield f"Version of {name}", version
    for name, value in record.engine.items():
        yield f"Engine: {name}", value
    for name, seconds in record.timings.items():
        yield f"Seconds to {name}", f"{seconds:.3f}"


def sidecar_lines(text: str) -> Iterator[str]:
    r"""The side-car's lines; one too long for a cell continues in the next, marked with `\\` before and after."""
    for line in text.split("\n"):
        rest = storable(line.removesuffix("\r"), longest=len(line) * 2 + 16)
        size = LONGEST // 2
        while len(rest) > size:
            yield rest[:size] + "\\"
            rest = "\\" + rest[size:]
        yield rest
