"""Which functions are left to the reference evaluator; run it to write `docs/draw_by_draw.md` anew."""

from __future__ import annotations

from collections import defaultdict
from pathlib import Path

from argument_recipes import CELLS, base_arguments, is_cells, is_code
from small_models import calculate, model_of, place

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.registry import FunctionRecord, all_functions
from cellsim.program.lower import compile_program

DOCUMENT = Path(__file__).parents[1] / "docs" / "draw_by_draw.md"
_INPUTS = [place(address) for address in ("A1", "A2", "A3", "A4")]

_TEXT = """# What is calculated draw by draw

A run calculates most of a model for thousands of draws at once. What has no such form is calculated
one draw at a time, by the same program that recalculates the workbook. The results are the same, it
only takes longer: some microseconds for each such formula and draw. `cellsim check` and the run record
name the formulas of your model to which this applies.

A formula whose arguments do not depend on an uncertain cell is calculated once, whatever it calls.
The lists below are about calls with uncertain arguments. They are written and checked by the tests.

Apart from single functions, these are taken draw by draw:

- text that differs from draw to draw: joining with `&`, and whatever reads such text;
- computed references with uncertain arguments (`OFFSET(A1, x, 0)`, `INDIRECT("A" & x)`), and cells that
  are read through them and come later in the calculation: these are recalculated from the inputs;
- LAMBDA, its relatives, and spilt ranges (`A1#`) that change;
- ranges in which a cell is a number in some draws and text in others, for functions of the second list;
- draws in which a cell of a table holds an error, for lookups and for pairs of ranges (only those draws).

Two differences to a single recalculation remain. The first: a spreadsheet program sets a formula's last sum or
difference to zero if it is tiny beside its operands. Over draws this is done where the number is
compared, rounded, divided by, raised to a power, shown as a result or handed to a function that is
sensitive to it, but not where it is only added or multiplied on. There a leftover of about 1e-16 of the
operands may remain.

A second difference: where IF, CHOOSE and their like give a cell, a single recalculation hands on the
reference, and SUM or AND pass over text in it. Over draws they hand on what the cell holds, and text is
then refused with #VALUE!.

## Functions that are always taken draw by draw
"""
_SECOND = """
## Functions with a form over draws for numbers only

With ranges of which a cell is text, a logical or blank in some draws, these are taken draw by draw.
"""


def is_slow(formula: str) -> bool | None:
    """Whether a formula is left to the reference evaluator; None if it does not vary at all."""
    cells = {**CELLS, "Z1": formula}
    graph = model_of(cells)  # type: ignore[arg-type]
    compiled = compile_program(calculate(graph), _INPUTS, [place("Z1")], iterate=False)
    if not compiled.program.instructions:
        return None
    output = place("Z1")
    return any(slow.cell == output for slow in compiled.program.slow)


def _with_numbers(function: FunctionRecord) -> str:
    arguments = []
    for text in base_arguments(function):
        if is_cells(text) or is_code(text) or not text[0].isalnum():
            arguments.append("A2" if text.startswith('"') else text)
        else:
            arguments.append(f"{text}+A4" if text[0].isdigit() else text)
    return f"={function.name}({','.join(arguments)})"


def _with_mixed_range(function: FunctionRecord) -> str | None:
    arguments = base_arguments(function)
    ranges = [place for place, text in enumerate(arguments) if ":" in text and is_cells(text)]
    if not ranges:
        return None
    arguments[ranges[0]] = "G1:G4"
    return f"={function.name}({','.join(arguments)})"


def document() -> str:
    """The text of the document."""
    always: dict[str, list[str]] = defaultdict(list)
    mixed: list[str] = []
    for name, function in sorted(all_functions().items()):
        slow = is_slow(_with_numbers(function))
        if slow:
            always[function.module].append(name)
            continue
        formula = _with_mixed_range(function)
        if slow is not None and formula is not None and is_slow(formula):
            mixed.append(name)
    lines = [
        f"- {family.replace('_', ' ')}: {', '.join(names)}"
        for family, names in sorted(always.items())
    ]
    return f"{_TEXT}\n" + "\n".join(lines) + f"\n{_SECOND}\n{', '.join(mixed)}.\n"


if __name__ == "__main__":
    DOCUMENT.write_text(document(), encoding="utf-8")
