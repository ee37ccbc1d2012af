"""Moments and quantiles of single families, and of formulas over draws, in closed form.

Formulas are those of any textbook; figures were computed with scipy 1.17.1 and mpmath 1.4.1.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.distributions.family import ParameterValue
from cellsim.uncertainty.sampling import draw_inputs

MOMENTS: dict[str, tuple[str, dict[str, ParameterValue], float, float]] = {
    "triangular (0, 1, 4)": (
        "triangular",
        {"low": 0, "mode": 1, "high": 4},
        5 / 3,
        math.sqrt(13 / 18),
    ),
    "triangular (10, 20, 40)": (
        "triangular",
        {"low": 10, "mode": 20, "high": 40},
        23.333333333,
        math.sqrt(38.888888889),
    ),
    "PERT (10, 20, 40)": (
        "pert",
        {"low": 10, "mode": 20, "high": 40},
        21.666666667,
        math.sqrt(30.555555556),
    ),
    "PERT (0, 50, 100)": (
        "pert",
        {"low": 0, "mode": 50, "high": 100},
        50,
        math.sqrt(357.142857143),
    ),
    "lognormal (ln 20, 0.54)": (
        "lognormal",
        {"p10": 10, "p90": 40},
        23.150122738,
        23.150122738 * math.sqrt(math.expm1(0.540865619**2)),
    ),
}

QUANTILES: dict[str, tuple[str, dict[str, ParameterValue], dict[float, float]]] = {
    "triangular (0, 1, 4)": (
        "triangular",
        {"low": 0, "mode": 1, "high": 4},
        {0.1: 0.632455532, 0.5: 1.550510257, 0.9: 2.904554885},
    ),
    "triangular (10, 20, 40)": (
        "triangular",
        {"low": 10, "mode": 20, "high": 40},
        {0.1: 15.477226, 0.5: 22.679492, 0.9: 32.254033},
    ),
    "PERT (10, 20, 40)": (
        "pert",
        {"low": 10, "mode": 20, "high": 40},
        {0.05: 13.284972, 0.1: 14.590831, 0.5: 21.274375, 0.9: 29.333701, 0.95: 31.398622},
    ),
    "PERT (0, 50, 100)": (
        "pert",
        {"low": 0, "mode": 50, "high": 100},
        {0.05: 18.925538, 0.95: 81.074462},
    ),
    "lognormal with mean 5 and coefficient of variation 0.2": (
        "lognormal",
        {"mean": 5, "sd": 1},
        {
            0.05: 58.997074 * 0.06,  # a Gordon growth value at 10 % and 4 %: dividend over 6 %
            0.5: 81.715056 * 0.06,
            0.95: 113.181045 * 0.06,
        },
    ),
}


@pytest.mark.parametrize(
    ("family", "parameters", "mean", "sd"), MOMENTS.values(), ids=list(MOMENTS)
)
def test_moments(
    family: str, parameters: dict[str, ParameterValue], mean: float, sd: float
) -> None:
    distribution = build_distribution(family, parameters)

    assert distribution.mean == pytest.approx(mean, rel=1e-9)
    assert distribution.sd == pytest.approx(sd, rel=1e-9)


@pytest.mark.parametrize(
    ("family", "parameters", "expected"), QUANTILES.values(), ids=list(QUANTILES)
)
def test_quantiles(
    family: str, parameters: dict[str, ParameterValue], expected: dict[float, float]
) -> None:
    distribution = build_distribution(family, parameters)

    found = distribution.quantile(np.array(list(expected)))

    np.testing.assert_allclose(found, list(expected.values()), rtol=5e-8)


def test_pert_does_not_follow_the_sixth_of_the_range_rule() -> None:
    """The project-planning rule gives 5.0 here; the distribution's own value differs."""
    pert = build_distribution("pert", {"low": 10, "mode": 20, "high": 40})

    assert pert.sd == pytest.approx(5.527708, abs=1e-6)


