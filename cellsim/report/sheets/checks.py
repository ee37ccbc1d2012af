"""The sheets Dependence, Failed draws, Model check and Run record."""

from __future__ import annotations

from cellsim.report.book import Book
from cellsim.report.places import DEPENDENCE, FAILED_DRAWS, MODEL_CHECK, RUN_RECORD
from cellsim.report.wording import CAUTION

_MOST_DISAGREEMENTS = 200
_MOST_SLOW = 100


def write_dependence(book: Book) -> None:
    """Write the rank correlations asked for beside those of the draws."""
    page = book.add_page(DEPENDENCE, (30, 30, 14, 14, 14))
    row = page.title(
        "Dependence", "Rank correlations (Spearman) between inputs: asked for, and as drawn.", 4
    )
    page.header(row, ("Input", "moves with", "Asked", "Drawn", "Difference"), numbers_from=2)
    for pair in book.results.dependence:
        row += 1
        page.text(row, 0, pair.first)
        page.text(row, 1, pair.second)
        for column, value in enumerate(
            (pair.asked, pair.achieved, pair.achieved - pair.asked), start=2
        ):
            page.number(row, column, value, "0.000")


def write_failed_draws(book: Book) -> None:
    """Write how many draws failed, how, and where the error arose."""
    failures, draws = book.results.failures, book.results.record.draws
    names = [record.name for record in book.results.inputs]
    page = book.add_page(FAILED_DRAWS, (12, 22, 12, 24, 46, *(13 for _ in names)), landscape=True)
    row = page.title(
        "Failed draws",
        f"{failures.draws:,} of {draws:,} draws gave an error in at least one output and are left out of all figures. "
        "Look at the formula where the error arose and at the input values: a guard in the model, or a tighter "
        "distribution, may be what is missing.",
        4,
    )
    page.header(row, ("Draws", "Output", "Error", "Share of draws"))
    for (output, error), count in failures.counts.items():
        row += 1
        page.count(row, 0, count)
        page.text(row, 1, output)
        page.text(row, 2, error)
        page.share(row, 3, count / draws)
    row += 2
    page.header(
        row, ("Draw", "Output", "Error", "First arose in", "Formula there", *names), numbers_from=5
    )
    for example in failures.examples:
        row += 1
        page.count(row, 0, example.draw)
        for column, text in enumerate(
            (example.output, example.error, example.place, example.formula), start=1
        ):
            page.text(row, column, text, "wrapped")
        page.fit_row(row, [(example.formula, page.widths[4]), (example.place, page.widths[3])])
        for column, name in enumerate(names, start=5):
            page.number(row, column, example.inputs.get(name), "General")


def write_model_check(book: Book) -> None:
    """Write how the recalculated model compares with the stored values."""
    check = book.results.check
    page = book.add_page(MODEL_CHECK, (28, 60, 20, 20, 14), landscape=True)
    share = check.agreeing / check.compared if check.compared else 1.0
    row = page.title(
        "Model check",
        f"{check.agreeing:,} of {check.compared:,} formulas ({share:.2%}) were recalculated to the value stored in the "
        f"file. Left out: {check.volatile:,} volatile ones and {check.without_value:,} without a stored value.",
        4,
    )
    for note in check.notes:
        page.paragraph(row, note, 4)
        row += 1
    if check.unsupported:
        row += 1
        page.header(row, ("Function not calculated", "Reason", "Cells"), numbers_from=2)
        for name, count, reason in check.unsupported:
            row += 1
            page.text(row, 0, name or "(unreadable formula)")
            page.text(row, 1, reason, "wrapped")
            page.count(row, 2, count)
    if check.disagreements:
        row += 2
        page.header(
            row,
            ("Cell that disagrees", "Formula", "Stored", "Recalculated", "Starts here"),
            numbers_from=2,
        )
        for found in check.disagreements[:_MOST_DISAGREEMENTS]:
            row += 1
            page.text(row, 0, found.place)
            page.text(row, 1, found.formula)
            page.scalar(row, 2, found.stored)
            page.scalar(row, 3, found.recalculated)
            page.text(row, 4, "yes" if found.root else "no", "number")
    slow = book.results.record.slow_cells
    if slow:
        row += 2
        page.header(row, ("Cell", "How it was evaluated"), numbers_from=9)
        for place, reason in slow[:_MOST_SLOW]:
            row += 1
            page.text(row, 0, place)
            page.text(row, 1, reason, "wrapped")
            page.fit_row(row, [(reason, page.widths[1])])


def write_run_record(book: Book) -> None:
    """Write everything needed to repeat the run."""
    record = book.results.record
    page = book.add_page(RUN_RECORD, (34, 76))
    row = page.title("Run record", "Everything needed to repeat the run.", 1)
    rows = (
        ("Model", record.model),
        ("Model SHA-256", record.model_sha256),
        ("Side-car", record.sidecar),
        ("Side-car SHA-256", record.sidecar_sha256),
        ("Draws", f"{record.draws:,}"),
        ("Seed", str(record.seed)),
        ("Sampling", record.sampling),
        ("TODAY() was", record.as_of.isoformat(sep=" ")),
        ("Started (UTC)", record.started.isoformat(sep=" ", timespec="seconds")),
        ("Command", record.command or "(Python)"),
        *((f"Version of {name}", version) for name, version in record.versions.items()),
        *((name[:1].upper() + name[1:], fact) for name, fact in record.engine.items()),
        *((f"Seconds to {stage}", f"{seconds:.2f}") for stage, seconds in record.timings.items()),
    )
    for title, text in rows:
        page.text(row, 0, title)
        page.text(row, 1, text, "wrapped")
        page.fit_row(row, [(text, page.widths[1])])
        row += 1
    page.paragraph(row + 1, CAUTION, 1, kind="caution")
    page.heading(row + 3, "The side-car, line by line", 1)
    for k, line in enumerate(record.sidecar_text.splitlines()):
        page.text(row + 4 + k, 0, line, "code")
