"""The model check counts what was calculated, and only that."""

from __future__ import annotations

import dataclasses

from small_models import calculate, model_of, place

from cellsim.audit.causes import CIRCLE, FOLLOWS, PRECISION, RECALCULATION, STALE
from cellsim.audit.model_check import check_model, volatile_cells
from cellsim.graph.build import Graph, build_graph
from cellsim.program.calculation import calculate_all
from cellsim.results import ModelCheck, SheetAgreement
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


def causes(cells: dict[str, Scalar], stored: dict[str, Scalar]) -> dict[str, str]:
    outcome = check(with_stored(model_of(cells), stored))
    return {row.place.partition("!")[2]: row.cause for row in outcome.disagreements}


def test_a_stale_value_is_told_from_what_follows_from_it() -> None:
    """B3 gives its stored value from the stored B2: the difference starts in B2, whose shape agrees in B1."""
    cells = {"A1": 1, "A2": 2, "B1": "=A1*2", "B2": "=A2*2", "B3": "=B2+1"}
    assert causes(cells, {"B1": 2.0, "B2": 9.0, "B3": 10.0}) == {"B2": STALE, "B3": FOLLOWS}


def test_a_function_that_agrees_nowhere_is_suspected() -> None:
    cells = {"A1": 1, "B1": "=EXP(A1)", "B2": "=SQRT(A1)", "B3": "=SQRT(A1)+0"}
    found = causes(cells, {"B1": 3.0, "B2": 1.0, "B3": 5.0})
    assert found == {"B1": RECALCULATION, "B3": STALE}


def test_small_differences_are_of_precision() -> None:
    assert causes({"A1": 1, "B1": "=A1/3"}, {"B1": 0.33333334}) == {"B1": PRECISION}


def test_a_circle_of_which_the_file_keeps_an_unfinished_pass_is_named() -> None:
    graph = model_of({"A1": 100, "B1": "=A1+B2", "B2": "=B1*0.1"}, iterate=True)
    outcome = check(with_stored(graph, {"B1": 110.0, "B2": 11.0}))
    assert {row.cause for row in outcome.disagreements} <= {CIRCLE, FOLLOWS}
    assert any(row.cause == CIRCLE and row.root for row in outcome.disagreements)


def test_another_workbooks_values_can_be_compared_with() -> None:
    graph = with_stored(model_of({"A1": 2, "B1": "=A1*2", "B2": "=A1+1"}), {"B1": 4.0, "B2": 3.0})
    other = with_stored(model_of({"A1": 3, "B1": "=A1*2", "B2": "=A1+1"}), {"B1": 6.0, "B2": 3.0})
    calculation = calculate(graph)
    calculate_all(calculation)
    outcome = check_model(calculation, other.workbook)
    assert [(row.place, row.stored) for row in outcome.disagreements] == [("Sheet1!B1", 6.0)]
    assert any("1 constant differs" in note for note in outcome.notes)
    assert outcome.sheets == (SheetAgreement("Sheet1", 2, 1),)
