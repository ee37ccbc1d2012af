"""Distribution functions over draws: each draw by itself gives the same value or error."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from types import SimpleNamespace
from typing import Any, cast

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from small_models import calculate, model_of, place

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.engine.blocks import BlockEngine
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import (
    ArgumentKind,
    Context,
    Stack,
    all_functions,
    find_function,
    find_over_draws,
)
from cellsim.program.lower import compile_program
from cellsim.values import Array, ErrorValue, Value, decode_error, encode_error

CONTEXT = cast("Context", SimpleNamespace(date_1904=False, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001

edges = st.sampled_from([0.0, 1.0, -1.0, 0.5, -0.5, 1e-300, 1e300, -1e9])
values = st.one_of(edges, st.floats(-5, 60), st.floats(0, 1))
positive = st.one_of(edges, st.floats(0.05, 40), st.floats(1e-6, 1e6))
shares = st.one_of(edges, st.floats(0, 1), st.floats(1e-200, 1e-3))
counts = st.one_of(edges, st.integers(-1, 40).map(float), st.floats(0, 300))
freedoms = st.one_of(edges, st.floats(0.5, 200), st.sampled_from([1e10, 2e10]))
flags = st.sampled_from([0.0, 1.0])

ARGUMENTS: dict[str, list[st.SearchStrategy[float]]] = {
    "BETA.DIST": [shares, positive, positive, flags],
    "BETADIST": [values, positive, positive, values, values],
    "BETA.INV": [shares, positive, positive],
    "BETAINV": [shares, positive, positive, values, values],
    "BINOM.DIST": [counts, counts, shares, flags],
    "BINOMDIST": [counts, counts, shares, flags],
    "BINOM.DIST.RANGE": [counts, shares, counts, counts],
    "BINOM.INV": [counts, shares, shares],
    "CRITBINOM": [counts, shares, shares],
    "CHISQ.DIST": [positive, freedoms, flags],
    "CHISQ.DIST.RT": [positive, freedoms],
    "CHISQ.INV": [shares, freedoms],
    "CHISQ.INV.RT": [shares, freedoms],
    "CHIDIST": [positive, freedoms],
    "CHIINV": [shares, freedoms],
    "CONFIDENCE": [shares, positive, counts],
    "CONFIDENCE.NORM": [shares, positive, counts],
    "CONFIDENCE.T": [shares, positive, counts],
    "EXPON.DIST": [positive, positive, flags],
    "EXPONDIST": [positive, positive, flags],
    "F.DIST": [positive, freedoms, freedoms, flags],
    "F.DIST.RT": [positive, freedoms, freedoms],
    "F.INV": [shares, freedoms, freedoms],
    "F.INV.RT": [shares, freedoms, freedoms],
    "FDIST": [positive, freedoms, freedoms],
    "FINV": [shares, freedoms, freedoms],
    "FISHER": [values],
    "FISHERINV": [values],
    "GAMMA": [values],
    "GAMMA.DIST": [positive, positive, positive, flags],
    "GAMMA.INV": [shares, positive, positive],
    "GAMMADIST": [positive, positive, positive, flags],
    "GAMMAINV": [shares, positive, positive],
    "GAMMALN": [positive],
    "GAMMALN.PRECISE": [positive],
    "GAUSS": [values],
    "HYPGEOM.DIST": [counts, counts, counts, counts, flags],
    "HYPGEOMDIST": [counts, counts, counts, counts],
    "LOGINV": [shares, values, positive],
    "LOGNORM.DIST": [positive, values, positive, flags],
    "LOGNORM.INV": [shares, values, positive],
    "LOGNORMDIST": [positive, values, positive],
    "NEGBINOM.DIST": [counts, counts, shares, flags],
    "NEGBINOMDIST": [counts, counts, shares],
    "NORM.DIST": [values, values, positive, flags],
    "NORM.INV": [shares, values, positive],
    "NORM.S.DIST": [values, flags],
    "NORM.S.INV": [shares],
    "NORMDIST": [values, values, positive, flags],
    "NORMINV": [shares, values, positive],
    "NORMSDIST": [values],
    "NORMSINV": [shares],
    "PHI": [values],
    "POISSON": [counts, positive, flags],
    "POISSON.DIST": [counts, positive, flags],
    "STANDARDIZE": [values, values, positive],
    "T.DIST": [values, freedoms, flags],
    "T.DIST.2T": [positive, freedoms],
    "T.DIST.RT": [values, freedoms],
    "T.INV": [shares, freedoms],
    "T.INV.2T": [shares, freedoms],
    "TDIST": [positive, freedoms, st.floats(0.5, 3.5)],
    "TINV": [shares, freedoms],
    "WEIBULL": [positive, positive, positive, flags],
    "WEIBULL.DIST": [positive, positive, positive, flags],
}

FAMILIES = {"continuous_distributions", "sampling_distributions", "discrete_distributions"}


def same(over_draws: float, alone: Value) -> bool:
    if over_draws != over_draws:
        return decode_error(over_draws) is alone
    return type(alone) is float and abs(over_draws - alone) <= 1e-12 * abs(alone)


def of_draw(argument: Any, kind: ArgumentKind, draw: int) -> Value:
    if isinstance(argument, Stack):
        return Array(argument.rows, argument.columns, argument.data[:, draw].tolist())
    number = float(argument[draw]) if np.ndim(argument) else float(argument)
    return number != 0 if kind is ArgumentKind.LOGICAL else number


def check(name: str, arguments: Sequence[Any], draws: int) -> None:
    function, kernel = find_function(name), find_over_draws(name)
    assert function is not None
    assert kernel is not None
    with np.errstate(all="ignore"):
        found = np.broadcast_to(np.asarray(kernel(*arguments)), (draws,))
    assert not np.isinf(found).any()
    for draw in range(draws):
        singles = [
            of_draw(argument, function.parameter(place).kind, draw)
            for place, argument in enumerate(arguments)
        ]
        alone = call_function(function, singles, CONTEXT)
        assert same(float(found[draw]), alone), f"{name}{singles}: {found[draw]!r}, {alone!r}"


def test_every_function_of_these_families_is_compared() -> None:
    declared = {name for name, record in all_functions().items() if record.module in FAMILIES}
    assert declared - {"PROB"} <= set(ARGUMENTS)


@pytest.mark.parametrize("name", ARGUMENTS)
@settings(max_examples=30, deadline=None, derandomize=True)
@given(data=st.data())
def test_each_draw_gives_what_the_function_gives_alone(name: str, data: st.DataObject) -> None:
    draws = 6
    arguments: list[Any] = []
    for drawn in ARGUMENTS[name]:
        if data.draw(st.booleans()):
            arguments.append(data.draw(drawn))
        else:
            arguments.append(np.array(data.draw(st.lists(drawn, min_size=draws, max_size=draws))))
    check(name, arguments, draws)


@pytest.mark.parametrize("name", ARGUMENTS)
def test_draws_that_hold_an_error_do_not_disturb_the_others(name: str) -> None:
    sound = [4.0, 0.5, 0.5, 0.0] if name.startswith("BINOM.DIST.R") else [0.4, 5.0, 5.0, 9.0, 1.0]
    arguments = [np.full(3, number) for number in sound[: len(ARGUMENTS[name])]]
    kernel = find_over_draws(name)
    assert kernel is not None
    with np.errstate(all="ignore"):
        whole = np.array(kernel(*arguments))
        for argument in arguments:
            argument[1] = encode_error(ErrorValue.NA)
        found = np.array(kernel(*arguments))
    assert found[[0, 2]].tobytes() == whole[[0, 2]].tobytes()


items = st.one_of(st.sampled_from([0.0, 1.0, 2.0]), st.floats(-50, 50))


def stacks(data: st.DataObject, rows: int, columns: int, draws: int) -> Stack:
    size = rows * columns * draws
    drawn = np.array(data.draw(st.lists(items, min_size=size, max_size=size)))
    return Stack(rows, columns, drawn.reshape(rows * columns, draws))


@settings(max_examples=60, deadline=None, derandomize=True)
@given(data=st.data())
def test_tests_of_hypotheses_agree_with_single_draws(data: st.DataObject) -> None:
    draws = 4
    rows, columns, other = (data.draw(st.integers(1, 3)) for _ in range(3))
    first = stacks(data, rows, columns, draws)
    second = stacks(data, rows, columns if data.draw(st.booleans()) else other, draws)
    kinds = np.array(data.draw(st.lists(st.floats(0.5, 4.5), min_size=draws, max_size=draws)))
    check("T.TEST", [first, second, data.draw(st.floats(0.5, 3.5)), kinds], draws)
    check("F.TEST", [first, second], draws)
    check("CHISQ.TEST", [first, second], draws)
    check("Z.TEST", [first, kinds], draws)
    check("Z.TEST", [first, kinds, kinds - 1], draws)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(data=st.data())
def test_given_distributions_agree_with_single_draws(data: st.DataObject) -> None:
    draws, size = 4, data.draw(st.integers(1, 5))
    weights = np.array(
        data.draw(st.lists(st.floats(0, 1), min_size=size * draws, max_size=size * draws))
    ).reshape(size, draws)
    with np.errstate(invalid="ignore"):
        shares = Stack(size, 1, np.nan_to_num(weights / weights.sum(axis=0)))
    low = np.array(data.draw(st.lists(items, min_size=draws, max_size=draws)))
    check("PROB", [stacks(data, size, 1, draws), shares, low, data.draw(items)], draws)
    check("PROB", [stacks(data, size, 1, draws), shares, low], draws)


def test_results_do_not_depend_on_the_draws_beside_them() -> None:
    rng = np.random.default_rng(7)
    drawn = [np.floor(rng.uniform(0, top, 400)) for top in (60, 200, 300, 600)]
    samples = [rng.normal(size=(9, 400)) for _ in range(2)]
    for name, arguments in (("HYPGEOM.DIST", [*drawn, 1.0]), ("T.TEST", [*samples, 2.0, 3.0])):
        kernel = find_over_draws(name)
        assert kernel is not None

        def part(start: int, stop: int, given: list[Any] = arguments, run: Any = kernel) -> bytes:
            cut = [a[..., start:stop] if np.ndim(a) else a for a in given]
            cut = [Stack(9, 1, a) if np.ndim(a) == 2 else a for a in cut]
            with np.errstate(all="ignore"):
                return bytes(np.asarray(run(*cut)).tobytes())

        assert part(0, 400) == part(0, 1) + part(1, 8) + part(8, 400)


MODELS = {
    "quantile": {"A1": 0.5, "C1": "=BETA.INV(A1/10+0.3,2,3,,5)+T.INV(A1/9+0.4,7)"},
    "loss given default": {"A1": 0.5, "B1": "=NORM.S.INV(A1/9+0.4)", "C1": "=BETA.DIST(B1,2,5,TRUE)"},
    "failure": {"A1": 0.5, "C1": "=1-WEIBULL.DIST(A1,1.5,2,TRUE)+GAMMA.DIST(A1+3,2,3,FALSE)"},
    "defaults": {"A1": 0.5, "C1": "=CRITBINOM(200,0.03,A1/9+0.4)+BINOM.DIST(A1*9,20,0.3,A1>1)"},
    "error": {"A1": 0.5, "C1": "=IFERROR(POISSON.DIST(A1,2,FALSE),-1)+CHISQ.INV.RT(A1,3)"},
    "sample": {"A1": 0.5, "B1": 3, "B2": "=A1", "B3": 5, "B4": 9, "C1": "=T.TEST(B1:B2,B3:B4,2,3)"},
    "sample with text": {"A1": 0.5, "B1": 3, "B2": "=A1", "B3": "x", "C1": "=Z.TEST(B1:B3,A1,2)"},
    "given": {"A1": 0.5, "B1": 0.4, "B2": "=1-B1", "C1": "=PROB(B3:B4,B1:B2,A1)", "B3": 0, "B4": 1},
}  # fmt: skip


@pytest.mark.parametrize("name", MODELS)
def test_models_that_use_distributions_are_compiled(name: str) -> None:
    """Against the reference, draw by draw, draws outside of a function's domain included."""
    graph = model_of(MODELS[name])  # type: ignore[arg-type]
    source, target = place("A1"), place("C1")
    values = np.round(np.random.default_rng(3).normal(0.5, 1.5, 200), 2)
    values[::7] = 0.0
    compiled = compile_program(calculate(graph), [source], [target], iterate=False)
    found = BlockEngine(compiled.program, calculate(graph), threads=1, block=64).run([values])[0]
    for draw, number in enumerate(values.tolist()):
        alone = calculate(graph, {source: number}).cell_value(*target)
        assert same(float(found[draw]), alone), f"{number}: {found[draw]!r}, {alone!r}"
