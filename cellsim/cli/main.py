"""The command line: one command a job, errors in plain words, exit statuses that scripts can read."""

from __future__ import annotations

import sys
from typing import Annotated

import typer

from cellsim.cli.check import check
from cellsim.cli.explain import explain
from cellsim.cli.run import run
from cellsim.errors import CellsimError
from cellsim.version import VERSION

INTERRUPTED = 130

app = typer.Typer(
    add_completion=False,
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
    help=(
        "Gives the cells of an ordinary workbook distributions, evaluates it over many draws and writes a "
        "results workbook. The model itself is never changed.\n\n"
        "Exit statuses: 0 done; 1 done, but what was checked does not hold; 2 wrong usage; 3 the model "
        "cannot be read or calculated; 4 the side-car is wrong; 5 the run failed."
    ),
)
app.command()(check)
app.command()(run)
app.command()(explain)


def _print_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"cellsim {VERSION}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool,
        typer.Option(
            "--version", callback=_print_version, is_eager=True, help="Print the version and stop."
        ),
    ] = False,
) -> None:
    del version


def main() -> None:
    """Run the command that the arguments name; exits with its status."""
    try:
        app(standalone_mode=True)
    except CellsimError as error:
        for problem in error.problems:
            typer.echo(f"cellsim: {problem}", err=True)
        sys.exit(error.exit_status)
    except KeyboardInterrupt:
        typer.echo("cellsim: interrupted; nothing was written", err=True)
        sys.exit(INTERRUPTED)
