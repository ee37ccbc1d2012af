"""`cellsim explain MODEL CELL`: how did this value come about?"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from cellsim.api.model import load
from cellsim.audit.explain import Explanation, Shown
from cellsim.cli.tables import print_table, shown_value
from cellsim.values import Array, ErrorValue, Scalar

_MOST_ITEMS = 6
_LONGEST = 70


def explain(
    model: Annotated[Path, typer.Argument(help="The workbook, .xlsx or .xlsm.")],
    cell: Annotated[str, typer.Argument(help="A cell such as Sheet!C6, or a defined name.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print for machines.")] = False,
) -> None:
    """Show a cell's formula, what it reads, and the value of each of its parts."""
    explanation = load(model).explain(cell)
    if as_json:
        typer.echo(json.dumps(as_plain(explanation), indent=1))
    else:
        _print(explanation)


def _print(explanation: Explanation) -> None:
    label = f"  {explanation.label}" if explanation.label else ""
    typer.echo(f"{explanation.cell}{label}")
    typer.echo(explanation.formula or "a constant" if explanation.value is not None else "blank")
    typer.echo(f"value: {shown_value(explanation.value)}")
    if explanation.has_stored and explanation.formula is not None:
        typer.echo(f"stored in the file: {shown_value(explanation.stored)}")
    if explanation.unsupported:
        typer.echo(f"{explanation.unsupported} is not calculated: the stored value stands in")
    if explanation.precedents:
        typer.echo("\nit reads:")
        print_table(
            ("cells", "label", "value"),
            [(str(row.area), row.label, _shown(row.value)) for row in explanation.precedents],
        )
    if explanation.steps:
        typer.echo("step by step:")
        print_table(
            ("part", "value"),
            [(_short(step.expression), _shown(step.value)) for step in explanation.steps],
        )


def _short(text: str) -> str:
    return text if len(text) <= _LONGEST else f"{text[: _LONGEST - 3]}..."


def _shown(value: Shown) -> str:
    if not isinstance(value, Array):
        return shown_value(value)
    items = ", ".join(shown_value(item) for item in value.items[:_MOST_ITEMS])
    more = ", ..." if len(value.items) > _MOST_ITEMS else ""
    return f"{value.rows} x {value.columns}: {items}{more}"


def as_plain(explanation: Explanation) -> dict[str, object]:
    """The explanation as JSON can hold it."""
    return {
        "cell": str(explanation.cell),
        "label": explanation.label,
        "formula": explanation.formula,
        "value": _plain(explanation.value),
        "stored": _plain(explanation.stored) if explanation.has_stored else None,
        "unsupported": explanation.unsupported or None,
        "reads": [
            {"cells": str(row.area), "label": row.label, "value": _plain_shown(row.value)}
            for row in explanation.precedents
        ],
        "steps": [
            {"part": step.expression, "value": _plain_shown(step.value)}
            for step in explanation.steps
        ],
    }


def _plain_shown(value: Shown) -> object:
    if isinstance(value, Array):
        return [[_plain(item) for item in row] for row in value.to_rows()]
    return _plain(value)


def _plain(value: Scalar) -> float | str | bool | None:
    return str(value) if isinstance(value, ErrorValue) else value
