"""The compiled program against the reference, draw by draw, deliberately broken inputs included."""

from __future__ import annotations

import numpy as np
import pytest
from small_models import calculate, model_of, place

from cellsim.engine.blocks import BlockEngine
from cellsim.errors import CircularReferenceError
from cellsim.program.lower import compile_program
from cellsim.values import ErrorValue, decode_error

DRAWS = 1_300  # three blocks: the later ones may take shortcuts

MODELS: dict[str, dict[str, object]] = {
    "error in the branch not taken": {"A1": 1, "B1": "=IF(A1>0,1/A1,0)"},
    "division by zero in some draws": {"A1": 1, "A2": 2, "B1": "=A2/A1", "B2": "=B1^0+MAX(B1,3)", "C1": "=B2+B1"},
    "errors caught": {"A1": 1, "B1": '=IFERROR(1/A1,-5)+IF(ISERROR(LN(A1)),2,1)', "C1": "=B1*2"},
    "domain errors": {"A1": 1, "A2": 2, "B1": "=SQRT(A1)+LN(A2)", "C1": "=IF(ISNUMBER(B1),B1,A1^0.5)"},
    "choose": {"A1": 1, "B1": "=CHOOSE(A1+2,10,20,30)", "C1": "=B1+1"},
    "index with an uncertain place": {"A1": 1, "D1": 5, "D2": 7, "D3": 9, "C1": "=INDEX(D1:D3,A1+2)"},
    "lookup with an uncertain key": {"A1": 1, "D1": -2, "D2": 0, "D3": 2, "E1": 5, "E2": 6, "E3": 7, "C1": "=VLOOKUP(A1,D1:E3,2)"},
    "error in a table beside the item looked up": {
        "A1": 1, "A2": 2, "D1": -1, "D2": 0, "D3": 1, "E1": 10, "E2": "=1/A1", "E3": 30,
        "C1": "=VLOOKUP(ROUND(A2,0),D1:E3,2,FALSE)",
    },
    "error among the keys of a lookup": {
        "A1": 1, "A2": 2, "D1": -1, "D2": "=1/A1", "D3": 1, "C1": "=MATCH(ROUND(A2,0),D1:D3,0)",
    },
    "exact lookup": {"A1": 1, "D1": -1, "D2": 0, "D3": 1, "E1": 5, "E2": 6, "E3": 7, "C1": "=INDEX(E1:E3,MATCH(ROUND(A1,0),D1:D3,0))"},
    "text in a sum": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A2,"")', "C1": "=SUM(B1:B2)+COUNTA(B1:B2)"},
    "powers": {"A1": 1, "A2": 2, "C1": "=(1+A2)^3+(1+A2)^-4+ABS(A1)^0.25+2^A1"},
    "net present value": {"A1": 1, "A2": 2, "C1": "=NPV(0.1+A1/100,-5,A2,4,3)"},
    "rate of return": {"A1": 1, "A2": 2, "B1": -10, "B2": "=4+A1", "B3": "=5+A2", "B4": 3, "C1": "=IRR(B1:B4)"},
    "rate of return without a root": {"A1": 1, "B1": "=A1", "B2": 2, "B3": 3, "C1": "=IFERROR(IRR(B1:B3),9)"},
    "text from numbers": {"A1": 1, "B1": '=TEXT(ROUND(A1,1),"0.0")&"x"', "C1": "=LEN(B1)+VALUE(LEFT(B1,3))"},
    "moved reference": {"A1": 1, "A2": 2, "D1": 5, "D2": "=A2+1", "D3": 9, "C1": "=OFFSET(D1,MAX(0,MIN(2,ROUND(A1,0))),0)"},
    "logic": {"A1": 1, "A2": 2, "C1": "=IF(AND(A1>0,OR(A2>1,NOT(A1>2))),XOR(A1>0,A2>0)*1,SIGN(A1))"},
    "rounding and order": {"A1": 1, "A2": 2, "C1": "=ROUND(A1,2)+MEDIAN(A1,A2,0.5)+LARGE(A1:A2,2)+INT(A2)+MOD(A1,3)"},
    "conditional sum": {"A1": 1, "A2": 2, "B1": "=A1*2", "B2": "=A2*2", "C1": '=SUMIF(A1:A2,">0",B1:B2)'},
    "sums by year": {
        "A1": 1, "A2": 2, "D1": 2030, "E1": 2030, "F1": 2031, "G1": 2031, "D2": "=A1", "E2": "=A2*2", "F2": "=A1+A2", "G2": "=1/A1", "H1": 2030, "H2": ">2030",
        "C1": "=SUMIFS(D2:G2,D1:G1,H1)+AVERAGEIF(D1:F1,H1,D2)*10+IFERROR(SUMIF(D1:G1,H2,D2:G2),-9)+MAXIFS(D2:F2,D1:F1,H1)-MINIFS(D2:G2,D1:G1,2040)",
    },
    "conditions on what varies": {
        "A1": 1, "A2": 2, "D1": "=A1", "D2": "=A2", "D3": "=A1+A2", "D4": "=A1-A2", "E1": 1, "E2": 0, "E3": 1, "E4": 1,
        "C1": '=SUMIFS(D1:D4,D1:D4,">-1",E1:E4,1)+COUNTIF(D1:D4,"<>0")*10+COUNTIFS(D1:D4,0,E1:E4,">0")*100+MINIFS(D1:D4,D1:D4,">=0.5")+COUNTIF(E:E,"")-COUNTIF(D1:D4,"*")',
    },
    "conditions where some are no numbers": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": '=SUMIF(B1:B2,">1")+COUNTIF(B1:B2,"x")*10+COUNTIF(B1:B2,"<>x")*100+COUNTIF(B1:B3,">1")*1000+COUNTIF(B1:B3,"<>1")'},
    "a mean under conditions": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": '=AVERAGEIFS(B1:B2,B1:B2,"<3")'},
    "an error among what is summed": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": '=SUMIFS(B1:B3,A1:A3,">0")'},
    "errors counted": {"A1": 1, "B1": "=1/A1", "B2": "=A1", "C1": '=COUNTIF(B1:B2,"#DIV/0!")+COUNTIF(B1:B2,TRUE)'},
    "a condition that varies": {"A1": 1, "A2": 2, "B1": "=A1", "B2": "=A2", "C1": '=SUMIF(B1:B2,">"&A1)+COUNTIF(B1:B2,A2)'},
    "ranges of different shapes": {"A1": 1, "A2": 2, "B1": "=A1", "B2": "=A2", "B3": 5, "C1": '=IFERROR(SUMIFS(B1:B2,B1:B3,">0"),A1)'},
    "numbers told from what is none": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "B4": '=IF(1/A1>0,A2,"none")', "C1": '=IF(ISNUMBER(B1),IF(B1<1.5,1,0),0)+IF(ISNUMBER(B2),10,20)+IF(ISNUMBER(B3),100,200)+IF(ISNUMBER(B4),1000,2000)'},
    "closing balance": {"A1": 1, "A2": 2, "B1": "=A1+A2", "B2": "=B1-A1", "B3": "=B2-A2", "C1": "=IF(B3>0,500,0)+IF(B3=0,1,2)"},
    "rest of a rest": {"A1": 1, "A2": 2, "B1": "=A1+A2+0.1", "B2": "=B1-0.1-A1", "B3": "=B2-A2", "B4": "=B3*1E12", "C1": "=IFERROR(B4/B3,-7)+IF(B4>0,3,0)"},
    "rest in a denominator": {"A1": 1, "A2": 2, "B1": "=A1*0.3", "B2": "=A1*0.1", "B3": "=A1*0.2", "B4": "=B1-B2-B3", "B5": "=B4*A2", "B6": "=A2/B5", "C1": "=IFERROR(B6,100)"},
    "sum of rests": {"A1": 1, "B1": "=A1*0.3", "B2": "=A1*0.1", "B3": "=B1-3*B2", "B4": "=B3+B3", "C1": "=ROUNDUP(B4,0)+SUM(B3,B4)"},
    "numbers in some draws": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": "=MIN(B1:B2)+MAX(B1:B2)*10+SUM(B1:B2)*100+PRODUCT(B1:B2)+COUNT(B1:B2)"},
    "an average of what is there": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": "=AVERAGE(B1:B2)"},
    "counts pass over errors": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": "=COUNT(B1:B3)+COUNT(B3,A1,5)*10"},
    "errors among what is there": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": "=MIN(B1:B3)"},
    "present value of what is there": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": "=NPV(0.1,B1:B2,3)"},
    "text or a number read draw by draw": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": '=LARGE(B1:B3,1)+LEN(B1&"")'},
    "logical or text read draw by draw": {"A1": 1, "A2": 2, "B1": '=IF(A1>0,A1,"")', "B2": '=IF(A2>2,A2,IF(A1>1,TRUE,"x"))', "B3": "=IF(A1=0,1/A1,A2)", "C1": '=IF(ISLOGICAL(B2),7,IF(ISTEXT(B2),LEN(B2),B2))+COUNTIF(B1:B2,">1")'},
    "condition that fails read draw by draw": {"A1": 1, "B1": '=IF(1/A1>0,A1,"none")', "C1": '=LEN(IFERROR(B1,"failed"))+MAX(B1:B1)'},
    "index with a place of at least one": {"A1": 1, "A2": 2, "D1": "=A1", "D2": "=A2+A1", "D3": "=1/A1", "C1": "=INDEX(D1:D3,MIN(3,MAX(1,ROUND(A2,0))))+SUM(INDEX(D1:D2,MATCH(A1,{-9,0,1},1)))"},
    "index with a place that may be nought": {"A1": 1, "A2": 2, "D1": "=A1", "D2": "=A2", "C1": "=SUM(INDEX(D1:D2,MAX(0,MIN(2,ROUND(A2,0)))))"},
    "array formula": {"A1": 1, "A2": 2, "C1": "=SUMPRODUCT((A1:A2>0)*A1:A2)"},
    "units": {"A1": 1, "A2": 2, "D1": "F", "C1": '=CONVERT(A1,D1,"C")+CONVERT(1/A2,"mi","km")+CONVERT(A1,"C","C")'},
    "units that do not fit": {"A1": 1, "C1": '=CONVERT(1/A1,"m","kg")'},
    "units of a logical": {"A1": 1, "C1": '=CONVERT(A1>0,"m","km")'},
    "a unit that varies": {"A1": 1, "C1": '=CONVERT(2,IF(A1>0,"m","km"),"m")'},
    "bits and steps": {"A1": 1, "A2": 2, "C1": "=IFERROR(BITAND(INT(A2),3),-1)+GESTEP(A1,0.5)+DELTA(A1)+ERF(A1,A2)"},
    "logicals that add-in functions refuse": {"A1": 1, "A2": 2, "B1": "=A1>0", "C1": "=IFERROR(ERF(B1),7)+IFERROR(DELTA(TRUE,A1),9)+IFERROR(ERF(IF(A1>0,A2>1,A2)),11)"},
    "ranges that add-in functions refuse": {"A1": 1, "A2": 2, "C1": "=IFERROR(ERF(A1:A2),7)+IFERROR(GESTEP(A2,A1:A2),9)"},
    "let": {"A1": 1, "A2": 2, "C1": "=LET(x,A1+1,y,x*A2,y-x)"},
}  # fmt: skip