def test_lognormal_by_moments_has_these_log_parameters() -> None:
    by_moments = build_distribution("lognormal", {"mean": 5, "sd": 1})

    log_median = math.log(by_moments.quantile(np.array([0.5]))[0])
    log_upper = math.log(by_moments.at_score(np.array([1.0]))[0])

    assert log_median == pytest.approx(1.589827556, rel=1e-9)
    assert log_upper - log_median == pytest.approx(0.198042200, rel=1e-8)


ELICITED: dict[str, tuple[tuple[float, float, float], tuple[float, float]]] = {
    "symmetric": ((20, 50, 80), (-4.270509831, 104.270509831)),
    "skewed": ((10, 20, 40), (-0.522562047, 53.429918050)),
    "more skewed": ((5, 10, 30), (-2.416796900, 41.885189110)),
}


@pytest.mark.parametrize(("stated", "bounds"), ELICITED.values(), ids=list(ELICITED))
def test_triangle_from_quantiles_is_wider_than_they_are(
    stated: tuple[float, float, float], bounds: tuple[float, float]
) -> None:
    p10, mode, p90 = stated
    triangle = build_distribution("triangular", {"p10": p10, "mode": mode, "p90": p90})

    assert (triangle.lower, triangle.upper) == pytest.approx(bounds, rel=1e-9)
    assert triangle.lower < p10
    assert triangle.upper > p90
    np.testing.assert_allclose(triangle.cdf(np.array([p10, p90])), [0.1, 0.9], rtol=1e-12)


@pytest.mark.parametrize("mode", [10.0, 40.0])
def test_triangle_may_have_its_mode_at_a_quantile(mode: float) -> None:
    triangle = build_distribution("triangular", {"p10": 10, "mode": mode, "p90": 40})

    np.testing.assert_allclose(triangle.cdf(np.array([10.0, 40.0])), [0.1, 0.9], rtol=1e-12)


def test_triangle_from_uneven_quantiles() -> None:
    triangle = build_distribution("triangular", {"p2_5": 3, "mode": 4, "p75": 9})

    np.testing.assert_allclose(triangle.cdf(np.array([3.0, 9.0])), [0.025, 0.75], rtol=1e-12)


def test_normal_from_quantiles() -> None:
    normal = build_distribution("normal", {"p10": 20, "p90": 80})

    assert (normal.mean, normal.sd) == pytest.approx((50, 23.409124382), rel=1e-9)


def test_truncated_normal_has_the_moments_of_the_closed_form() -> None:
    """Mean and variance with the hazard at the bounds (Johnson, Kotz and Balakrishnan 1994)."""
    low, high = -0.5, 2.0
    mass = stats.norm.cdf(high) - stats.norm.cdf(low)
    first = (stats.norm.pdf(low) - stats.norm.pdf(high)) / mass
    second = 1 + (low * stats.norm.pdf(low) - high * stats.norm.pdf(high)) / mass

    truncated = build_distribution("normal", {"mean": 10, "sd": 4}, floor=8, cap=18)

    assert truncated.mean == pytest.approx(10 + 4 * first, rel=1e-13)
    assert truncated.sd == pytest.approx(4 * math.sqrt(second - first**2), rel=1e-13)


def test_truncated_lognormal_has_the_mean_of_the_closed_form() -> None:
    """The partial expectation of a lognormal, as in the price of a call."""
    mu, sigma, floor = 1.0, 1.5, 4.0
    z = (math.log(floor) - mu) / sigma
    partial = math.exp(mu + sigma**2 / 2) * stats.norm.cdf(sigma - z)

    truncated = build_distribution("lognormal", {"mu": mu, "sigma": sigma}, floor=floor)

    assert truncated.mean == pytest.approx(partial / stats.norm.sf(z), rel=1e-12)


