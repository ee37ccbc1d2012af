"""Finance against numpy-financial and SciPy."""

from __future__ import annotations

import datetime as dt
from types import SimpleNamespace
from typing import Any, cast

import numpy as np
import numpy_financial as npf  # type: ignore[import-untyped]
import pytest
from scipy.optimize import brentq

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import Context, find_function
from cellsim.values import Array

CONTEXT = cast("Context", SimpleNamespace(date_1904=False, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001


def call(name: str, *arguments: Any) -> float:
    function = find_function(name)
    assert function is not None
    found = call_function(function, list(arguments), CONTEXT)
    assert type(found) is float, f"{name}{arguments}: {found}"
    return found


def column(numbers: Any) -> Array:
    return Array(len(numbers), 1, [float(number) for number in numbers])


@pytest.mark.parametrize("seed", range(20))
def test_internal_rates_agree_with_numpy_financial(seed: int) -> None:
    rng = np.random.default_rng(seed)
    flows = np.concatenate([-rng.uniform(50, 150, 1 + seed % 3), rng.uniform(0, 60, 2 + seed)])
    assert call("IRR", column(flows)) == pytest.approx(npf.irr(flows), rel=1e-9, abs=1e-12)


@pytest.mark.parametrize("seed", range(20))
def test_dated_rates_agree_with_a_root_found_by_scipy(seed: int) -> None:
    rng = np.random.default_rng(seed)
    flows = np.concatenate([[-100.0], rng.uniform(1, 60, 4)])
    days = 45_000 + np.concatenate([[0], np.sort(rng.integers(1, 3000, 4))])
    years = (days - days[0]) / 365

    def worth(rate: float) -> float:
        return float((flows * (1 + rate) ** -years).sum())

    wanted = brentq(worth, -0.99, 1e4, xtol=1e-15, rtol=1e-14)
    assert call("XIRR", column(flows), column(days)) == pytest.approx(wanted, rel=1e-11, abs=1e-14)


@pytest.mark.parametrize("rate", [1e-4, 0.005, 0.08, 0.5, -0.02])
@pytest.mark.parametrize("due", [0, 1])
def test_loans_agree_with_numpy_financial(rate: float, due: int) -> None:
    when = "begin" if due else "end"
    loan = (rate, 24.0, 1000.0, 300.0, float(due))
    assert call("PMT", *loan) == pytest.approx(npf.pmt(rate, 24, 1000, 300, when), rel=1e-10)
    assert call("PV", *loan) == pytest.approx(npf.pv(rate, 24, 1000, 300, when), rel=1e-10)
    assert call("FV", *loan) == pytest.approx(npf.fv(rate, 24, 1000, 300, when), rel=1e-10)
    for period in (1.0, 2.0, 13.0, 24.0):
        arguments = (rate, period, 24.0, 1000.0, 300.0, float(due))
        interest = float(npf.ipmt(rate, period, 24, 1000, 300, when))
        assert call("IPMT", *arguments) == pytest.approx(interest, rel=1e-9, abs=1e-9)
        principal = float(npf.ppmt(rate, period, 24, 1000, 300, when))
        assert call("PPMT", *arguments) == pytest.approx(principal, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize("rate", [1e-6, 0.005, 0.08, 0.5, -0.02, -0.2])
@pytest.mark.parametrize("due", [0.0, 1.0])
def test_rates_and_periods_undo_payments(rate: float, due: float) -> None:
    paid = call("PMT", rate, 30.0, 1000.0, -200.0, due)
    assert call("RATE", 30.0, paid, 1000.0, -200.0, due) == pytest.approx(rate, rel=1e-9)
    assert call("NPER", rate, paid, 1000.0, -200.0, due) == pytest.approx(30, rel=1e-9)


def test_cumulated_parts_are_the_sums_of_the_parts() -> None:
    loan = (0.01, 36.0, 5000.0)
    interest = sum(call("IPMT", 0.01, float(k), 36.0, 5000.0) for k in range(5, 21))
    principal = sum(call("PPMT", 0.01, float(k), 36.0, 5000.0) for k in range(5, 21))
    assert call("CUMIPMT", *loan, 5.0, 20.0, 0.0) == pytest.approx(interest, rel=1e-13)
    assert call("CUMPRINC", *loan, 5.0, 20.0, 0.0) == pytest.approx(principal, rel=1e-13)


@pytest.mark.parametrize("basis", range(5))
@pytest.mark.parametrize("frequency", [1, 2, 4])
def test_yields_undo_prices(basis: int, frequency: int) -> None:
    bond = (43_000.0, 47_500.0, 0.04)
    terms = (100.0, float(frequency), float(basis))
    price = call("PRICE", *bond, 0.055, *terms)
    assert call("YIELD", *bond, price, *terms) == pytest.approx(0.055, rel=1e-12)


@pytest.mark.parametrize("frequency", [1, 2, 4])
def test_durations_are_slopes_of_prices(frequency: int) -> None:
    bond = (43_000.0, 47_500.0, 0.04)
    terms = (100.0, float(frequency), 1.0)
    step = 1e-5
    up, down = (call("PRICE", *bond, 0.055 + d, *terms) for d in (step, -step))
    length, since = (call(n, *bond[:2], *terms[1:]) for n in ("COUPDAYS", "COUPDAYBS"))
    dirty = call("PRICE", *bond, 0.055, *terms) + 100 * 0.04 / frequency * since / length
    slope = -(up - down) / (2 * step) / dirty
    assert call("MDURATION", *bond, 0.055, *terms[1:]) == pytest.approx(slope, rel=1e-7)
