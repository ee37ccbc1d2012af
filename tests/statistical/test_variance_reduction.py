"""What Latin hypercube sampling saves (McKay, Beckman and Conover 1979; Stein 1987; Owen 1997)."""

from __future__ import annotations

import numpy as np
import pytest

from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.sampling import draw_inputs

REPEATS = 4000
UNIT = build_distribution("uniform", {"low": 0, "high": 1})


def variance_of_mean(inputs: int, draws: int, sampling: str) -> float:
    """Variance, over seeds, of the mean of the product of uniforms."""
    means = [
        draw_inputs([UNIT] * inputs, None, draws, seed, sampling).prod(axis=0).mean()
        for seed in range(REPEATS)
    ]
    return float(np.var(means))


RELATIVE_ERROR = 4.5 * (2 / REPEATS) ** 0.5
"""Of a variance estimated from so many means that are close to normal."""


@pytest.mark.parametrize("draws", [8, 16])
def test_mean_of_one_input_has_the_variance_of_jittered_strata(draws: int) -> None:
    found = variance_of_mean(1, draws, "latin-hypercube")

    assert found == pytest.approx(1 / (12 * draws**3), rel=RELATIVE_ERROR)


def test_mean_of_one_random_input_has_the_plain_variance() -> None:
    assert variance_of_mean(1, 16, "random") == pytest.approx(1 / (12 * 16), rel=RELATIVE_ERROR)


def test_product_keeps_only_the_part_that_is_not_additive() -> None:
    """The residual after the additive part is 1/144 against 7/144 for plain sampling."""
    draws = 64
    plain = draws * variance_of_mean(2, draws, "random")
    stratified = draws * variance_of_mean(2, draws, "latin-hypercube")

    assert plain == pytest.approx(7 / 144, rel=RELATIVE_ERROR)
    # 0.00703 at 64 draws (own simulation of 4,000 repeats, scipy.stats.qmc); the limit is 1/144
    assert stratified == pytest.approx(0.00703, rel=RELATIVE_ERROR + 0.03)
    assert stratified < plain / 5
