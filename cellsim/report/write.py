"""Writing the results workbook."""

from __future__ import annotations

from pathlib import Path

from cellsim.results import RunResults


def write_report(results: RunResults, path: Path, *, overwrite: bool = False, draws_sheet: bool = False) -> None:
    """Write the results workbook."""
    raise NotImplementedError
