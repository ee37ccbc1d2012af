"""`cellsim check MODEL`: is every formula recalculated to the value that the file stores?"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from cellsim.api.model import load
from cellsim.cli.tables import print_table, shown_value
from cellsim.results import ModelCheck
from cellsim.values import ErrorValue, Scalar

DISAGREES = 1


def check(
    model: Annotated[Path, typer.Argument(help="The workbook, .xlsx or .xlsm.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print for machines.")] = False,
    limit: Annotated[int, typer.Option(min=0, help="Disagreements to show.")] = 20,
) -> None:
    """Recalculate every formula from the constants and compare it with the stored value.

    Exit status 1 when a value disagrees.
    """
    outcome = load(model).check()
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
        roots = sum(row.root for row in outcome.disagreements)
        typer.echo(
            f"\n{len(outcome.disagreements):,} disagree; {roots:,} of them read no other cell that does "
            "(shown first):"
        )
        print_table(
            ("cell", "formula", "stored", "recalculated"),
            [
                (row.place, row.formula, shown_value(row.stored), shown_value(row.recalculated))
                for row in outcome.disagreements[:limit]
            ],
        )
        if len(outcome.disagreements) > limit:
            typer.echo(f"... and {len(outcome.disagreements) - limit:,} more (--limit, --json)")


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
        "disagreements": [
            {
                "cell": row.place,
                "formula": row.formula,
                "stored": _plain(row.stored),
                "recalculated": _plain(row.recalculated),
                "root": row.root,
            }
            for row in outcome.disagreements
        ],
    }


def _plain(value: Scalar) -> float | str | bool | None:
    return str(value) if isinstance(value, ErrorValue) else value
