"""Finance over draws: each draw by itself gives the same, whatever draws stand beside it."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from types import SimpleNamespace
from typing import Any, cast

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.rates_of_return_over_draws import internal_rates
from cellsim.functions.registry import (
    ArgumentKind,
    Context,
    Stack,
    find_function,
    find_over_draws,
)
from cellsim.values import Array, Value, decode_error

FloatArray = npt.NDArray[np.float64]

CONTEXT = cast("Context", SimpleNamespace(date_1904=False, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001

rates = st.one_of(st.sampled_from([0.0, -1.0, 1e-9, 0.05]), st.floats(-1.5, 3))
amounts = st.one_of(st.sampled_from([0.0, 1000.0, -1000.0]), st.floats(-1e6, 1e6))
periods = st.one_of(st.integers(-2, 60).map(float), st.floats(0, 60))
kinds = st.sampled_from([0.0, 1.0])
counts = st.integers(0, 8).map(float)
positive = st.floats(1, 1e6)

SINGLE_VALUES = {
    "PMT": [rates, periods, amounts, amounts, kinds],
    "PV": [rates, periods, amounts, amounts, kinds],
    "FV": [rates, periods, amounts, amounts, kinds],
    "NPER": [rates, amounts, amounts, amounts, kinds],
    "RATE": [periods, amounts, amounts, amounts, kinds],
    "IPMT": [rates, counts, periods, amounts, amounts, kinds],
    "PPMT": [rates, counts, periods, amounts, amounts, kinds],
    "ISPMT": [rates, counts, periods, amounts],
    "CUMIPMT": [rates, periods, positive, counts, counts, kinds],
    "CUMPRINC": [rates, periods, positive, counts, counts, kinds],
    "EFFECT": [rates, periods],
    "NOMINAL": [rates, periods],
    "PDURATION": [rates, amounts, amounts],
    "RRI": [periods, amounts, amounts],
    "DOLLARDE": [amounts, periods],
    "DOLLARFR": [amounts, periods],
    "SLN": [amounts, amounts, periods],
    "SYD": [amounts, amounts, periods, counts],
    "DB": [positive, amounts, periods, periods, counts],
    "DDB": [positive, amounts, periods, counts, positive],
    "VDB": [positive, amounts, periods, counts, periods, st.floats(0, 3), kinds],
}


def same(over_draws: float, alone: Value) -> bool:
    if over_draws != over_draws:
        return decode_error(over_draws) is alone
    return type(alone) is float and abs(over_draws - alone) <= 1e-12 * max(abs(alone), 1e-9)


def of_draw(argument: Any, kind: ArgumentKind, draw: int) -> Value:
    if isinstance(argument, Stack):
        return Array(argument.rows, argument.columns, argument.data[:, draw].tolist())
    if kind is ArgumentKind.NUMBER_ITEMS:
        return Array(len(argument), 1, argument[:, draw].tolist())
    return float(argument[draw]) if np.ndim(argument) else float(argument)


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


@pytest.mark.parametrize("name", SINGLE_VALUES)
@settings(max_examples=25, deadline=None, derandomize=True)
@given(data=st.data())
def test_each_draw_gives_what_the_function_gives_alone(name: str, data: st.DataObject) -> None:
    draws = 5
    arguments: list[Any] = []
    for values in SINGLE_VALUES[name]:
        if data.draw(st.booleans()):
            arguments.append(data.draw(values))
        else:
            drawn = data.draw(st.lists(values, min_size=draws, max_size=draws))
            arguments.append(np.array(drawn))
    arguments[0] = np.broadcast_to(np.asarray(arguments[0]), (draws,))
    check(name, arguments, draws)


def flows_of(seed: int, count: int, draws: int) -> FloatArray:
    """Flows with zeros, several sign changes and, in some draws, none."""
    rng = np.random.default_rng(seed)
    flows = np.round(rng.normal(size=(count, draws)) * 100, rng.integers(0, 3))
    flows *= rng.random((count, draws)) < 0.8
    flows[0] -= 200 * (rng.random(draws) < 0.7)
    return flows


@pytest.mark.parametrize("seed", range(12))
def test_internal_rates_agree_with_those_found_one_by_one(seed: int) -> None:
    draws = 40
    flows = flows_of(seed, 2 + seed % 7, draws)
    guess = np.random.default_rng(seed).choice([0.1, 0.0, -0.3, 0.9, -1.0], draws)
    check("IRR", [flows, guess], draws)


@pytest.mark.parametrize("seed", range(8))
def test_functions_of_dated_flows_agree_with_single_draws(seed: int) -> None:
    draws = 30
    rng = np.random.default_rng(seed)
    flows = flows_of(seed, 6, draws)
    days = 40_000 + np.floor(rng.uniform(0, 2000, (6, draws if seed % 2 else 1)))
    days = np.broadcast_to(days, (6, draws)).copy()
    days[0] = 40_100 if seed == 3 else 40_000
    values, dates = Stack(6, 1, flows), Stack(6, 1, days)
    check("XIRR", [values, dates, 0.1], draws)
    check("XNPV", [rng.uniform(-0.2, 0.5, draws), values, dates], draws)


@pytest.mark.parametrize("seed", range(4))
def test_modified_rates_and_schedules_agree_with_single_draws(seed: int) -> None:
    rng = np.random.default_rng(seed)
    check("MIRR", [flows_of(seed, 5, 20), rng.uniform(-1.2, 0.5, 20), 0.12], 20)
    check("FVSCHEDULE", [rng.normal(size=20), Stack(3, 1, rng.uniform(-0.5, 0.5, (3, 20)))], 20)


def test_internal_rates_do_not_depend_on_the_draws_beside_them() -> None:
    flows = flows_of(1, 30, 1500)
    together = internal_rates(flows, 0.1)
    apart = [internal_rates(flows[:, k : k + size], 0.1) for k, size in ((0, 1), (1, 6), (7, 1493))]
    assert np.array_equal(together.view(np.uint64), np.concatenate(apart).view(np.uint64))


def test_internal_rates_make_the_present_value_vanish() -> None:
    flows = flows_of(2, 12, 300)
    found = internal_rates(flows, 0.1)
    good = ~np.isnan(found)
    assert good.sum() > 150
    times = np.arange(12.0)[:, None]
    worth = flows[:, good] * (1 + found[good]) ** -times
    assert np.all(np.abs(worth.sum(axis=0)) <= 1e-12 * np.abs(worth).sum(axis=0))


def test_a_draw_whose_flows_hold_an_error_does_not_disturb_the_others() -> None:
    flows = np.array([[-100.0, -100.0], [np.nan, 60.0], [70.0, 60.0]])
    found = internal_rates(flows, 0.1)
    assert np.isnan(found[0])
    assert found[1] == pytest.approx(0.13066238629180755, rel=1e-12)  # 100 x^2 = 60 x + 60
