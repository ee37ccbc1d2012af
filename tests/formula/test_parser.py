from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cellsim.errors import FormulaSyntaxError
from cellsim.formula.cache import FormulaCache
from cellsim.formula.parser import parse_formula
from cellsim.formula.tree import Binary, Call, CellReference, Invocation, RangeReference, Unary
from cellsim.formula.unparse import unparse

FORMULAS = [
    "-2^2", "2^3^2", "10.5%", "50%^2", "SUM(A1:B2,Sheet1!C$3:$D4)", "'Two words'!A1+[1]S!B2", "IF(A1,,2)",
    "{1,2;3,-4}", "A:C", "$2:5", "SUM((A1,B2))", "A1:INDEX(B:B,3)", "A1:B3 B2:C4", "Table1[[#All],[A]:[B]]",
    "Sheet1:Sheet3!A1", "LAMBDA(x,x+1)(2)", '1/3*4-5&"x""y"', "@A1:A3", "A1#", "#REF!+1", "TRUE()", "TAX2024X+1",
    "NPV(r,B2:B5)-5", "IF(A1>=B2,1,2)", "LET(x,1,x+A1)", "-A1%", "1-(2-3)", "(1+2)*3", "A1<>\"\"",
]  # fmt: skip


@pytest.mark.parametrize("text", FORMULAS)
def test_parse_then_unparse_is_the_identity(text: str) -> None:
    tree = parse_formula(text, 5, 5)
    assert parse_formula(unparse(tree, 5, 5), 5, 5) == tree


def test_unary_minus_binds_before_power() -> None:
    tree = parse_formula("-A1^2", 1, 1)
    assert isinstance(tree, Binary)
    assert tree.operator == "^"
    assert isinstance(tree.left, Unary)


def test_prefixes_are_stripped_from_function_names() -> None:
    assert parse_formula("_xlfn._xlws.SORT(A1:A3)", 1, 1) == Call(
        "SORT", (parse_formula("A1:A3", 1, 1),)
    )


def test_relative_references_are_distances() -> None:
    assert parse_formula("B$3", 2, 1) == CellReference(None, 3, 1, False, True)


def test_filled_formulas_share_one_tree() -> None:
    cache = FormulaCache()
    first = cache.parse("A1*$B$1+SUM(A1:A3)", 1, 3, "")
    assert cache.parse("A2*$B$1+SUM(A2:A4)", 2, 3, "") is first
    assert cache.parse("A2*$B$2+SUM(A2:A4)", 2, 3, "") is not first


def test_whole_columns_are_ranges() -> None:
    tree = parse_formula("Sheet1!$A:B", 1, 1)
    assert isinstance(tree, RangeReference)
    assert tree.whole == "columns"


def test_immediate_call_of_a_lambda() -> None:
    assert isinstance(parse_formula("LAMBDA(x,x)(1)", 1, 1), Invocation)


@pytest.mark.parametrize(
    "text", ["1+", "SUM(1", "(1", "{1,2;3}", "1 2", "A1:", "'x'1", '"open', "=)"]
)
def test_a_syntax_error_names_the_cell_and_marks_the_spot(text: str) -> None:
    with pytest.raises(FormulaSyntaxError, match="Costs!C14") as caught:
        parse_formula(text, 1, 1, "Costs!C14")
    assert "^" in str(caught.value)


@pytest.mark.parametrize(
    "text", ["(" * 10_000 + "1" + ")" * 10_000, "1+" * 5_000 + "1", "-" * 9_000]
)
def test_absurd_formulas_are_refused_in_plain_words(text: str) -> None:
    with pytest.raises(FormulaSyntaxError):
        parse_formula(text, 1, 1, "Sheet1!A1")


def test_deep_nesting_within_the_length_limit_is_refused() -> None:
    with pytest.raises(FormulaSyntaxError, match="nested"):
        parse_formula("(" * 3_000 + "1" + ")" * 3_000, 1, 1)


LEAVES = st.sampled_from(["1", "A1", "$B$2", "A1:B3", '"t"', "TRUE", "name", "#N/A", "S!C3"])
TREES = st.recursive(
    LEAVES,
    lambda inner: st.one_of(
        st.tuples(inner, st.sampled_from(["+", "-", "*", "/", "^", "&", "=", "<="]), inner).map(
            lambda t: f"({t[0]}){t[1]}({t[2]})"
        ),
        inner.map(lambda t: f"-({t})"),
        inner.map(lambda t: f"({t})%"),
        st.lists(inner, max_size=3).map(lambda items: f"F({','.join(items)})"),
    ),
    max_leaves=12,
)


@settings(max_examples=150, deadline=None)
@given(TREES, st.integers(1, 500), st.integers(1, 100))
def test_any_tree_survives_a_round_trip(text: str, row: int, column: int) -> None:
    tree = parse_formula(text, row, column)
    assert parse_formula(unparse(tree, row, column), row, column) == tree
