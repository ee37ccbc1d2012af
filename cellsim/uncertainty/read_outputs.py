"""Reads the sections `[outputs.NAME]` of a side-car."""

from __future__ import annotations

from typing import Any

from cellsim.uncertainty.findings import Findings
from cellsim.uncertainty.read_inputs import check_cell_text
from cellsim.uncertainty.specs import Number, OutputSpec
from cellsim.uncertainty.toml_lines import KeyPath

_KEYS = ("cell", "formula", "unit", "label", "thresholds")


def read_outputs(findings: Findings, section: Any) -> tuple[OutputSpec, ...]:
    """Every output that could be read; what could not is noted."""
    tables = findings.table(("outputs",), section)
    if tables is None:
        return ()
    if not tables:
        findings.add(("outputs",), "there are no outputs: expected a section [outputs.NAME]")
    specs = []
    for name, value in tables.items():
        table = findings.table(("outputs", name), value)
        if table is not None:
            specs.append(_read_output(findings, name, table))
    return tuple(specs)


def _read_output(findings: Findings, name: str, table: dict[str, Any]) -> OutputSpec:
    path: KeyPath = ("outputs", name)
    texts = {}
    for key, value in table.items():
        if key not in _KEYS:
            findings.unknown_key((*path, key), _KEYS)
        elif key != "thresholds" and not (key in ("unit", "label") and value == ""):
            texts[key] = findings.text((*path, key), value)
    given = [key for key in ("cell", "formula") if key in table]
    if len(given) != 1:
        read = "both" if given else "neither"
        findings.add(path, f"[outputs.{name}] must have either cell or formula, read {read}")
    cell, formula = texts.get("cell"), texts.get("formula")
    if cell is not None:
        check_cell_text(findings, (*path, "cell"), cell)
    return OutputSpec(
        name=name,
        cell=cell,
        formula=None if formula is None else _read_formula(findings, (*path, "formula"), formula),
        unit=texts.get("unit") or "",
        label=texts.get("label") or "",
        thresholds=_read_thresholds(findings, (*path, "thresholds"), table.get("thresholds", [])),
        line=findings.line(path),
        lines=findings.key_lines(path, table),
    )


def _read_formula(findings: Findings, path: KeyPath, text: str) -> str:
    body = text.removeprefix("=").strip()
    if not text.startswith("=") or not body:
        message = f'formula must begin with "=" as in "=Valuation!D30 - 1", read "{text}"'
        findings.add(path, message)
    return body


def _read_thresholds(findings: Findings, path: KeyPath, value: Any) -> tuple[Number, ...]:
    if not isinstance(value, list):
        findings.wrong_kind(path, "a list such as [4.2, 5]", value)
        return ()
    items = (findings.number((*path, place), item) for place, item in enumerate(value))
    return tuple(item for item in items if item is not None)
