"""How a cell's value came about: only what the formula itself evaluates."""

from __future__ import annotations

from small_models import calculate, model_of, place

from cellsim.audit.explain import Explanation, explain_cell
from cellsim.values import Array, ErrorValue


def explain(cells: dict[str, object], address: str) -> Explanation:
    graph = model_of(cells)  # type: ignore[arg-type]
    return explain_cell(calculate(graph), place(address), lambda cell: f"label of {cell}")


def steps(explanation: Explanation) -> list[tuple[str, object]]:
    return [(step.expression, step.value) for step in explanation.steps]


def test_parts_come_before_what_they_are_made_of() -> None:
    found = explain({"A1": 2, "A2": 3, "B1": "=(A1+A2)*-A1^2%"}, "B1")
    assert found.formula == "=(A1+A2)*-A1^2%"
    assert steps(found) == [
        ("A1+A2", 5.0),
        ("-A1", -2.0),
        ("2%", 0.02),
        ("-A1^2%", ErrorValue.NUM),
        ("(A1+A2)*-A1^2%", ErrorValue.NUM),
    ]
    assert [(str(row.area), row.label) for row in found.precedents] == [
        ("Sheet1!A1", "label of Sheet1!A1"),
        ("Sheet1!A2", "label of Sheet1!A2"),
    ]


def test_a_branch_that_is_not_taken_is_left_out() -> None:
    found = explain({"A1": 2, "B1": "=IF(A1>1,A1*10,1/0)"}, "B1")
    assert steps(found) == [("A1>1", True), ("A1*10", 20.0), ("IF(A1>1,A1*10,1/0)", 20.0)]
    caught = explain({"A1": 0, "B1": '=IFERROR(1/A1,"none")&"!"'}, "B1")
    assert steps(caught)[0] == ("1/A1", ErrorValue.DIV0)
    assert caught.value == "none!"


def test_ranges_and_arrays_are_shown_whole() -> None:
    found = explain({"A1": 1, "A2": 2, "B1": "=SUMPRODUCT(A1:A2*10)"}, "B1")
    assert ("A1:A2*10", Array(2, 1, [10.0, 20.0])) in steps(found)
    assert found.precedents[0].value == Array(2, 1, [1.0, 2.0])


def test_constants_blanks_and_unknown_functions_are_said() -> None:
    assert explain({"A1": 5}, "A1").formula is None
    assert explain({"A1": 5}, "C9").value is None
    unknown = explain({"A1": 5, "B1": "=NOSUCHFUNCTION(A1)+1"}, "B1")
    assert unknown.unsupported == "NOSUCHFUNCTION"
    assert ("NOSUCHFUNCTION(A1)", ErrorValue.NAME) in steps(unknown)


def test_variables_are_not_taken_apart() -> None:
    found = explain({"A1": 5, "B1": "=LET(x,A1*2,x+1)"}, "B1")
    assert steps(found) == [("LET(x,A1*2,x+1)", 11.0)]