def draws_for(count: int) -> list[np.ndarray]:
    rng = np.random.default_rng(7)
    first = np.round(rng.normal(0.0, 1.5, count), 2)
    first[::7] = 0.0
    first[::11] = -1.0
    second = rng.normal(2.0, 1.0, count)
    return [first, second]


@pytest.mark.parametrize("name", MODELS)
def test_compiled_results_are_those_of_the_reference(name: str) -> None:
    cells = MODELS[name]
    graph = model_of(cells)  # type: ignore[arg-type]
    inputs = [place(address) for address in ("A1", "A2") if address in cells]
    values = draws_for(DRAWS)[: len(inputs)]
    compiled = compile_program(
        calculate(graph), inputs, [place("C1") if "C1" in cells else place("B1")], iterate=False
    )
    out = BlockEngine(compiled.program, calculate(graph), threads=1, block=512).run(values)[0]
    for draw in range(DRAWS):
        one = calculate(
            graph, {cell: float(v[draw]) for cell, v in zip(inputs, values, strict=True)}
        )
        wanted = one.cell_value(*(place("C1") if "C1" in cells else place("B1")))
        if isinstance(wanted, ErrorValue):
            assert np.isnan(out[draw]), f"{name}, draw {draw}: {out[draw]} for {wanted}"
            assert decode_error(float(out[draw])) is wanted
        else:
            assert isinstance(wanted, float)
            assert out[draw] == pytest.approx(wanted, rel=1e-12, abs=1e-12), f"{name}, draw {draw}"


