"""One line, one test: the case files beside this module (see cases/README.md)."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from small_models import calculate, model_of, place

from cellsim.values import ErrorValue, Scalar

CASES = Path(__file__).parent / "cases"
_LINE = re.compile(
    r"(?P<formula>.+?) -> (?P<wanted>\{[^}]*\}|\"(?:[^\"]|\"\")*\"|[^\s#]+|#\S+)\s*(?:#\s(?P<comment>.*))?\Z"
)


def read_cases() -> list[tuple[str, dict[str, Scalar], str, str, str]]:
    """File, cells, formula, wanted value and comment of each line."""
    found = []
    for path in sorted(CASES.glob("*.txt")):
        cells: dict[str, Scalar] = {}
        for number, line in enumerate(path.read_text().splitlines(), start=1):
            if line.startswith("@"):
                cells = {}
                for part in line[1:].split(" | "):
                    address, _, text = part.strip().partition(" = ")
                    cells[address] = _value(text.strip())
            elif line.strip() and not line.startswith("#"):
                match = _LINE.match(line.strip())
                assert match is not None, f"{path.name}, line {number}: {line}"
                found.append(
                    (
                        f"{path.stem}-{number}",
                        cells,
                        match["formula"],
                        match["wanted"],
                        match["comment"] or "",
                    )
                )
    return found


def _value(text: str) -> Scalar:
    if text.startswith("="):
        return text
    if text.startswith('"'):
        return text[1:-1].replace('""', '"')
    if text in {"TRUE", "FALSE"}:
        return text == "TRUE"
    if text.startswith("#"):
        return ErrorValue(text)
    return None if text in {"", "blank"} else float(text)


@pytest.mark.parametrize(
    ("name", "cells", "formula", "wanted", "comment"),
    read_cases(),
    ids=lambda v: v if isinstance(v, str) else "",
)
def test_function_case(
    name: str, cells: dict[str, Scalar], formula: str, wanted: str, comment: str
) -> None:
    is_array = formula.startswith("{=")
    text = formula[1:-1] if is_array else f"={formula}"
    kept = {address: value for address, value in cells.items() if value is not None}
    graph = model_of({**kept, "Z100": text}, array=("Z100",) if is_array else ())
    found = calculate(graph).cell_value(*place("Z100"))
    expected = _value(wanted)
    if isinstance(expected, float):
        within = re.match(r"within (\S+)", comment)
        tolerance = float(within[1]) if within else 1e-9 * max(1.0, abs(expected))
        assert isinstance(found, float), f"{name}: {formula} gave {found!s}"
        assert abs(found - expected) <= tolerance, f"{name}: {formula} gave {found!r}"
    else:
        assert type(found) is type(expected), f"{name}: {formula} gave {found!s}"
        assert found == expected
