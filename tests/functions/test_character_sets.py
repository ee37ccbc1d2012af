"""CHAR and CODE follow the system of the program that wrote the file, as stored values show."""

from __future__ import annotations

import dataclasses

import pytest
from small_models import calculate, model_of, place

from cellsim.graph.build import build_graph


@pytest.mark.parametrize(
    ("application", "character", "code"),
    [("Microsoft Macintosh Excel", "\u00d1", 133.0), ("Microsoft Excel", "\u201e", 214.0), ("", "\u201e", 214.0)],
)  # fmt: skip
def test_codes_above_127(application: str, character: str, code: float) -> None:
    """132 is N with tilde in Mac Roman, a low quotation mark in Windows-1252; O with diaeresis is 133 or 214."""
    graph = model_of({"A1": "=CHAR(132)", "A2": '=CODE("\u00d6")', "A3": "=CODE(CHAR(65))"})
    workbook = dataclasses.replace(graph.workbook, application=application)
    calculation = calculate(build_graph(workbook))
    assert calculation.cell_value(*place("A1")) == character
    assert calculation.cell_value(*place("A2")) == code
    assert calculation.cell_value(*place("A3")) == 65.0
