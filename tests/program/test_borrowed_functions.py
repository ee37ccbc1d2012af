"""Functions that the registry lacks: borrowed where an input decides, the stored value elsewhere."""

from __future__ import annotations

import numpy as np
import pytest
from small_models import AS_OF, calculate, model_of, place

from cellsim.engine.blocks import BlockEngine
from cellsim.functions import borrowed, registry
from cellsim.functions.borrowed import find_borrowed
from cellsim.program.calculation import Calculation
from cellsim.program.lower import compile_program
from cellsim.values import Array, ErrorValue, decode_error


@pytest.fixture
def without_rank_sum(monkeypatch: pytest.MonkeyPatch) -> None:
    """As if the registry did not hold SUMSQ, so that it has to be borrowed."""
    known = {name: record for name, record in registry._FUNCTIONS.items() if name != "SUMSQ"}
    monkeypatch.setattr(registry, "_FUNCTIONS", known)


@pytest.mark.usefixtures("without_rank_sum")
def test_a_missing_function_is_borrowed_draw_by_draw_and_named() -> None:
    graph = model_of({"A1": 1, "A2": 3, "C1": "=1+SUMSQ(A1:A2,2)"})
    compiled = compile_program(calculate(graph), [place("A1")], [place("C1")], iterate=False)
    assert [expression.reason for expression in compiled.program.slow] == [
        "SUMSQ is evaluated by the formulas library"
    ]
    draws = np.array([0.0, 1.5, -2.0])
    out = BlockEngine(compiled.program, calculate(graph), threads=1, block=8).run([draws])[0]
    np.testing.assert_allclose(out, 1 + draws**2 + 9 + 4, rtol=1e-15)


@pytest.mark.usefixtures("without_rank_sum")
def test_the_stored_value_stands_in_where_no_input_matters() -> None:
    graph = model_of({"A1": 1, "A2": 3, "B1": "=SUMSQ(A2,2)", "C1": "=SUMSQ(A1)"})
    one_draw = Calculation(graph, as_of=AS_OF, overrides={place("A1"): 4.0})
    assert one_draw.cell_value(*place("C1")) == 16.0
    assert one_draw.cell_value(*place("B1")) is ErrorValue.NAME  # this model stores no values
    assert place("B1") in one_draw.findings.unsupported
    base = calculate(graph)
    base.cell_value(*place("C1"))
    assert base.findings.unsupported[place("C1")] == "SUMSQ"


def test_a_function_nobody_knows_gives_a_name_error_and_says_so() -> None:
    graph = model_of({"A1": 1, "C1": "=NOSUCHFUNCTION(A1)"})
    compiled = compile_program(calculate(graph), [place("A1")], [place("C1")], iterate=False)
    out = BlockEngine(compiled.program, calculate(graph), threads=1, block=8).run([np.ones(2)])[0]
    assert decode_error(float(out[0])) is ErrorValue.NAME
    (expression,) = compiled.program.slow
    assert "no function NOSUCHFUNCTION is known" in expression.reason


def test_values_travel_both_ways() -> None:
    concatenate = find_borrowed("CONCATENATE")
    assert concatenate is not None
    assert concatenate(["a", "b"]) == "ab"
    transpose = find_borrowed("TRANSPOSE")
    assert transpose is not None
    assert transpose([Array(1, 2, [1.0, "x"])]) == Array(2, 1, [1.0, "x"])
    is_error = find_borrowed("ISERROR")
    assert is_error is not None
    assert is_error([ErrorValue.DIV0]) is True
    absolute = find_borrowed("ABS")
    assert absolute is not None
    assert absolute([ErrorValue.NA]) is ErrorValue.NA
    assert absolute(["x"]) is ErrorValue.VALUE
    assert absolute([None]) == 0.0
    assert absolute([1.0, 2.0, 3.0]) is ErrorValue.VALUE  # too many arguments


def test_the_librarys_own_machinery_is_no_function() -> None:
    assert find_borrowed("DUMMYFUNCTION") is None
    assert find_borrowed("__XLUDF.DUMMYFUNCTION") is None
    assert find_borrowed("OS.SYSTEM") is None
    assert borrowed.find_borrowed.cache_info().maxsize == 256