def test_a_circular_chain_is_solved_in_every_draw() -> None:
    graph = model_of({"A1": 0.1, "B1": "=100+A1*B2", "B2": "=0.5*B1", "C1": "=B1*2"}, iterate=True)
    rates = np.linspace(0.0, 0.9, 50)
    compiled = compile_program(calculate(graph), [place("A1")], [place("C1")], iterate=True)
    out = BlockEngine(compiled.program, calculate(graph), threads=1).run([rates])[0]
    np.testing.assert_allclose(out, 200 / (1 - rates / 2), rtol=1e-12)


def test_a_circular_chain_is_named_where_iteration_is_off() -> None:
    graph = model_of({"A1": 0.1, "B1": "=100+A1*B2", "B2": "=0.5*B1"})
    with pytest.raises(CircularReferenceError, match="Sheet1!B1"):
        compile_program(calculate(graph), [place("A1")], [place("B2")], iterate=False)


def test_block_size_and_threads_change_no_bit() -> None:
    graph = model_of(MODELS["division by zero in some draws"])  # type: ignore[arg-type]
    inputs = [place("A1"), place("A2")]
    values = draws_for(5_000)
    base = calculate(graph)
    compiled = compile_program(base, inputs, [place("C1"), place("B2")], iterate=False)
    first = BlockEngine(compiled.program, base, threads=1, block=512).run(values)
    for threads, block in ((1, 2048), (2, 512), (3, 1024)):
        again = BlockEngine(compiled.program, base, threads=threads, block=block).run(values)
        assert again.tobytes() == first.tobytes()


