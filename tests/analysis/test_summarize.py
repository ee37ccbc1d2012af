"""One sample described whole."""

from __future__ import annotations

import numpy as np
import pytest

from cellsim.analysis.summarize import summarize


def test_failed_draws_are_kept_out_of_every_figure() -> None:
    data = np.array([1.0, np.nan, 3.0, np.inf, 2.0, -np.inf])
    found = summarize(data, [0.5], about=[2.0])
    assert found is not None
    assert (found.draws, found.failed, found.moments.count) == (6, 3, 3)
    assert found.quantiles.values.tolist() == [2.0]
    assert found.exceedances[0].above.count == 3
    assert int(found.histogram.counts.sum()) == 3


def test_no_finite_draw_gives_no_summary() -> None:
    assert summarize(np.full(5, np.nan), [0.5]) is None


def test_the_draws_are_left_as_they_were() -> None:
    data = np.array([3.0, 1.0, 2.0])
    summarize(data, [0.5])
    assert data.tolist() == [3.0, 1.0, 2.0]


@pytest.mark.parametrize("probabilities", [[-0.1], [1.1], [0.5, 0.4], [0.5, 0.5]])
def test_wrong_probabilities_are_refused(probabilities: list[float]) -> None:
    with pytest.raises(ValueError, match="probabilities"):
        summarize(np.array([1.0]), probabilities)


def test_values_to_compare_with_must_be_finite() -> None:
    with pytest.raises(ValueError, match="finite"):
        summarize(np.array([1.0]), [0.5], about=[np.nan])
