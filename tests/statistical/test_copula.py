"""Gaussian copula: what is asked as rank correlation is what the draws have.

Relations between Pearson, Spearman and Kendall correlations of a bivariate normal pair are those of
any textbook (Kruskal 1958); figures computed with mpmath.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from cellsim.uncertainty.dependence import normal_score_correlation
from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.sampling import achieved_rank_correlation, draw_inputs

PEARSON_FOR_SPEARMAN = {
    0.3: 0.312868930,
    0.5: 0.517638090,
    0.7: 0.716735899,
    0.9: 0.907980999,
    -0.5: -0.517638090,
    0.0: 0.0,
    1.0: 1.0,
    -1.0: -1.0,
}
SPEARMAN_AND_KENDALL = {
    0.3: (0.287564219, 0.193973368),
    0.5: (0.482583740, 0.333333333),
    0.7: (0.682910504, 0.493633378),
    0.9: (0.891456132, 0.712867414),
}
DRAWS = 100_000
MARGINS = [
    build_distribution("normal", {"mean": 3, "sd": 2}),
    build_distribution("lognormal", {"mu": 0, "sigma": 1}),
    build_distribution("triangular", {"low": 0, "mode": 1, "high": 4}),
    build_distribution("pert", {"low": 0, "mode": 1, "high": 4}),
]
MATRIX = np.array(
    [
        [1.0, 0.8, 0.4, 0.0],
        [0.8, 1.0, 0.3, -0.2],
        [0.4, 0.3, 1.0, 0.1],
        [0.0, -0.2, 0.1, 1.0],
    ]
)


def test_pearson_of_normal_scores_for_a_rank_correlation() -> None:
    found = normal_score_correlation(np.array(list(PEARSON_FOR_SPEARMAN)))

    np.testing.assert_allclose(found, list(PEARSON_FOR_SPEARMAN.values()), rtol=2e-9)


@pytest.mark.parametrize(
    ("pearson", "spearman", "kendall"),
    [(r, *both) for r, both in SPEARMAN_AND_KENDALL.items()],
)
def test_pair_has_the_correlations_of_a_bivariate_normal(
    pearson: float, spearman: float, kendall: float
) -> None:
    matrix = np.array([[1.0, spearman], [spearman, 1.0]])

    x, y = draw_inputs([MARGINS[0]] * 2, matrix, DRAWS, 5, "random")

    error = (1 - pearson**2) / math.sqrt(DRAWS)
    assert np.corrcoef(x, y)[0, 1] == pytest.approx(pearson, abs=4.5 * error)
    assert stats.spearmanr(x, y).statistic == pytest.approx(spearman, abs=4.5 * 1.1 * error)
    assert stats.kendalltau(x, y).statistic == pytest.approx(kendall, abs=4.5 * error)


@pytest.mark.parametrize(("sampling", "tolerance"), [("random", 0.015), ("latin-hypercube", 0.004)])
def test_any_margins_get_the_rank_correlations_asked_for(sampling: str, tolerance: float) -> None:
    draws = draw_inputs(MARGINS, MATRIX, DRAWS, 5, sampling)

    np.testing.assert_allclose(achieved_rank_correlation(draws), MATRIX, atol=tolerance)


@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_perfect_correlation_is_perfect(sampling: str, sign: float) -> None:
    matrix = np.array([[1.0, sign, 0.5], [sign, 1.0, 0.5 * sign], [0.5, 0.5 * sign, 1.0]])

    x, y, z = draw_inputs(MARGINS[:3], matrix, 20_000, 8, sampling)

    assert stats.spearmanr(x, y).statistic == pytest.approx(sign, abs=1e-12)
    assert stats.spearmanr(x, z).statistic == pytest.approx(0.5, abs=0.03)


def test_lognormals_have_the_linear_correlation_of_their_copula() -> None:
    """(exp(r s t) - 1) / sqrt((exp(s^2) - 1)(exp(t^2) - 1)) with r 0.7, s 0.5, t 1."""
    both = [build_distribution("lognormal", {"mu": 0, "sigma": sigma}) for sigma in (0.5, 1.0)]
    rank = 0.682910504
    matrix = np.array([[1.0, rank], [rank, 1.0]])

    x, y = draw_inputs(both, matrix, 400_000, 2, "latin-hypercube")

    assert np.corrcoef(x, y)[0, 1] == pytest.approx(0.599871502, abs=0.01)


@pytest.mark.parametrize("draws", [1, 2, 3, 4, 5])
def test_few_draws_are_drawn_all_the_same(draws: int) -> None:
    found = draw_inputs(MARGINS, MATRIX, draws, 5, "latin-hypercube")

    assert found.shape == (4, draws)
    assert np.isfinite(found).all()


def test_rank_correlation_agrees_with_scipy_with_and_without_ties() -> None:
    generator = np.random.default_rng(1)
    draws = generator.normal(size=(4, 500))
    draws[1] += draws[0]
    draws[2] = np.round(draws[1])
    draws[3] = np.where(draws[0] > 0, 1.0, 0.0)

    np.testing.assert_allclose(
        achieved_rank_correlation(draws), stats.spearmanr(draws.T).statistic, atol=1e-12
    )


def test_rank_correlation_with_a_constant_is_unknown() -> None:
    found = achieved_rank_correlation(np.array([[1.0, 2.0, 3.0], [5.0, 5.0, 5.0]]))

    assert np.isnan(found[0, 1])
    assert np.isnan(found[1, 0])
    assert found[0, 0] == found[1, 1] == 1.0
