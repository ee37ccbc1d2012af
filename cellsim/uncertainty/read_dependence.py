"""Reads the sections `[[dependence]]` of a side-car."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import Any

from cellsim.uncertainty.dependence import matrix_fault, rank_correlation_matrix
from cellsim.uncertainty.findings import Findings, nearest
from cellsim.uncertainty.specs import DependenceSpec
from cellsim.uncertainty.toml_lines import KeyPath

_KEYS = ("inputs", "rank_correlation")
Matrix = tuple[tuple[float, ...], ...]


def read_dependence(
    findings: Findings, section: Any, known: Sequence[str]
) -> tuple[DependenceSpec, ...]:
    """Every dependence section that could be read; what could not is noted.

    Args:
        findings: Takes what is wrong.
        section: The value of `dependence`.
        known: Names of the inputs.
    """
    if not isinstance(section, list):
        findings.add(("dependence",), "dependence must be written as [[dependence]]")
        return ()
    specs = []
    for place, value in enumerate(section):
        path: KeyPath = ("dependence", place)
        table = findings.table(path, value)
        spec = None if table is None else _read_one(findings, path, table, known)
        if spec is not None:
            specs.append(spec)
    if len(specs) == len(section):
        _check_together(findings, specs, known)
    return tuple(specs)


def _read_one(
    findings: Findings, path: KeyPath, table: dict[str, Any], known: Sequence[str]
) -> DependenceSpec | None:
    for key in table:
        if key not in _KEYS:
            findings.unknown_key((*path, key), _KEYS)
    missing = [key for key in _KEYS if key not in table]
    for key in missing:
        findings.add(path, f"[[dependence]] lacks the key {key!r}")
    if missing:
        return None
    names = _read_names(findings, (*path, "inputs"), table["inputs"], known)
    if names is None:
        return None
    matrix = _read_matrix(
        findings, (*path, "rank_correlation"), table["rank_correlation"], len(names)
    )
    if matrix is None:
        return None
    fault = matrix_fault(matrix)
    if fault:
        findings.add((*path, "rank_correlation"), f"rank_correlation {fault}")
        return None
    return DependenceSpec(names, matrix, findings.line(path))


def _read_names(
    findings: Findings, path: KeyPath, value: Any, known: Sequence[str]
) -> tuple[str, ...] | None:
    if not isinstance(value, list) or len(value) < 2:
        findings.wrong_kind(path, "a list of two or more inputs", value)
        return None
    names: list[str] = []
    for place, item in enumerate(value):
        name = findings.text((*path, place), item)
        if name is None:
            continue
        if name not in known:
            hint = nearest(name, known)
            findings.add((*path, place), f"dependence names an unknown input {name!r}", hint)
        elif name in names:
            findings.add((*path, place), f"dependence names the input {name!r} twice")
        else:
            names.append(name)
    return tuple(names) if len(names) == len(value) else None


def _read_matrix(findings: Findings, path: KeyPath, value: Any, size: int) -> Matrix | None:
    if not isinstance(value, list):
        single = _read_correlation(findings, path, value)
        if single is None:
            return None
        return tuple(
            tuple(1.0 if row == column else single for column in range(size)) for row in range(size)
        )
    if len(value) != size or not all(isinstance(row, list) and len(row) == size for row in value):
        findings.add(path, f"rank_correlation must be a number or {size} rows of {size} numbers")
        return None
    rows = [
        [_read_correlation(findings, (*path, i, j), item) for j, item in enumerate(row)]
        for i, row in enumerate(value)
    ]
    complete = tuple(tuple(item for item in row if item is not None) for row in rows)
    if any(len(row) != size for row in complete):
        return None
    return complete if _check_shape(findings, path, complete) else None


def _read_correlation(findings: Findings, path: KeyPath, value: Any) -> float | None:
    number = findings.plain_number(path, value)
    if number is not None and not -1 <= number <= 1:
        findings.wrong_kind(path, "a correlation from -1 to 1", value)
        return None
    return number


def _check_shape(findings: Findings, path: KeyPath, matrix: Matrix) -> bool:
    good = True
    for i, row in enumerate(matrix):
        if row[i] != 1:
            message = f"row {i + 1} of rank_correlation must hold 1 for the input itself"
            findings.add((*path, i), f"{message}, read {row[i]:.12g}")
            good = False
    for i, j in combinations(range(len(matrix)), 2):
        if matrix[i][j] != matrix[j][i]:
            message = f"rank_correlation is not symmetric: row {j + 1}, column {i + 1}"
            read = f"{matrix[j][i]:.12g}, the mirrored place {matrix[i][j]:.12g}"
            findings.add((*path, j), f"{message} holds {read}")
            good = False
    return good


def _check_together(
    findings: Findings, specs: Sequence[DependenceSpec], known: Sequence[str]
) -> None:
    """Notes pairs given twice, and sections that contradict each other."""
    seen: set[frozenset[str]] = set()
    for place, spec in enumerate(specs):
        for pair in map(frozenset, combinations(spec.inputs, 2)):
            if pair in seen:
                first, second = sorted(pair)
                message = f"the pair {first!r} and {second!r} has a rank correlation already"
                findings.add(("dependence", place, "inputs"), message)
                return
            seen.add(pair)
    matrix = rank_correlation_matrix(known, specs)
    fault = matrix_fault(matrix) if matrix is not None else None
    if fault and len(specs) > 1:
        findings.add(("dependence",), f"the dependence sections together: rank_correlation {fault}")
