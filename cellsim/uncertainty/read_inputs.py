"""Reads the sections `[inputs.NAME]` of a side-car."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, TypeAlias

from cellsim.uncertainty.distributions.families import FAMILIES, parameter_faults
from cellsim.uncertainty.distributions.family import ParameterValue
from cellsim.uncertainty.findings import Findings, nearest, nearest_word
from cellsim.uncertainty.specs import Formula, InputSpec, Number, Parameter
from cellsim.uncertainty.toml_lines import KeyPath

_TEXTS = ("cell", "label", "distribution", "note", "source", "unit")
_BOUNDS = ("floor", "cap")
_GENERAL = (*_TEXTS, *_BOUNDS, "replace_formula")
_PATHS = ("cells", "path")
Bounds: TypeAlias = tuple[Number | None, Number | None]
"""Floor and cap."""


def read_inputs(findings: Findings, section: Any) -> tuple[InputSpec, ...]:
    """Every input that could be read; what could not is noted."""
    tables = findings.table(("inputs",), section)
    if tables is None:
        return ()
    if not tables:
        findings.add(("inputs",), "there are no inputs: expected a section [inputs.NAME]")
    specs = []
    for name, value in tables.items():
        table = findings.table(("inputs", name), value)
        spec = None if table is None else _read_input(findings, name, table)
        if spec is not None:
            specs.append(spec)
    _check_cells_differ(findings, specs)
    return tuple(specs)


def _read_input(findings: Findings, name: str, table: dict[str, Any]) -> InputSpec | None:
    path: KeyPath = ("inputs", name)
    later = [key for key in _PATHS if key in table]
    if later:
        message = f"{later[0]!r} in [inputs.{name}]: paths over several cells are not available yet"
        findings.add((*path, later[0]), message)
        return None
    texts = {
        key: findings.text((*path, key), table[key])
        for key in _TEXTS
        if key in table and not (key in ("note", "source", "unit") and table[key] == "")
    }
    for key in ("cell", "distribution"):
        if key not in table:
            findings.add(path, f"[inputs.{name}] lacks the key {key!r}")
    bounds = _read_bounds(findings, path, table)
    replace = findings.flag((*path, "replace_formula"), table.get("replace_formula", False))
    parameters = _read_parameters(findings, path, table, texts.get("distribution"), bounds)
    cell, distribution = texts.get("cell"), texts.get("distribution")
    if cell is None or distribution is None or parameters is None:
        return None
    check_cell_text(findings, (*path, "cell"), cell)
    return InputSpec(
        name=name,
        cell=cell,
        label=texts.get("label"),
        distribution=distribution,
        parameters=parameters,
        floor=bounds[0],
        cap=bounds[1],
        replace_formula=bool(replace),
        note=texts.get("note") or "",
        source=texts.get("source") or "",
        unit=texts.get("unit") or "",
        line=findings.line(path),
        lines=findings.key_lines(path, table),
    )


def check_cell_text(findings: Findings, path: KeyPath, cell: str) -> None:
    """Notes a cell that is written as a formula."""
    if cell.startswith("="):
        message = f'cell must be an address such as "Inputs!C6" or a name, read "{cell}"'
        findings.add(path, message, f'write "{cell[1:].strip()}" without "="')


def _read_bounds(findings: Findings, path: KeyPath, table: dict[str, Any]) -> Bounds:
    floor, cap = (
        findings.number((*path, key), table[key]) if key in table else None for key in _BOUNDS
    )
    if isinstance(floor, float) and isinstance(cap, float) and floor >= cap:
        findings.add((*path, "floor"), f"floor must be below cap, read {floor:.12g} and {cap:.12g}")
        return None, None
    return floor, cap


def _read_parameters(
    findings: Findings,
    path: KeyPath,
    table: dict[str, Any],
    distribution: str | None,
    bounds: Bounds,
) -> dict[str, Parameter] | None:
    """The parameters by key, or None if there is no known family to read them for."""
    if distribution is None:
        return None
    if distribution not in FAMILIES:
        hint = nearest(distribution, FAMILIES) or f"known: {', '.join(sorted(FAMILIES))}"
        message = f'unknown distribution "{distribution}" in [inputs.{path[-1]}]'
        findings.add((*path, "distribution"), message, hint)
        return None
    family = FAMILIES[distribution]
    parameters: dict[str, Parameter] = {}
    meant = []
    for key, item in table.items():
        if key in _GENERAL:
            continue
        if not family.knows(key):
            findings.unknown_key((*path, key), (*_GENERAL, *family.checks))
            meant.append(nearest_word(key, tuple(family.checks)))
            continue
        meant.append(key)
        value = _read_parameter(findings, (*path, key), item)
        if value is not None:
            parameters[key] = value
    keys = list(dict.fromkeys(key for key in meant if key))
    floor, cap = (bound if isinstance(bound, float) else None for bound in bounds)
    for fault in parameter_faults(distribution, _known(parameters), keys, floor, cap):
        place = (*path, fault.key) if fault.key else path
        findings.add(place, f"[inputs.{path[-1]}]: {fault.message}")
    return parameters


def _read_parameter(findings: Findings, path: KeyPath, value: Any) -> Parameter | None:
    if not isinstance(value, list):
        return findings.number(path, value)
    items = [findings.number((*path, place), item) for place, item in enumerate(value)]
    complete = [item for item in items if item is not None]
    return tuple(complete) if len(complete) == len(items) else None


def _known(parameters: Mapping[str, Parameter]) -> dict[str, ParameterValue]:
    """The parameters that hold no formula."""
    known: dict[str, ParameterValue] = {}
    for key, value in parameters.items():
        if isinstance(value, float):
            known[key] = value
        elif isinstance(value, tuple):
            numbers = tuple(item for item in value if not isinstance(item, Formula))
            if len(numbers) == len(value):
                known[key] = numbers
    return known


def _check_cells_differ(findings: Findings, specs: list[InputSpec]) -> None:
    first_by_cell: dict[str, InputSpec] = {}
    for spec in specs:
        first = first_by_cell.setdefault(spec.cell.replace("$", "").casefold(), spec)
        if first is not spec:
            message = f"cell {spec.cell} is already the input {first.name!r} (line {first.line})"
            findings.add(("inputs", spec.name, "cell"), message)