def test_normal_beyond_thirty_deviations_keeps_its_shape() -> None:
    """Far out, the excess over the floor is nearly exponential with mean 1 / z (Mills's ratio)."""
    far = build_distribution("normal", {"mean": 0, "sd": 1}, floor=30)

    assert far.mean == pytest.approx(stats.norm.pdf(30) / stats.norm.sf(30), rel=1e-12)
    u = np.array([0.1, 0.5, 0.9])
    np.testing.assert_allclose(far.quantile(u), 30 - np.log1p(-u) / 30, rtol=1e-4)
    np.testing.assert_allclose(far.cdf(far.quantile(u)), u, rtol=1e-9)


LOG_X = {"mu": math.log(100), "sigma": 0.2}
LOG_Y = {"mu": math.log(50), "sigma": 0.3}
PAIR_DRAWS = 200_000


def pair(rank_correlation: float, sampling: str) -> tuple[np.ndarray, np.ndarray]:
    """Draws of two lognormals with a Gaussian copula."""
    matrix = np.array([[1.0, rank_correlation], [rank_correlation, 1.0]])
    both = [build_distribution("lognormal", LOG_X), build_distribution("lognormal", LOG_Y)]
    x, y = draw_inputs(both, matrix, PAIR_DRAWS, 11, sampling)
    return x, y


def check_lognormal(values: np.ndarray, mu: float, sigma: float, stated: tuple[float, ...]) -> None:
    """Mean and quantiles within 4.5 standard errors of the stated mean, P5 and P95."""
    mean, p5, p95 = stated
    reference = stats.lognorm(sigma, scale=math.exp(mu))
    assert reference.mean() == pytest.approx(mean, rel=1e-9)
    np.testing.assert_allclose(reference.ppf([0.05, 0.95]), [p5, p95], rtol=1e-9)
    assert values.mean() == pytest.approx(mean, abs=4.5 * reference.std() / PAIR_DRAWS**0.5)
    for p, quantile in ((0.05, p5), (0.95, p95)):
        error = math.sqrt(p * (1 - p) / PAIR_DRAWS) / reference.pdf(quantile)
        assert np.quantile(values, p) == pytest.approx(quantile, abs=4.5 * error)


@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_product_of_independent_lognormals(sampling: str) -> None:
    x, y = pair(0.0, sampling)

    stated = (5335.795122, 2763.167048, 9047.589075)
    check_lognormal(x * y, math.log(5000), math.sqrt(0.13), stated)


@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_product_of_lognormals_with_a_gaussian_copula(sampling: str) -> None:
    x, y = pair(6 / math.pi * math.asin(0.25), sampling)  # copula correlation 0.5

    stated = (5498.294276, 2441.134374, 10241.140456)
    check_lognormal(x * y, math.log(5000), math.sqrt(0.19), stated)


@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_ratio_of_lognormals(sampling: str) -> None:
    x, y = pair(0.0, sampling)

    check_lognormal(x / y, math.log(2), math.sqrt(0.13), (2.134318049, 1.105266820, 3.619035628))


@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_sum_of_correlated_normals(sampling: str) -> None:
    matrix = np.array([[1.0, 0.482583740], [0.482583740, 1.0]])  # copula correlation 0.5
    both = [
        build_distribution("normal", {"mean": 10, "sd": 3}),
        build_distribution("normal", {"mean": 20, "sd": 4}),
    ]

    total = draw_inputs(both, matrix, PAIR_DRAWS, 3, sampling).sum(axis=0)

    assert total.mean() == pytest.approx(30, abs=4.5 * 6.082762530 / PAIR_DRAWS**0.5)
    assert total.std() == pytest.approx(6.082762530, rel=4.5 / math.sqrt(2 * PAIR_DRAWS))
    error = 2.1132 * 6.082762530 / PAIR_DRAWS**0.5
    np.testing.assert_allclose(
        np.quantile(total, [0.05, 0.95]), [19.994746, 40.005254], rtol=0, atol=4.5 * error
    )
