"""Dates over draws are the dates of single draws, in both date systems."""

from __future__ import annotations

import datetime as dt
from types import SimpleNamespace
from typing import cast

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import Context, find_function, find_over_draws
from cellsim.values import decode_error

days = st.one_of(
    st.sampled_from([-1.0, -0.5, 0.0, 0.9, 1.0, 59.0, 60.0, 61.0, 1461.0, 2_957_003.0, 2_958_465.0, 2_958_466.0]),
    st.floats(0, 60_000),
    st.floats(-1e7, 1e7),
)  # fmt: skip
months = st.one_of(st.integers(-40, 40).map(float), st.floats(-30_000, 130_000), st.just(1e12))
years = st.one_of(st.integers(-2, 10_001).map(float), st.floats(1890, 2100))
ARGUMENTS = {
    "YEAR": [days],
    "MONTH": [days],
    "DAY": [days],
    "EDATE": [days, months],
    "EOMONTH": [days, months],
    "DAYS": [days, days],
    "DATE": [years, months, st.floats(-1e5, 1e5)],
}


@pytest.mark.parametrize("date_1904", [False, True])
@pytest.mark.parametrize("name", ARGUMENTS)
@settings(max_examples=40, deadline=None)
@given(data=st.data())
def test_each_draw_is_what_it_is_alone(name: str, date_1904: bool, data: st.DataObject) -> None:
    context = cast("Context", SimpleNamespace(date_1904=date_1904, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001
    draws = 30
    columns = [
        np.array(data.draw(st.lists(values, min_size=draws, max_size=draws)))
        for values in ARGUMENTS[name]
    ]
    kernel, function = find_over_draws(name), find_function(name)
    assert kernel is not None
    assert function is not None
    options = {} if name == "DAYS" else {"date_1904": date_1904}
    with np.errstate(all="ignore"):
        together = kernel(*columns, **options)
    assert together is not None
    for draw in range(draws):
        alone = call_function(
            function, [float(column[draw]) for column in columns], context, whole_arrays=False
        )
        found = float(together[draw])
        assert alone == (found if found == found else decode_error(found))


def test_a_number_for_all_draws_serves_too() -> None:
    kernel = find_over_draws("EDATE")
    assert kernel is not None
    result = kernel(46022.0, np.array([0.0, 1.0, -1.0]))  # 2025-12-31
    assert result is not None
    assert result.tolist() == [46022.0, 46053.0, 45991.0]
