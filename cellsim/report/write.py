"""Writing the results workbook: whole or not at all."""

from __future__ import annotations

import os
import secrets
from collections.abc import Callable
from pathlib import Path

from xlsxwriter import Workbook

from cellsim.errors import Problem, RunError
from cellsim.report.book import Book
from cellsim.report.figures import work_out
from cellsim.report.places import (
    DEPENDENCE,
    DISTRIBUTION,
    DRAWS,
    FAILED_DRAWS,
    HEADLINE,
    INPUTS,
    MODEL_CHECK,
    QUANTILES,
    RUN_RECORD,
)
from cellsim.report.sheets.checks import (
    write_dependence,
    write_failed_draws,
    write_model_check,
    write_run_record,
)
from cellsim.report.sheets.distribution import write_distribution
from cellsim.report.sheets.draws import write_draws
from cellsim.report.sheets.headline import write_headline
from cellsim.report.sheets.inputs import write_inputs
from cellsim.report.sheets.quantiles import write_quantiles
from cellsim.report.styles import Styles
from cellsim.report.wording import CAUTION
from cellsim.results import RunResults


def write_report(
    results: RunResults, path: Path, *, overwrite: bool = False, draws_sheet: bool = False
) -> None:
    """Write the results workbook to a temporary file beside its place, then rename it.

    Args:
        results: The run.
        path: The new .xlsx file.
        overwrite: Whether an existing file is replaced.
        draws_sheet: Whether every draw is written too.

    Raises:
        RunError: The file exists, or its folder cannot be written to.
    """
    if path.exists() and not overwrite:
        raise RunError(
            Problem(
                str(path), "exists already", "ask for it to be overwritten, or choose another name"
            )
        )
    temporary = path.with_name(f".{path.name}.{secrets.token_hex(4)}.part")
    try:
        _write(results, temporary, draws_sheet=draws_sheet)
        with temporary.open("rb+") as file:
            os.fsync(file.fileno())
        temporary.replace(path)
    except OSError as error:
        raise RunError(
            Problem(str(path), f"cannot be written: {error.strerror or error}")
        ) from error
    finally:
        temporary.unlink(missing_ok=True)


def _write(results: RunResults, path: Path, *, draws_sheet: bool) -> None:
    sheets = _sheets(results, draws_sheet=draws_sheet)
    with (
        path.open("wb") as file,
        Workbook(file, {"in_memory": False, "strings_to_urls": False}) as workbook,
    ):
        workbook.set_properties(
            {
                "title": f"Results for {results.record.model}"[:250],
                "subject": "Distribution of a model's outputs",
                "comments": CAUTION,
            }
        )
        book = Book(
            workbook,
            Styles(workbook),
            results,
            work_out(results),
            tuple(name for name, _ in sheets),
        )
        for _, write_sheet in sheets:
            write_sheet(book)


def _sheets(results: RunResults, *, draws_sheet: bool) -> list[tuple[str, Callable[[Book], None]]]:
    """The sheets that have something to say, in order."""
    wanted: list[tuple[str, Callable[[Book], None], bool]] = [
        (HEADLINE, write_headline, True),
        (QUANTILES, write_quantiles, True),
        (DISTRIBUTION, write_distribution, True),
        (INPUTS, write_inputs, True),
        (DEPENDENCE, write_dependence, bool(results.dependence)),
        (FAILED_DRAWS, write_failed_draws, bool(results.failures.draws)),
        (MODEL_CHECK, write_model_check, True),
        (RUN_RECORD, write_run_record, True),
        (DRAWS, write_draws, draws_sheet),
    ]
    return [(name, write_sheet) for name, write_sheet, there in wanted if there]
