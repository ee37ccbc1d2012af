"""`cellsim check MODEL`: is every formula recalculated to the value that the file stores?"""

from __future__ import annotations

import json
from collections import Counter
from pathlib import Path
from typing import Annotated

import typer

from cellsim.api.model import load
from cellsim.cli.tables import print_table, shown_value
from cellsim.report.check_workbook import write_check_workbook
from cellsim.results import ModelCheck
from cellsim.values import ErrorValue, Scalar

DISAGREES = 1


def check(
    model: Annotated[Path, typer.Argument(help="The workbook, .xlsx or .xlsm.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print for machines.")] = False,
    limit: Annotated[int, typer.Option(min=0, help="Disagreements to show.")] = 20,
    against: Annotated[
        Path | None, typer.Option(help="Compare with the values stored in this workbook instead.")
    ] = None,
    results: Annotated[
        Path | None, typer.Option(help="Write the comparison as a workbook.")
    ] = None,
    overwrite: Annotated[
        bool, typer.Option("--overwrite", help="Replace that workbook if it is there.")
    ] = False,
) -> None:
    """Recalculate every formula from the constants and compare it with the stored value.

    Exit status 1 when a value disagrees.
    """
    outcome = load(model).check(against)
    if results is not None:
        compared_with = (against or model).name
        write_check_workbook(outcome, model.name, compared_with, results, overwrite=overwrite)
    if as_json:
        typer.echo(json.dumps(as_plain(outcome), indent=1))
    else:
        _print(model, outcome, limit)
    if outcome.disagreements:
        raise typer.Exit(DISAGREES)


def _print(model: Path, outcome: ModelCheck, limit: int) -> None:
    share = outcome.agreeing / outcome.compared if outcome.compared else 1.0
    typer.echo(
        f"{model.name}: {outcome.agreeing:,} of {outcome.compared:,} formulas agree with the stored values "
        f"({share:.3%})"
    )
    if outcome.volatile:
        typer.echo(
            f"left out: {outcome.volatile:,} volatile formulas and those that depend on them"
        )
    if outcome.without_value:
        typer.echo(f"left out: {outcome.without_value:,} formulas without a stored value")
    for note in outcome.notes:
        typer.echo(f"note: {note}")
    if outcome.unsupported:
        typer.echo("\nfunctions that are not calculated; the stored value stands in:")
        print_table(
            ("function", "cells", "reason"), [(n, f"{c:,}", r) for n, c, r in outcome.unsupported]
        )
    if outcome.disagreements:
        _print_sheets(outcome)
        typer.echo("\ncauses:")
        for cause, count in Counter(row.cause for row in outcome.disagreements).most_common():
            typer.echo(f"  {cause}: {count:,}")
        roots = sum(row.root for row in outcome.disagreements)
        typer.echo(
            f"\n{len(outcome.disagreements):,} disagree; the difference starts in {roots:,} of them "
            "(shown first):"
        )
        print_table(
            ("cell", "formula", "stored", "recalculated", "cause"),
            [
                (
                    row.place,
                    row.formula,
                    shown_value(row.stored),
                    shown_value(row.recalculated),
                    row.cause,
                )
                for row in outcome.disagreements[:limit]
            ],
        )
        if len(outcome.disagreements) > limit:
            typer.echo(f"... and {len(outcome.disagreements) - limit:,} more (--limit, --json)")


def _print_sheets(outcome: ModelCheck) -> None:
    typer.echo("")
    print_table(
        ("sheet", "compared", "agreeing", "differing"),
        [
            (
                sheet.title,
                f"{sheet.compared:,}",
                f"{sheet.agreeing:,}",
                f"{sheet.compared - sheet.agreeing:,}",
            )
            for sheet in outcome.sheets
            if sheet.agreeing < sheet.compared
        ],
    )


def as_plain(outcome: ModelCheck) -> dict[str, object]:
    """The outcome as JSON can hold it."""
    return {
        "compared": outcome.compared,
        "agreeing": outcome.agreeing,
        "volatile": outcome.volatile,
        "without_value": outcome.without_value,
        "unsupported": [
            {"function": name, "cells": count, "reason": reason}
            for name, count, reason in outcome.unsupported
        ],
        "notes": list(outcome.notes),
        "sheets": [
            {"sheet": sheet.title, "compared": sheet.compared, "agreeing": sheet.agreeing}
            for sheet in outcome.sheets
        ],
        "disagreements": [
            {
                "cell": row.place,
                "formula": row.formula,
                "stored": _plain(row.stored),
                "recalculated": _plain(row.recalculated),
                "root": row.root,
                "cause": row.cause,
            }
            for row in outcome.disagreements
        ],
    }


def _plain(value: Scalar) -> float | str | bool | None:
    return str(value) if isinstance(value, ErrorValue) else value
