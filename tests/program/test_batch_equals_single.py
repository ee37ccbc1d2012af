"""Evaluating over draws gives what recalculating one draw at a time gives, for every function."""

from __future__ import annotations

import os

import pytest
from argument_recipes import CELLS, samples
from draws_and_single import draws_for, mismatches
from formula_trees import formulas
from hypothesis import HealthCheck, Phase, given, seed, settings
from hypothesis import strategies as st

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.registry import all_functions

MORE = int(os.environ.get("CELLSIM_BATCH_TESTS", "1"))
"""How many times as many draws and random formulas, for a longer search than a test run has time for."""

DRAWS = draws_for(16 * MORE)


@pytest.mark.parametrize("name", sorted(all_functions()))
def test_every_function_over_draws_gives_what_it_gives_alone(name: str) -> None:
    cells, calls = samples(all_functions()[name])
    problems = mismatches(cells, [(call.label, call.formula, call.area) for call in calls], DRAWS)
    assert not problems, "\n".join(problems[:40])


WHAT_VARIES: dict[str, list[str]] = {
    "keys that vary": [
        "=VLOOKUP(A2,J1:L4,3,FALSE)", "=VLOOKUP(A1,J1:L4,1)", "=MATCH(A2,J1:J4,0)", "=MATCH(A1,J1:J4)",
        "=INDEX(F1:F4,MATCH(A2,J1:J4,0))", "=XLOOKUP(A2,J1:J4,G1:G4,\"none\")", "=LOOKUP(A2,J1:J4,R1:R4)",
        "=VLOOKUP(A2&\"\",I1:J4,2,FALSE)", "=MATCH(R2,R1:R4,0)", "=HLOOKUP(A2,J1:M4,2,FALSE)",
        "=VLOOKUP(A2,H1:J4,2,FALSE)", "=MATCH(4,H1:H4,0)", "=MATCH(A2,G1:G4,0)", "=XMATCH(A2,J1:J4,-1)",
    ],
    "places that vary": [
        "=INDEX(F1:G4,A2,1)", "=INDEX(F1:G4,2,A2)", "=INDEX(R1:R4,A2)", "=SUM(INDEX(F1:G4,A2,0))",
        "=CHOOSE(A2,A1,1/A1,R2,NA())", "=SUM(CHOOSE(A2,F1:F4,J1:J4))", "=OFFSET(F1,A2,0)",
        "=SUM(OFFSET(F1,0,0,A2,1))", "=INDIRECT(\"F\"&A2)", "=SUM(INDIRECT(\"J1:J\"&A2))",
        "=OFFSET(R1,A2-1,0)", "=SMALL(F1:F4,A2)", "=SUM(F1:INDEX(F1:F4,A2))", "=OFFSET(G1,A2-1,0)&\"\"",
    ],
    "dates that vary": [
        "=EDATE(45000,A2)", "=EOMONTH(45000+A2*30,A2)", "=DATE(2024,A2,31)", "=DAY(EDATE(45321,A2))",
        "=YEARFRAC(45000,45000+A2*100,A2)", "=WEEKDAY(45000+A2,2)", "=NETWORKDAYS(45000,45000+A2*9,L1:L4)",
        "=DATEDIF(45000,45000+A2*100,\"md\")", "=TEXT(45000+A2,\"yyyy-mm-dd\")", "=WORKDAY(45000,A2*5,L1:L4)",
    ],
    "conditions that vary": [
        "=SUMIFS(F1:F4,G1:G4,A2)", "=SUMIFS(F1:F4,F1:F4,\">\"&A1)", "=COUNTIFS(H1:H4,\">0\",J1:J4,\"<4\")",
        "=SUMIF(G1:G4,\"text\",J1:J4)", "=AVERAGEIF(F1:F4,\">3\")", "=COUNTIF(G1:G4,\"\")", "=COUNTIF(G1:G4,A1>0)",
        "=MAXIFS(F1:F4,J1:J4,\">=\"&A2)", "=MINIFS(J1:J4,F1:F4,\"<=\"&A1)", "=SUMIFS(H1:H4,J1:J4,\">\"&A2)",
        "=COUNTIF(I1:I4,A2)", "=COUNTIF(R1:R4,R2)", "=COUNTIF(R1:R4,\"p*\")", "=SUMIF(F1:F4,A2,J1)",
        "=COUNTIFS(F1:F4,\"<>\"&A2)", "=AVERAGEIFS(J1:J4,F1:F4,\">100\")", "=COUNTIF(H1:H4,\"#N/A\")",
        "=COUNT(G1:G4)", "=COUNT(H1:H4,A1,G1)", "=COUNTA(G1:G4)", "=COUNTA(H1:H4,M1:M4)", "=COUNTBLANK(G1:G4)",
        "=COUNT(I1:I4)", "=COUNT(R2,\"3\",A1>0)", "=COUNTIF(F1:F4,3)", "=COUNTIF(F1:F4,\"=3\")",
        "=COUNTIF(H1:H4,H2)", "=COUNTIF(H1:H4,\"<>#N/A\")", "=COUNTIF(M1:M4,TRUE)", "=COUNTIF(G1:G4,\"<>\")",
        "=SUMIF(H1:H4,\">\"&H3)", "=COUNTIF(S1:S4,TRUE)", "=SUM(S1:S4)", "=MAX(S1:S4)", "=COUNT(S1:S4)",
        "=MAXIFS(G1:G4,J1:J4,\">=\"&A2)", "=AVERAGEIFS(G1:G4,J1:J4,\">=\"&A2)", "=MINIFS(H1:H4,J1:J4,\"<=\"&A2)",
        "=SUMIFS(S1:S4,J1:J4,\"<=\"&A2)", "=COUNTIFS(G1:G4,G1)", "=COUNTIF(H1:H4,\"<>\"&A2)", "=COUNTIF(J1:J4,\"=\"&H2)",
    ],
    "rates in each draw": [
        "=IRR(K1:K4)", "=IRR(K1:K4,A4)", "=XIRR(K1:K4,L1:L4)", "=RATE(12+A2,-100,1000+A1)", "=IRR(F1:F4)",
        "=IFERROR(IRR(H1:H4),\"none\")", "=MIRR(K1:K4,A4,0.1)", "=XNPV(A4,K1:K4,L1:L4)", "=NPV(A1,K1:K4)",
        "=IRR(G1:G4)", "=NPV(0.1,G1:G4)", "=XIRR(K1:K4,H1:H4)", "=NPV(A1,H1:H4)", "=NPV(H3,H1:H4)", "=NPV(H2,H3,A1)", "=NPV(NA(),H3,A1)",
        "=SUMPRODUCT(H1:H4,S1:S4)", "=SUMPRODUCT(J1:J4,H1:H4)", "=SUM(H3,H2)", "=MAX(H3,H2)", "=PRODUCT(H1:H4)",
    ],
    "branches that are not taken and would fail": [
        "=IF(A2=0,0,1/A2)", "=IFS(A2>0,1/A2,A2=0,\"zero\",TRUE,SQRT(-A2))", "=SWITCH(A2,0,\"zero\",1,1/A2,LN(A2))",
        "=CHOOSE(IF(A2>0,1,2),LN(A2),-1)", "=IFERROR(LN(A1),IF(A2=0,\"\",1/A2))", "=IF(A1>0,LN(A1),\"none\")&\"!\"",
        "=IFNA(IF(A1>1,NA(),1/A2),-1)", "=IFNA(H2,R2)", "=IFNA(VLOOKUP(A2,J1:L4,2,FALSE),0)", "=IFERROR(G1*2,G1)",
        "=IF(G1=\"text\",1,G1*2)", "=IF(ISNUMBER(G1),G1,LEN(G1))", "=IF(A1>0,,1/A2)", "=AND(A1>0,1/A2>0)",
        "=OR(A1>0,G1)", "=IF(OR(A2=0,A1/A2>1),1,2)", "=IFS(G3,1,A2>2,G1)", "=SWITCH(G1,\"text\",1,A1,2)",
    ],
    "text from numbers and back": [
        "=VALUE(TEXT(A1,\"0.00\"))", "=LEFT(A1,2)+0", "=(A1&\"\")*2", "=VALUE(A2&\".\"&ABS(A2))", "=LEN(A1/3)",
        "=A1/3&\"\"", "=A3&\"\"", "=TEXT(A1,\"0%\")*1", "=DATEVALUE(\"2024-0\"&MAX(1,A2)&\"-01\")", "=--(A2&\"%\")",
        "=EXACT(A2&\"\",\"2\")", "=T(G1)", "=N(G1)", "=TYPE(G1)", "=REPT(\"a\",A2)", "=MID(\"abcdef\",A2,2)",
        "=TEXTJOIN(\",\",TRUE,G1:G4)", "=CONCAT(F1:G4)", "=FIXED(A3,1)", "=ISBLANK(G2)", "=G2&\"x\"", "=G2=\"\"",
    ],
    "variables and functions": [
        "=LET(x,A1+1,y,x*A2,y-x)", "=LET(x,G1,IF(ISTEXT(x),0,x))", "=LET(x,1/A2,IFERROR(x,A1))",
        "=SUM(MAP(F1:F4,LAMBDA(x,x*A1)))", "=REDUCE(A4,F1:F4,LAMBDA(a,x,a+x))", "=LAMBDA(x,x+A1)(A2)",
        "=SUM(BYROW(F1:G4,LAMBDA(r,SUM(r))))", "=LET(f,LAMBDA(x,x/A2),f(A1))", "=LET(r,F1:F4,SUM(r)/COUNT(r))",
        "=LET(k,INDIRECT(\"F\"&A2),k+1)",
    ],
    "sums and orders of mixed cells": [
        "=SUM(G1:G4)", "=AVERAGE(G1:G4)", "=MAX(G1:G4)", "=MIN(G1:G4)", "=PRODUCT(G1:G4)", "=SUM(H1:H4)",
        "=MEDIAN(G1:G4)", "=LARGE(G1:G4,1)", "=STDEV(G1:G4)", "=RANK(A1,F1:F4)", "=PERCENTILE(F1:F4,A4)",
        "=QUARTILE(F1:F4,A2)", "=SUMPRODUCT(F1:F4,G1:G4)", "=SUMPRODUCT((G1:G4=\"text\")*1)", "=MAX(A1,H2)",
        "=SUM(I1:I4)", "=SUM(A1,\"3\",A1>0)", "=MAX(A1>0,-1)", "=SUM(M1:M4)", "=AVERAGEA(G1:G4)", "=MIN(H2,A1)",
        "=SUMPRODUCT(--(F1:F4>A1),J1:J4)", "=SUBTOTAL(9,G1:G4)", "=VAR(F1:F4)", "=MODE(J1:J4,A2)", "=SUMSQ(G1:G4)",
        "=STDEV(A1:A4)", "=VARP(A1:A4)", "=MEDIAN(A3,A3*2)",
    ],
    "comparisons across types": [
        "=G1>A1", "=G1=\"TEXT\"", "=A1>0=TRUE", "=G3=A1", "=G2<A4", "=H2>1", "=H3=H2", "=M1>M4", "=R2<\"pm\"", "=I1>A2",
        "=G1<G2", "=A1=A2", "=NOT(G3)", "=XOR(G3,A2>1)", "=G3*2", "=-G3", "=G3&\"\"", "=G3%", "=A1=B9", "=G1=B9", "=G3=B9", "=M1=H2",
        "=M1<>H3", "=H2>M1", "=SWITCH(M1,H2,A1,A1)",
    ],
    "computed references that read each other": [
        "=INDIRECT(\"Z2\")*2", "=INDIRECT(\"A\"&1)+OFFSET(A1,0,0)", "=OFFSET(Z1,0,0)&\"\"", "=INDIRECT(\"Z\"&3)",
    ],
    "rounding to nothing": [
        "=A1-A1", "=1/(A4+0.1-A4-0.1)", "=(A4+0.1)-A4-0.1", "=1/Z3", "=Z3=0", "=LN(Z3)", "=Z3^-1",
        "=0^Z3", "=MOD(A1,Z3)", "=A1/Z3",
    ],
}  # fmt: skip
"""Formulas one to a row in column Z, beside the cells of `argument_recipes.CELLS`."""


