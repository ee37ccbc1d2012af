"""Histograms: every draw counted once, round edges, tails in open bins."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cellsim.analysis.histogram import histogram, round_width


@given(st.lists(st.floats(-1e300, 1e300, allow_nan=False), min_size=1, max_size=60))
@settings(max_examples=200, deadline=None)
def test_every_value_is_in_the_bin_that_counts_it(values: list[float]) -> None:
    found = histogram(np.sort(np.array(values)))
    assert int(found.counts.sum()) == len(values)
    counted = np.zeros(len(found.counts), dtype=int)
    for value in values:
        place = found.bin_of(value)
        assert place is not None
        counted[place] += 1
    assert (counted == found.counts).all()


@pytest.mark.parametrize("scale", [1e-12, 1.0, 1e15])
def test_bins_have_one_round_width(scale: float) -> None:
    found = histogram(np.sort(np.random.default_rng(1).normal(5, 1, 10_000)) * scale)
    widths = np.diff(found.lower[np.isfinite(found.lower)]) / scale
    assert widths == pytest.approx(widths[0], rel=1e-9)
    round_widths = [m * 10.0**p for p in range(-4, 2) for m in (1, 2, 2.5, 5)]
    assert any(widths[0] == pytest.approx(width, rel=1e-9) for width in round_widths)
    assert 10 <= len(found.counts) <= 36


def test_long_tail_is_counted_in_an_open_bin() -> None:
    data = np.sort(np.random.default_rng(4).lognormal(0, 2.5, 50_000))
    found = histogram(data)
    assert found.upper[-1] == np.inf
    assert found.counts[-1] == (data >= found.lower[-1]).sum() > 0
    assert found.lower[-1] < data[-1] / 10


def test_short_tails_get_no_open_bins() -> None:
    found = histogram(np.sort(np.random.default_rng(4).uniform(0, 1, 10_000)))
    assert np.isfinite(found.lower).all()
    assert np.isfinite(found.upper).all()


def test_few_values_are_counted_one_by_one() -> None:
    found = histogram(np.array([0.0, 0.0, 1.0]))
    assert found.separate
    assert found.lower.tolist() == [0.0, 1.0]
    assert found.counts.tolist() == [2, 1]
    assert found.bin_of(0.5) is None


def test_decimal_edges_are_exact() -> None:
    found = histogram(np.sort(np.random.default_rng(8).uniform(0, 1, 500)))
    assert all(float(f"{edge:.12g}") == edge for edge in found.lower)


@pytest.mark.parametrize(
    ("wanted", "width"), [(1.0, 1.0), (1.1, 2.0), (0.021, 0.025), (30, 50), (7e-9, 1e-8)]
)
def test_width_is_rounded_up_to_a_round_number(wanted: float, width: float) -> None:
    step, power = round_width(wanted)
    assert step * 10.0**power == pytest.approx(width, rel=1e-12)