def test_draws_given_by_the_caller_are_not_changed() -> None:
    graph = model_of(MODELS["powers"])  # type: ignore[arg-type]
    values = draws_for(100)
    before = [v.copy() for v in values]
    base = calculate(graph)
    compiled = compile_program(base, [place("A1"), place("A2")], [place("C1")], iterate=False)
    BlockEngine(compiled.program, base).run(values)
    for old, new in zip(before, values, strict=True):
        np.testing.assert_array_equal(old, new)


def test_draws_in_which_a_circular_chain_does_not_settle_are_counted_once() -> None:
    """x = 1 - x^2 rate: contracts for small rates, swings between two values for large ones."""
    graph = model_of({"A1": 0.1, "B1": "=1-A1*B2", "B2": "=B1^2", "C1": "=B1"}, iterate=True)
    base = calculate(graph)
    rates = np.array([0.1, 0.2, 1.5, 1.8, 0.3])
    compiled = compile_program(base, [place("A1")], [place("C1")], iterate=True)
    engine = BlockEngine(compiled.program, base, threads=1)
    out = engine.run([rates])[0]
    assert engine.unsettled == 2
    settled = rates < 1
    roots = (-1 + np.sqrt(1 + 4 * rates[settled])) / (2 * rates[settled])
    np.testing.assert_allclose(out[settled], roots, rtol=1e-12)


