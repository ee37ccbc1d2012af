"""Reads a side-car: all that it says, or all that is wrong with it."""

from __future__ import annotations

import datetime as dt
import re
import tomllib
from pathlib import Path
from typing import Any

from cellsim.errors import Problem, SidecarError
from cellsim.uncertainty.distributions.family import join_words
from cellsim.uncertainty.findings import Findings, nearest
from cellsim.uncertainty.read_dependence import read_dependence
from cellsim.uncertainty.read_inputs import read_inputs
from cellsim.uncertainty.read_outputs import read_outputs
from cellsim.uncertainty.specs import (
    DEFAULT_DRAWS,
    DEFAULT_SEED,
    LATIN_HYPERCUBE,
    RANDOM,
    DependenceSpec,
    Formula,
    InputSpec,
    Number,
    OutputSpec,
    Parameter,
    RunSettings,
    Sidecar,
)
from cellsim.uncertainty.toml_lines import locate_lines

__all__ = [
    "DependenceSpec",
    "Formula",
    "InputSpec",
    "Number",
    "OutputSpec",
    "Parameter",
    "RunSettings",
    "Sidecar",
    "load_sidecar",
]

MOST_DRAWS = 1_000_000_000
MOST_SEED = 2**64 - 1

_SECTIONS = ("model", "run", "inputs", "dependence", "outputs")
_NOT_YET_SECTIONS = ("rules", "alternatives")
_SAMPLING = (LATIN_HYPERCUBE, RANDOM)
_NOT_YET_SAMPLING = ("sobol",)
_TOML_PLACE = re.compile(r"(.*) \(at line ([0-9]+), (column [0-9]+)\)\Z", re.DOTALL)


def load_sidecar(path: Path) -> Sidecar:
    """Reads a side-car.

    Args:
        path: The TOML file.

    Returns:
        What it says; the model's path is relative to the side-car's folder unless absolute.

    Raises:
        SidecarError: It cannot be read or holds mistakes; carries every one of them with its line.
    """
    text = _read_text(path)
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise SidecarError(_toml_problem(path, error)) from error
    findings = Findings(path.name, locate_lines(text.replace("\r\n", "\n")))
    _check_sections(findings, document)
    workbook, as_of, iterate = _read_model(findings, document.get("model", {}))
    run = _read_run(findings, document.get("run", {}))
    inputs = read_inputs(findings, document.get("inputs", {}))
    known_inputs = document.get("inputs", {})
    names = tuple(known_inputs) if isinstance(known_inputs, dict) else ()
    dependence = read_dependence(findings, document.get("dependence", []), names)
    outputs = read_outputs(findings, document.get("outputs", {}))
    problems = findings.problems()
    if problems:
        raise SidecarError(problems)
    return Sidecar(
        path=path,
        text=text,
        workbook=path.parent / workbook,
        as_of=as_of,
        iterate=iterate,
        run=run,
        inputs=inputs,
        dependence=dependence,
        outputs=outputs,
    )


def _read_text(path: Path) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except OSError as error:
        reason = error.strerror or str(error)
        raise SidecarError(Problem(str(path), f"the side-car cannot be read: {reason}")) from error
    except UnicodeDecodeError as error:
        line = error.object.count(b"\n", 0, error.start) + 1
        message = f"byte 0x{error.object[error.start]:02x} is not UTF-8 text"
        problem = Problem(f"{path.name}, line {line}", message, "save the file as UTF-8")
        raise SidecarError(problem) from error


def _toml_problem(path: Path, error: tomllib.TOMLDecodeError) -> Problem:
    match = _TOML_PLACE.match(str(error))
    if match is None:
        return Problem(path.name, f"not valid TOML: {error}")
    return Problem(f"{path.name}, line {match[2]}, {match[3]}", f"not valid TOML: {match[1]}")


def _check_sections(findings: Findings, document: dict[str, Any]) -> None:
    for name in document:
        if name in _NOT_YET_SECTIONS:
            findings.add((name,), f"the section {name!r} is not available yet")
        elif name not in _SECTIONS:
            hint = nearest(name, _SECTIONS) or f"known: {', '.join(_SECTIONS)}"
            findings.add((name,), f"unknown section {name!r}", hint)


def _read_model(findings: Findings, section: Any) -> tuple[str, dt.date | None, bool]:
    table = findings.table(("model",), section)
    if table is None:
        return "", None, False
    workbook, as_of, iterate = "", None, False
    for key, value in table.items():
        path = ("model", key)
        if key == "workbook":
            workbook = findings.text(path, value) or ""
        elif key == "as_of":
            as_of = _read_date(findings, path, value)
        elif key == "iterate":
            iterate = bool(findings.flag(path, value))
        else:
            findings.unknown_key(path, ("workbook", "as_of", "iterate"))
    if "workbook" not in table:
        findings.add(("model",), "the section [model] lacks the key 'workbook'")
    return workbook, as_of, iterate


def _read_date(findings: Findings, path: tuple[str, ...], value: Any) -> dt.date | None:
    aware = isinstance(value, dt.datetime) and value.tzinfo is not None
    if isinstance(value, dt.date) and not aware:
        return value
    findings.wrong_kind(path, "a date such as 2026-06-30 without quotes or time zone", value)
    return None


def _read_run(findings: Findings, section: Any) -> RunSettings:
    table = findings.table(("run",), section)
    draws, seed, sampling = None, None, None
    for key, value in (table or {}).items():
        path = ("run", key)
        if key == "draws":
            draws = findings.whole_number(path, value, 1, MOST_DRAWS)
        elif key == "seed":
            seed = findings.whole_number(path, value, 0, MOST_SEED)
        elif key == "sampling":
            sampling = _read_sampling(findings, path, value)
        else:
            findings.unknown_key(path, ("draws", "seed", "sampling"))
    return RunSettings(
        draws=DEFAULT_DRAWS if draws is None else draws,
        seed=DEFAULT_SEED if seed is None else seed,
        sampling=sampling or LATIN_HYPERCUBE,
    )


def _read_sampling(findings: Findings, path: tuple[str, ...], value: Any) -> str | None:
    text = findings.text(path, value)
    if text in _SAMPLING:
        return text
    known = join_words([f'"{name}"' for name in _SAMPLING], "or")
    if text in _NOT_YET_SAMPLING:
        findings.add(path, f'sampling "{text}" is not available yet', f"expected {known}")
    elif text is not None:
        message = f'sampling must be {known}, read "{text}"'
        findings.add(path, message, nearest(text, _SAMPLING))
    return None
