"""Absurd formulas end in an error or a plain value, soon and in bounded memory; faulthandler ends a test that hangs."""

from __future__ import annotations

import tracemalloc

import pytest
from small_models import calculate, model_of, place

from cellsim.values import ErrorValue

NUM, VALUE, NAME = ErrorValue.NUM, ErrorValue.VALUE, ErrorValue.NAME

FORMULAS: dict[str, tuple[str, object]] = {
    "too many characters": ("=" + "(" * 10_000 + "1" + ")" * 10_000, NAME),
    "nested too deeply": ("=" + "-" * 8_000 + "1", NAME),
    "a long sum": ("=" + "+".join(["1"] * 4_000), 4000.0),
    "repeated repetition": ('=REPT(REPT("x",32767),32767)', VALUE),
    "text beyond a cell": ('=LEN(SUBSTITUTE(REPT("a",32767),"a",REPT("b",99)))', VALUE),
    "a billion numbers": ("=SUM(SEQUENCE(1E9))", NUM),
    "ten billion calls": ("=SUM(MAKEARRAY(1E5,1E5,LAMBDA(r,c,r)))", NUM),
    "a table of ten billion": ("=SUMPRODUCT(SEQUENCE(100000)*SEQUENCE(1,100000))", NUM),
    "random billions": ("=SUM(RANDARRAY(1E5,1E5))", NUM),
    "an array made huge": ("=SUM(EXPAND({1},1E5,1E5,0))", NUM),
    "endless recursion": ("=LET(f,LAMBDA(g,x,g(g,x+1)),f(f,1))", NUM),
    "whole columns": ("=SUM(D:XFD)", 0.0),
    "whole rows": ("=SUM(20:1048576)", 0.0),
    "a whole sheet moved": ("=SUM(OFFSET(D20,0,0,1048557,16381))", 0.0),
    "a power": ("=2^1E308", NUM),
    "a factorial": ("=FACT(1E9)", NUM),
    "combinations": ("=COMBIN(1E15,1E14)", NUM),
    "permutations": ("=PERMUT(1E15,1E14)", NUM),
    "permutations with repetition": ("=PERMUTATIONA(10,1E9)", NUM),
    "multinomial": ("=MULTINOMIAL(1E9,1E9)", NUM),
    "asterisks": ('=COUNTIF(A1:A2,"' + "*a" * 60 + 'b")', 0.0),
    "a regular expression": ('=REGEXTEST(REPT("a",40)&"b","(a|aa)+$")', VALUE),
    "a loan of a billion periods": ("=CUMIPMT(0.01,1E9,1,1,1E9,0)", NUM),
    "a life of a billion years": ("=VDB(1E9,1,1E9,0,1E9)", NUM),
    "a name of Python": ('=__import__("os").system("ls")', NAME),
    "another name of Python": ("=os.system", NAME),
    "a function of Python": ('=EVAL("1+1")', NAME),
}


@pytest.mark.parametrize("name", FORMULAS)
def test_absurd_formulas_end_soon(name: str) -> None:
    formula, wanted = FORMULAS[name]
    graph = model_of({"A1": "a" * 200, "A2": 2, "B5": formula})
    tracemalloc.start()
    try:
        found = calculate(graph).cell_value(*place("B5"))
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert found == wanted
    assert peak < 400e6
