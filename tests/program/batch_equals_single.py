"""Evaluating over draws gives what recalculating one draw at a time gives, for every function.

Not collected by itself: it takes minutes, and not every difference that it finds has been judged. Run it by
`python -m pytest -q -n 2 tests/program/batch_equals_single.py`, or with `-k "[NAME]"` for one function.
"""

from __future__ import annotations

import os

import numpy as np
import pytest
from argument_recipes import samples
from draws_and_single import agree, compile_cells, one_at_a_time, over_draws
from small_models import calculate, model_of, place

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.cells import column_letters
from cellsim.functions.registry import all_functions

SCALE = int(os.environ.get("CELLSIM_MORE_DRAWS", "1"))
"""How many times as many draws, for a longer search than a test run has time for."""

INPUTS = [place(address) for address in ("A1", "A2", "A3", "A4")]
ORDINARY = [1.0, 0.0, -1.0, 0.5, 0.75, 1.5, 2.5, -0.3, 3.25, 0.2]
WHOLE = [2.0, 0.0, 1.0, 3.0, -1.0, 4.0, -4.0, 7.0, 1.0, 2.0]
WILD = [
    3.0,
    0.0,
    -2.5,
    1e300,
    -1e300,
    1e-300,
    45123.25,
    1e15,
    -1e-9,
    0.1,
    12345678.9,
    1e9,
    -1.0,
    0.5,
]
SMALL = [0.25, 0.0, 0.5, 0.125, -0.25, 1.0, 0.0, 0.375]


def draws_for(count: int) -> list[np.ndarray]:
    rng = np.random.default_rng(11)
    listed = max(len(ORDINARY), len(WHOLE), len(WILD), len(SMALL))
    columns = [np.resize(values, listed) for values in (ORDINARY, WHOLE, WILD, SMALL)]
    more = max(0, count - listed)
    drawn = [
        np.round(rng.normal(0.5, 1.5, more), 2),
        rng.integers(-3, 9, more).astype(float),
        rng.choice(WILD, more) * rng.choice([1.0, 0.5], more),
        rng.uniform(0, 1, more),
    ]
    return [np.concatenate(pair) for pair in zip(columns, drawn, strict=True)]


DRAWS = draws_for(20 * SCALE)


def mismatches(
    cells: dict[str, object], formulas: list[tuple[str, str, tuple[int, int] | None]]
) -> list[str]:
    """What differs between the two ways of evaluating formulas beside some cells."""
    cells = dict(cells)
    wanted: list[tuple[str, str, str]] = []
    arrays: list[str] = []
    column = 26
    for row, (label, formula, area) in enumerate(formulas, start=1):
        rows, columns = area or (1, 1)
        if area is None:
            cells[f"Z{row}"] = formula
            wanted.append((f"Z{row}", label, formula))
            continue
        corner = f"{column_letters(column + 1)}1"
        cells[corner] = formula
        arrays.append(f"{corner}:{column_letters(column + columns)}{rows}")
        for down in range(rows):
            for right in range(columns):
                address = f"{column_letters(column + 1 + right)}{down + 1}"
                wanted.append((address, f"{label}, item {down + 1},{right + 1}", formula))
        column += columns
    graph = model_of(cells, array=tuple(arrays))  # type: ignore[arg-type]
    base = calculate(graph)
    places = [place(address) for address, _, _ in wanted]
    singles = one_at_a_time(graph, INPUTS, places, DRAWS)
    compiled = compile_cells(base, INPUTS, places)
    problems: list[str] = []
    for block in (len(DRAWS[0]), 1):
        found = over_draws(compiled, base, DRAWS, block)
        for (_, label, formula), over, single in zip(wanted, found, singles, strict=True):
            for draw, (value, alone) in enumerate(zip(over, single, strict=True)):
                if not agree(value, alone):
                    inputs = ", ".join(repr(float(v[draw])) for v in DRAWS)
                    problems.append(
                        f"{formula} [{label}] blocks of {block}, draw {draw} ({inputs}): "
                        f"{value!r} over draws, {alone!r} alone"
                    )
                    break
    return problems


@pytest.mark.parametrize("name", sorted(all_functions()))
def test_every_function_over_draws_gives_what_it_gives_alone(name: str) -> None:
    cells, calls = samples(all_functions()[name])
    problems = mismatches(cells, [(call.label, call.formula, call.area) for call in calls])
    assert not problems, "\n".join(problems[:40])
