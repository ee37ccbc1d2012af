"""The model check counts what was calculated, and only that."""

from __future__ import annotations

import dataclasses

from small_models import calculate, model_of, place

from cellsim.audit.model_check import check_model, volatile_cells
from cellsim.graph.build import Graph, build_graph
from cellsim.program.calculation import calculate_all
from cellsim.results import ModelCheck
from cellsim.values import Scalar


def with_stored(graph: Graph, stored: dict[str, Scalar]) -> Graph:
    """The same model with values stored for some formulas."""
    sheet = graph.workbook.sheets[0]
    formulas = dict(sheet.formulas)
    for address, value in stored.items():
        cell = place(address)
        source = formulas[cell.row, cell.column]
        formulas[cell.row, cell.column] = dataclasses.replace(source, stored=value, has_stored=True)
    changed = dataclasses.replace(sheet, formulas=formulas)
    return build_graph(dataclasses.replace(graph.workbook, sheets=(changed,)))


def check(graph: Graph) -> ModelCheck:
    calculation = calculate(graph)
    calculate_all(calculation)
    return check_model(calculation)


def test_a_stored_value_that_stands_in_is_not_counted_as_agreement() -> None:
    graph = model_of({"A1": 2, "B1": "=A1*2", "B2": "=NOSUCHFUNCTION(A1)", "B3": "=A1+1"})
    outcome = check(with_stored(graph, {"B1": 4.0, "B2": 7.0, "B3": 9.0}))
    assert (outcome.compared, outcome.agreeing) == (2, 1)
    assert outcome.unsupported[0][:2] == ("NOSUCHFUNCTION", 1)
    assert [row.place for row in outcome.disagreements] == ["Sheet1!B3"]


def test_a_volatile_function_is_seen_beside_one_that_only_looks_so() -> None:
    graph = model_of(
        {"A1": 1, "B1": "=OFFSET(A1,0,0)+RAND()", "B2": "=OFFSET(A1,0,0)", "B3": "=B1*2"}
    )
    assert volatile_cells(graph) == {place("B1"), place("B3")}


def test_disagreements_start_with_their_roots() -> None:
    graph = model_of({"A1": 2, "B1": "=B2+1", "B2": "=A1*2"})
    outcome = check(with_stored(graph, {"B1": 6.0, "B2": 5.0}))
    assert [(row.place, row.root) for row in outcome.disagreements] == [
        ("Sheet1!B2", True),
        ("Sheet1!B1", False),
    ]
