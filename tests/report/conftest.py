"""Runs made by hand, of an invented ferry company, for tests of the results workbook."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from cellsim.results import (
    DependencePair,
    Disagreement,
    FailedDraw,
    Failures,
    InputRecord,
    ModelCheck,
    OutputRecord,
    RunRecord,
    RunResults,
    Threshold,
)
from cellsim.values import ErrorValue, Scalar, encode_error

SIDECAR = '[model]\nworkbook = "larkholm_ferries.xlsx"\n\n=1+1\n@x\n'


def an_input(name: str, **changes: Any) -> InputRecord:
    """An input, its record changed as wanted."""
    record = InputRecord(
        name=name,
        label=name.replace("_", " ").capitalize(),
        place="Inputs!C6",
        unit="",
        number_format="0.0%",
        distribution="normal, mean 0.03, sd 0.025",
        note="ten years of traffic counts",
        source="harbour office",
        base=0.03,
        base_percentile=0.5,
        mean=0.03,
        sd=0.025,
        lower=-np.inf,
        upper=np.inf,
        discrete=False,
    )
    return replace(record, **changes)


def an_output(
    name: str, base: Scalar = 4.0, thresholds: Sequence[float] = (), **changes: Any
) -> OutputRecord:
    """An output, its record changed as wanted."""
    record = OutputRecord(
        name=name,
        label=name.replace("_", " ").capitalize(),
        place="Valuation!D30",
        unit="EUR",
        number_format="0.00",
        base=base,
        thresholds=tuple(Threshold(f"{value}", value) for value in thresholds),
    )
    return replace(record, **changes)


def a_run_record(draws: int, **changes: Any) -> RunRecord:
    """A run record."""
    record = RunRecord(
        model="larkholm_ferries.xlsx",
        model_sha256="0" * 64,
        sidecar="larkholm_ferries.toml",
        sidecar_sha256="1" * 64,
        sidecar_text=SIDECAR,
        draws=draws,
        seed=4711,
        sampling="latin-hypercube",
        as_of=dt.datetime(2026, 6, 30, tzinfo=dt.UTC),
        started=dt.datetime(2026, 7, 1, 8, 30, tzinfo=dt.UTC),
        command="cellsim run larkholm_ferries.toml",
        versions={"cellsim": "0.1.0", "Python": "3.11.7"},
        engine={"threads": "2"},
        timings={"read": 0.25, "evaluate": 1.5},
        slow_cells=(("Costs!B2", "WEBSERVICE is not calculated"),),
    )
    return replace(record, **changes)


def make(
    outputs: Sequence[tuple[OutputRecord, Any]],
    inputs: Sequence[tuple[InputRecord, Any]] = (),
    **changes: Any,
) -> RunResults:
    """A run from records and their draws."""
    output_draws = np.array([draws for _, draws in outputs], dtype=np.float64)
    count = output_draws.shape[1]
    if not inputs:
        inputs = [
            (an_input("passenger_growth"), np.random.default_rng(7).normal(0.03, 0.025, count))
        ]
    results = RunResults(
        inputs=tuple(record for record, _ in inputs),
        outputs=tuple(record for record, _ in outputs),
        input_draws=np.array([draws for _, draws in inputs], dtype=np.float64),
        output_draws=output_draws,
        dependence=(),
        failures=_failures(outputs, output_draws),
        check=ModelCheck(120, 120, 0, 0, (), ()),
        record=a_run_record(count),
    )
    return replace(results, **changes)


def _failures(outputs: Sequence[tuple[OutputRecord, Any]], draws: np.ndarray) -> Failures:
    failed = ~np.isfinite(draws)
    counts = {
        (record.name, "#DIV/0!"): int(row.sum())
        for (record, _), row in zip(outputs, failed, strict=True)
        if row.any()
    }
    return Failures(int(failed.any(axis=0).sum()), counts, ())


@pytest.fixture
def ferry_run() -> RunResults:
    """A full run: thresholds, failed draws, dependence, differing formulas, notes."""
    rng = np.random.default_rng(20260701)
    count = 5_000
    growth = rng.normal(0.03, 0.025, count)
    price = rng.lognormal(4.0, 0.3, count)
    berth = rng.choice([0.0, 1.0], count, p=[0.65, 0.35])
    value = 4 + 20 * growth + 0.8 * berth - 0.01 * price + rng.normal(0, 0.4, count)
    upside = value / 4.2 - 1
    value[price > 110] = encode_error(ErrorValue.DIV0)
    cost = -1e6 * rng.lognormal(1.0, 0.9, count)
    failed = int(np.isnan(value).sum())
    first = int(np.flatnonzero(np.isnan(value))[0])
    values = {
        "passenger_growth": growth[first],
        "fuel_price": price[first],
        "new_berth": berth[first],
    }
    example = FailedDraw(
        first + 1, "value_per_share", "#DIV/0!", "Costs!D9", '=IF(C9>110,1/0,"ok")', values
    )
    return make(
        [
            (an_output("value_per_share", 4.1, [4.2, 3.0]), value),
            (an_output("upside", -0.02, [0.0], unit="%", number_format="0.0%", place="=Valuation!D30/Market!B2-1"), upside),
            (an_output("fuel_bill", ErrorValue.NA, unit="EUR", number_format="General"), cost),
        ],
        [
            (an_input("passenger_growth"), growth),
            (an_input("fuel_price", number_format="#,##0.00", unit="EUR/t", base=95.0, base_percentile=0.97,
                      distribution="lognormal, mean 57, sd 17", mean=57.1, sd=17.5, lower=0.0), price),
            (an_input("new_berth", number_format="0", base=0.0, base_percentile=0.65, discrete=True,
                      distribution="discrete, 0 with weight 0.65, 1 with weight 0.35", mean=0.35, sd=0.477), berth),
        ],
        dependence=(DependencePair("passenger_growth", "fuel_price", 0.4, 0.398),),
        failures=Failures(failed, {("value_per_share", "#DIV/0!"): failed}, (example,)),
        check=ModelCheck(
            120, 118, 3, 1,
            (Disagreement("Costs!B7", "=B6*1.1", 11.0, 11.1, root=False), Disagreement("Costs!B6", "=TODAY()-A1", "ten", 10.0, root=True)),
            (("WEBSERVICE", 1, "never: reads from the network"),),
            ("Macros are not run.",),
        ),
    )  # fmt: skip


@pytest.fixture
def make_run() -> Callable[..., RunResults]:
    """Makes a run from pairs of records and draws."""
    return make


@pytest.fixture
def output_record() -> Callable[..., OutputRecord]:
    """Makes an output's record."""
    return an_output


@pytest.fixture
def input_record() -> Callable[..., InputRecord]:
    """Makes an input's record."""
    return an_input