def test_a_block_that_is_run_again_counts_its_unsettled_draws_once() -> None:
    """Later blocks come near a cancellation behind the circle, so that they are run a second time."""
    circle = {"A1": 0.1, "A2": 2.5, "B1": "=1-A1*B2", "B2": "=B1^2"}
    rests = {"D1": "=A1*0.3", "D2": "=D1-A2*(A1*0.1)", "C2": "=B1+IF(D2=0,1,0)"}
    graph = model_of({**circle, **rests}, iterate=True)  # type: ignore[arg-type]
    base = calculate(graph)
    rates, factors = np.full(2_048, 0.1), np.full(2_048, 2.5)
    rates[600::100] = 1.5  # no solution
    factors[700::7] = 3.0  # D2 is nothing but a rest
    inputs = [place("A1"), place("A2")]
    compiled = compile_program(base, inputs, [place("C2")], iterate=True)
    engine = BlockEngine(compiled.program, base, threads=1, block=512)
    engine.run([rates, factors])
    assert engine.unsettled == int((rates == 1.5).sum())


def test_an_infinite_draw_is_an_error_and_not_a_number() -> None:
    graph = model_of({"A1": 1, "A2": 2, "C1": "=IF(A1>0,A2,1)"})
    base = calculate(graph)
    compiled = compile_program(base, [place("A1"), place("A2")], [place("C1")], iterate=False)
    out = BlockEngine(compiled.program, base).run([np.array([1.0, np.inf]), np.array([2.0, 3.0])])[
        0
    ]
    assert out[0] == 2.0
    assert decode_error(float(out[1])) is ErrorValue.NUM


RESTS = {
    "A1": 1,
    "A2": 2,
    "B1": "=A1*0.3",
    "B2": "=A1*0.1",
    "B3": "=B1-3*B2",
    "B4": "=B3*A2",
    "C1": "=IF(B4=0,5,A2)+A1/(1+A2-A2)",
}


def test_cancellation_is_looked_at_again_where_a_block_comes_near_it() -> None:
    """The first block cancels nowhere, later ones do in a few draws: all follow the same rule."""
    graph = model_of({**RESTS, "B3": "=B1-A3*B2", "A3": 2.5})
    inputs = [place("A1"), place("A2"), place("A3")]
    rng = np.random.default_rng(3)
    values = [rng.uniform(0.5, 2.0, 2_048), rng.uniform(1.0, 3.0, 2_048), np.full(2_048, 2.5)]
    values[2][700::9] = 3.0  # here B3 is nothing but a rest
    compiled = compile_program(calculate(graph), inputs, [place("C1")], iterate=False)
    engine = BlockEngine(compiled.program, calculate(graph), threads=1, block=512)
    out = engine.run(values)[0]
    for draw in range(0, 2_048, 3):
        overrides = dict(zip(inputs, (float(v[draw]) for v in values), strict=True))
        assert out[draw] == calculate(graph, overrides).cell_value(*place("C1"))


def test_shortcuts_change_no_bit() -> None:
    graph = model_of(RESTS)  # type: ignore[arg-type]
    inputs = [place("A1"), place("A2")]
    rng = np.random.default_rng(4)
    values = [rng.uniform(0.5, 2.0, 4_096), rng.uniform(1.0, 3.0, 4_096)]
    compiled = compile_program(calculate(graph), inputs, [place("C1")], iterate=False)
    in_one = BlockEngine(compiled.program, calculate(graph), threads=1, block=4_096).run(values)
    in_many = BlockEngine(compiled.program, calculate(graph), threads=2, block=512).run(values)
    assert in_one.tobytes() == in_many.tobytes()