@pytest.mark.parametrize("what", WHAT_VARIES)
def test_what_varies_is_followed_in_every_draw(what: str) -> None:
    problems = mismatches(
        dict(CELLS), [(what, formula, None) for formula in WHAT_VARIES[what]], DRAWS
    )
    assert not problems, "\n".join(problems)


ARRAYS = [
    "=F1:F4*A1", "=IF(F1:F4>A1,F1:F4,\"small\")", "=TRANSPOSE(F1:G2)", "=F1:F4&G1:G4", "=SQRT(H1:H4)",
    "=IFERROR(1/G1:G4,A1)", "=MMULT(P1:Q2,P1:Q2)", "=INDEX(F1:G4,{1;2;9},2)", "=SEQUENCE(A2,2)", "=ROUND(F1:F4,A2)",
    "=IF(G1:G4=\"\",0,G1:G4)", "=VLOOKUP(J1:J4,J1:L4,{2,3})", "=FREQUENCY(F1:F4,J1:J2)", "=LARGE(F1:F4,{1;2;3})",
    "=IFNA(MATCH(F1:F4,J1:J4,0),G1:G4)", "=MAP(F1:F4,LAMBDA(x,IF(x>A1,x,\"low\")))", "=CHOOSE({1,2},A1,1/A2)",
    "=EDATE(45000,{1,2}+A2)", "=COUNTIF(F1:F4,{1;3;5})", "=SUMIF(J1:J4,\">\"&F1:F4,J1:J4)", "=A1:A3>B1:B3",
]  # fmt: skip


