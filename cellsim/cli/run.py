"""`cellsim run STUDY`: the main job."""

from __future__ import annotations

import json
import shlex
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import numpy as np
import typer
from rich.console import Console
from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

from cellsim.api.result import Result
from cellsim.api.study import Progress as Report
from cellsim.api.study import open_study
from cellsim.cli.tables import print_table, shown_number, shown_value
from cellsim.errors import Problem, RunError
from cellsim.report.cell_groups import grouped
from cellsim.values import ErrorValue

_MOST_SLOW = 5
SHOWN_PROBABILITIES = (0.1, 0.5, 0.9)


def run(
    study: Annotated[Path, typer.Argument(help="The side-car, a .toml file.")],
    draws: Annotated[
        int | None, typer.Option(help="Number of draws, in place of the side-car's.")
    ] = None,
    seed: Annotated[int | None, typer.Option(help="The seed, in place of the side-car's.")] = None,
    results: Annotated[Path | None, typer.Option(help="Where the results workbook goes.")] = None,
    overwrite: Annotated[bool, typer.Option(help="Replace an existing results workbook.")] = False,
    draws_sheet: Annotated[
        bool, typer.Option(help="Write every draw into the workbook too.")
    ] = False,
    threads: Annotated[int | None, typer.Option(min=1, help="How many threads work.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print for machines.")] = False,
    quiet: Annotated[bool, typer.Option(help="Print nothing but errors.")] = False,
) -> None:
    """Draw the inputs, evaluate the model on every draw and write the results workbook.

    The results workbook is `<side-car's name>.results.xlsx` beside the side-car unless --results says
    otherwise.
    """
    started = time.perf_counter()
    target = results or study.with_name(f"{study.stem}.results.xlsx")
    _check_target(target, overwrite=overwrite)
    opened = open_study(study)
    with _progress(enabled=not quiet and not as_json) as report:
        outcome = opened.run(draws, seed, threads=threads, command=_command(), progress=report)
    before_writing = time.perf_counter()
    outcome.write(target, overwrite=overwrite, draws_sheet=draws_sheet)
    writing = time.perf_counter() - before_writing
    if as_json:
        typer.echo(json.dumps(_as_plain(outcome, target, writing), indent=1))
    elif not quiet:
        _print(outcome, target, time.perf_counter() - started, writing)


def _command() -> str:
    return shlex.join(["cellsim", *sys.argv[1:]])


def _check_target(target: Path, *, overwrite: bool) -> None:
    """Say before the work what would stop the results from being written after it.

    Raises:
        RunError: The file exists, or its folder is not there.
    """
    if target.suffix.lower() != ".xlsx":
        raise RunError(Problem(str(target), "the results workbook's name must end in .xlsx"))
    if target.exists() and not overwrite:
        raise RunError(
            Problem(str(target), "exists already", "add --overwrite to replace it, or --results")
        )
    if not target.parent.is_dir():
        raise RunError(Problem(str(target.parent), "there is no such folder"))


@contextmanager
def _progress(*, enabled: bool) -> Iterator[Report]:
    console = Console(stderr=True)
    if not enabled or not console.is_terminal:
        yield _silent
        return
    columns = (
        TextColumn("{task.description}"),
        BarColumn(),
        TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(),
    )
    with Progress(*columns, console=console, transient=True) as bar:
        task = bar.add_task("reading", total=None)

        def report(stage: str, done: int, whole: int) -> None:
            bar.update(task, description=stage, completed=done, total=whole)

        yield report


def _silent(_stage: str, _done: int, _whole: int) -> None:
    """No progress is shown."""


def _print(outcome: Result, target: Path, seconds: float, writing: float) -> None:
    records = outcome.records
    quantiles = outcome.quantiles(SHOWN_PROBABILITIES)
    rows = []
    for record, values in zip(records.outputs, records.output_draws, strict=True):
        kept = values[np.isfinite(values)]
        name = f"{record.name} ({record.unit})" if record.unit else record.name
        base = (
            shown_number(record.base, record.unit)
            if isinstance(record.base, float)
            else shown_value(record.base)
        )
        mean = shown_number(float(kept.mean()), record.unit) if len(kept) else "-"
        spread = [
            shown_number(float(quantiles[record.name].iloc[k]), record.unit)
            for k in range(len(SHOWN_PROBABILITIES))
        ]
        rows.append((name, base, mean, *spread, f"{len(values) - len(kept):,}"))
    print_table(("output", "base case", "mean", "10 %", "median", "90 %", "failed draws"), rows)
    for record, values in zip(records.outputs, records.output_draws, strict=True):
        kept = values[np.isfinite(values)]
        for threshold in record.thresholds:
            if len(kept):
                above = float((kept > threshold.value).mean())
                value = shown_number(threshold.value, record.unit)
                value += " %" if record.unit == "%" else ""
                source = f" ({threshold.text})" if threshold.text.startswith("=") else ""
                typer.echo(f"{record.name} above {value}{source}: {above:.2%} of draws")
    check = records.check
    typer.echo(
        f"model check: {check.agreeing:,} of {check.compared:,} formulas agree with their stored values"
    )
    slow = grouped(records.record.slow_cells)
    for place, reason, count in slow[:_MOST_SLOW]:
        typer.echo(f"slow: {place}{f' ({count:,} cells)' if count > 1 else ''}: {reason}")
    if len(slow) > _MOST_SLOW:
        typer.echo(f"slow: and {len(slow) - _MOST_SLOW:,} more, see the sheet Model check")
    split = ", ".join(f"{stage} {value:.2f}" for stage, value in records.record.timings.items())
    typer.echo(f"{records.record.draws:,} draws in {seconds:.2f} s ({split}, write {writing:.2f})")
    typer.echo(f"written: {target}")
    typer.echo(
        "The figures describe the model and the distributions it was given; they are no advice to buy, sell or "
        "lend. A licensed professional and local rules come first."
    )


def _as_plain(outcome: Result, target: Path, writing: float) -> dict[str, object]:
    records = outcome.records
    quantiles = outcome.quantiles(SHOWN_PROBABILITIES)
    return {
        "results": str(target),
        "draws": records.record.draws,
        "seed": records.record.seed,
        "failed_draws": records.failures.draws,
        "timings": {**records.record.timings, "write": writing},
        "model_check": {"compared": records.check.compared, "agreeing": records.check.agreeing},
        "outputs": [
            {
                "name": record.name,
                "base": str(record.base) if isinstance(record.base, ErrorValue) else record.base,
                "failed_draws": int(np.isnan(values).sum()),
                "mean": _finite(np.nanmean(values)) if not np.isnan(values).all() else None,
                "quantiles": {
                    str(p): _finite(quantiles[record.name].iloc[k])
                    for k, p in enumerate(SHOWN_PROBABILITIES)
                },
                "above": {
                    t.text: float((values[np.isfinite(values)] > t.value).mean())
                    if np.isfinite(values).any()
                    else None
                    for t in record.thresholds
                },
            }
            for record, values in zip(records.outputs, records.output_draws, strict=True)
        ],
    }


def _finite(number: float) -> float | None:
    return float(number) if np.isfinite(number) else None