def test_array_formulas_are_followed_in_every_draw() -> None:
    problems = mismatches(dict(CELLS), [("array", formula, (3, 2)) for formula in ARRAYS], DRAWS)
    assert not problems, "\n".join(problems)


@pytest.mark.slow
@seed(20260115 + MORE)
@settings(
    max_examples=40 * MORE,
    deadline=None,
    database=None,
    phases=(Phase.generate, Phase.shrink) if MORE > 1 else (Phase.generate,),
    suppress_health_check=list(HealthCheck),
)
@given(st.lists(formulas(depth=5), min_size=6, max_size=6))
def test_random_formulas_over_draws_give_what_they_give_alone(trees: list[str]) -> None:
    calls = [("random", f"={tree}", None) for tree in trees]
    problems = mismatches(dict(CELLS), calls, DRAWS)
    assert not problems, "\n".join(problems)


@pytest.mark.slow
@seed(7 + MORE)
@settings(
    max_examples=40 * MORE,
    deadline=None,
    database=None,
    phases=(Phase.generate,),
    suppress_health_check=list(HealthCheck),
)
@given(st.lists(formulas(depth=5, arithmetic=True), min_size=6, max_size=6))
def test_arithmetic_over_draws_is_the_same_bit_for_bit(trees: list[str]) -> None:
    calls = [("arithmetic", f"={tree}", None) for tree in trees]
    problems = mismatches(dict(CELLS), calls, DRAWS, exactly=True)
    assert not problems, "\n".join(problems)


@pytest.mark.xfail(
    reason="not yet: over draws IF and its like give the value of a cell and not the reference, so that "
    "SUM and AND refuse its text instead of passing over it",
    raises=AssertionError,
    strict=True,
)
def test_a_cell_that_a_branch_gives_is_passed_over_as_a_cell_of_a_range() -> None:
    calls = [("", formula, None) for formula in ("=SUM(IF(A1>0,A1,R2))", "=AND(A1,IF(A1,A1,R2))")]
    assert not mismatches(dict(CELLS), calls, DRAWS)
