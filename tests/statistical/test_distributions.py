"""One harness for every distribution: its functions and its draws against scipy.stats.

Reference: scipy.stats 1.17 (its `norm`, `lognorm`, `uniform`, `triang`, `beta`), conditioned on the
floor and the cap by numerical integration where there are any. Tolerances of draws are multiples of
standard errors.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from scipy import integrate, stats

from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.distributions.families import FAMILIES, build_distribution
from cellsim.uncertainty.distributions.family import ParameterValue
from cellsim.uncertainty.sampling import draw_inputs

FloatArray = npt.NDArray[np.float64]
DRAWS = 100_000
ERRORS = 4.5
"""Allowed distance in standard errors: passed by chance in all but 7 of a million."""
PROBABILITIES = np.array([1e-9, 1e-4, 0.01, 0.05, 0.1, 0.3, 0.5, 0.7, 0.9, 0.95, 0.99, 0.9999])


@dataclass(frozen=True)
class Case:
    """A distribution as asked for, and the same one of scipy before floor and cap."""

    family: str
    parameters: Mapping[str, ParameterValue]
    frozen: Any
    floor: float | None = None
    cap: float | None = None

    @cached_property
    def distribution(self) -> Distribution:
        return build_distribution(self.family, self.parameters, self.floor, self.cap)

    @cached_property
    def bounds(self) -> tuple[float, float]:
        low, high = self.frozen.support()
        low = low if self.floor is None else max(low, self.floor)
        return float(low), float(high if self.cap is None else min(high, self.cap))

    @cached_property
    def mass(self) -> float:
        low, high = self.bounds
        upper_half = self.frozen.cdf(low) > 0.5
        tail = self.frozen.sf if upper_half else self.frozen.cdf
        return float(abs(tail(high) - tail(low)))

    def cdf(self, x: FloatArray) -> FloatArray:
        low, _ = self.bounds
        if self.frozen.cdf(low) > 0.5:
            below: FloatArray = self.frozen.sf(low) - self.frozen.sf(x)
        else:
            below = self.frozen.cdf(x) - self.frozen.cdf(low)
        return np.clip(below / self.mass, 0, 1)

    def density(self, x: FloatArray) -> FloatArray:
        low, high = self.bounds
        return np.where((x >= low) & (x <= high), self.frozen.pdf(x) / self.mass, 0.0)

    def quantile(self, u: FloatArray) -> FloatArray:
        low, _ = self.bounds
        if self.frozen.cdf(low) > 0.5:
            return np.asarray(self.frozen.isf(self.frozen.sf(low) - u * self.mass))
        return np.asarray(self.frozen.ppf(self.frozen.cdf(low) + u * self.mass))

    @cached_property
    def moments(self) -> tuple[float, float]:
        """Mean and standard deviation; with a floor or a cap by integration over the density."""
        if self.floor is None and self.cap is None:
            return float(self.frozen.mean()), float(self.frozen.std())
        mean = self._integral(1, 0.0)
        return mean, math.sqrt(self._integral(2, mean))

    def _integral(self, power: int, center: float) -> float:
        low, high = (float(x) for x in self.quantile(np.array([1e-14, 1 - 1e-14])))
        low = self.bounds[0] if math.isfinite(self.bounds[0]) else low
        high = self.bounds[1] if math.isfinite(self.bounds[1]) else high
        inner = [float(x) for x in self.quantile(np.array([1e-6, 0.1, 0.5, 0.9, 1 - 1e-6]))]
        if self.family == "triangular":
            inner.append(float(self.frozen.ppf(self.frozen.kwds["c"])))  # the mode
        edges = [low, *sorted(x for x in inner if low < x < high), high]
        return sum(
            integrate.quad(
                lambda x: (x - center) ** power * float(self.density(np.array(x))), a, b, epsabs=0
            )[0]
            for a, b in pairwise(edges)
        )


def triangle(low: float, mode: float, high: float) -> Any:
    return stats.triang(c=(mode - low) / (high - low), loc=low, scale=high - low)


def scaled_beta(alpha: float, beta: float, low: float, high: float) -> Any:
    return stats.beta(alpha, beta, loc=low, scale=high - low)


Z90 = 1.2815515655446004  # normal quantile at 0.9 (statistical tables)
NORMAL = {"mean": 10.0, "sd": 3.0}
LOGNORMAL = {"mu": 0.5, "sigma": 0.4}
TRIANGLE = {"low": 10.0, "mode": 20.0, "high": 40.0}

CASES = {
    "normal": Case("normal", NORMAL, stats.norm(10, 3)),
    "normal by quantiles": Case("normal", {"p10": 20, "p90": 80}, stats.norm(50, 30 / Z90)),
    "normal by uneven quantiles": Case(
        "normal", {"p50": 5, "p97_5": 5 + 1.959963984540054}, stats.norm(5, 1)
    ),
    "normal with a floor": Case("normal", NORMAL, stats.norm(10, 3), floor=8.0),
    "normal with a cap": Case("normal", NORMAL, stats.norm(10, 3), cap=7.0),
    "normal between bounds": Case("normal", NORMAL, stats.norm(10, 3), floor=4.0, cap=11.0),
    "normal far in the upper tail": Case("normal", NORMAL, stats.norm(10, 3), floor=40.0),
    "normal far in the lower tail": Case("normal", NORMAL, stats.norm(10, 3), cap=-20.0),
    "lognormal by logarithm": Case("lognormal", LOGNORMAL, stats.lognorm(0.4, scale=np.exp(0.5))),
    "lognormal by moments": Case(
        "lognormal",
        {"mean": 5.0, "sd": 1.0},  # log parameters: check of the Gordon growth row below
        stats.lognorm(0.198042200, scale=np.exp(1.589827556)),
    ),
    "lognormal by quantiles": Case(
        "lognormal",
        {"p10": 10, "p90": 40},
        stats.lognorm(math.log(2) / Z90, scale=20.0),
    ),
    "lognormal shifted": Case(
        "lognormal", {**LOGNORMAL, "shift": -2.0}, stats.lognorm(0.4, loc=-2, scale=np.exp(0.5))
    ),
    "lognormal shifted by quantiles": Case(
        "lognormal",
        {"p10": 7, "p90": 37, "shift": -3},
        stats.lognorm(math.log(2) / Z90, loc=-3, scale=20.0),
    ),
    "lognormal between bounds": Case(
        "lognormal", LOGNORMAL, stats.lognorm(0.4, scale=np.exp(0.5)), floor=1.5, cap=2.5
    ),
    "lognormal above a floor": Case(
        "lognormal", LOGNORMAL, stats.lognorm(0.4, scale=np.exp(0.5)), floor=4.0
    ),
    "uniform": Case("uniform", {"low": -1.0, "high": 3.0}, stats.uniform(-1, 4)),
    "uniform by moments": Case(
        "uniform", {"mean": 2.0, "sd": 1.0}, stats.uniform(2 - 3**0.5, 2 * 3**0.5)
    ),
    "uniform by quantiles": Case("uniform", {"p25": 1, "p75": 2}, stats.uniform(0.5, 2)),
    "uniform between bounds": Case(
        "uniform", {"low": -1.0, "high": 3.0}, stats.uniform(-1, 4), floor=0.0, cap=9.0
    ),
    "triangular": Case("triangular", TRIANGLE, triangle(10, 20, 40)),
    "triangular rising": Case(
        "triangular", {"low": 1.0, "mode": 2.0, "high": 2.0}, triangle(1, 2, 2)
    ),
    "triangular falling": Case(
        "triangular", {"low": 1.0, "mode": 1.0, "high": 2.0}, triangle(1, 1, 2)
    ),
    "triangular by quantiles": Case(
        "triangular",
        {"p10": 10, "mode": 20, "p90": 40},
        triangle(-0.5225620473309682, 20, 53.4299180497289),
    ),
    "triangular around the mode": Case(
        "triangular", TRIANGLE, triangle(10, 20, 40), floor=15.0, cap=38.0
    ),
    "triangular above the mode": Case("triangular", TRIANGLE, triangle(10, 20, 40), floor=35.0),
    "triangular below the mode": Case("triangular", TRIANGLE, triangle(10, 20, 40), cap=12.0),
    "pert": Case("pert", TRIANGLE, scaled_beta(7 / 3, 11 / 3, 10, 40)),
    "pert with a weight": Case(
        "pert", {**TRIANGLE, "weight": 10.0}, scaled_beta(13 / 3, 23 / 3, 10, 40)
    ),
    "pert with the mode on a bound": Case(
        "pert", {"low": 0.0, "mode": 0.0, "high": 1.0}, scaled_beta(1, 5, 0, 1)
    ),
    "pert between bounds": Case(
        "pert", TRIANGLE, scaled_beta(7 / 3, 11 / 3, 10, 40), floor=15.0, cap=39.0
    ),
    "beta": Case("beta", {"alpha": 2.0, "beta": 5.0}, stats.beta(2, 5)),
    "beta with two peaks": Case("beta", {"alpha": 0.5, "beta": 0.5}, stats.beta(0.5, 0.5)),
    "beta steep": Case("beta", {"alpha": 80.0, "beta": 0.3}, stats.beta(80, 0.3)),
    "beta narrow": Case("beta", {"alpha": 3000.0, "beta": 5000.0}, stats.beta(3000, 5000)),
    "beta between bounds": Case(
        "beta", {"alpha": 2.0, "beta": 3.0, "low": -4.0, "high": 6.0}, scaled_beta(2, 3, -4, 6)
    ),
    "beta by moments": Case(  # share 0.4, variance 0.04: total 0.4 * 0.6 / 0.04 - 1 = 5
        "beta", {"mean": 0.0, "sd": 2.0, "low": -4.0, "high": 6.0}, scaled_beta(2, 3, -4, 6)
    ),
    "beta above a floor": Case("beta", {"alpha": 2.0, "beta": 5.0}, stats.beta(2, 5), floor=0.6),
}

every_case = pytest.mark.parametrize("case", CASES.values(), ids=list(CASES))


def test_every_continuous_family_has_a_case() -> None:
    discrete = {"discrete", "bernoulli"}

    assert {case.family for case in CASES.values()} == set(FAMILIES) - discrete


@every_case
def test_quantiles_are_the_reference(case: Case) -> None:
    expected = case.quantile(PROBABILITIES)
    spread = case.distribution.sd

    np.testing.assert_allclose(
        case.distribution.quantile(PROBABILITIES), expected, rtol=2e-9, atol=2e-9 * spread
    )


@every_case
def test_cdf_survival_and_density_are_the_reference(case: Case) -> None:
    x = case.quantile(PROBABILITIES)
    distribution = case.distribution

    np.testing.assert_allclose(distribution.cdf(x), case.cdf(x), rtol=1e-7, atol=1e-14)
    np.testing.assert_allclose(distribution.survival(x), 1 - case.cdf(x), rtol=1e-7, atol=1e-13)
    np.testing.assert_allclose(distribution.density(x), case.density(x), rtol=1e-7)


@every_case
def test_outside_the_bounds_there_is_nothing(case: Case) -> None:
    low, high = case.bounds
    outside = np.array([low - 1.0, high + 1.0])[np.isfinite([low, high])]

    assert (case.distribution.lower, case.distribution.upper) == pytest.approx((low, high))
    np.testing.assert_array_equal(case.distribution.density(outside), 0.0)
    np.testing.assert_array_equal(
        case.distribution.cdf(np.array([low - 1.0, high + 1.0])), [0.0, 1.0]
    )
    np.testing.assert_array_equal(
        case.distribution.survival(np.array([low - 1.0, high + 1.0])), [1.0, 0.0]
    )


@every_case
def test_mean_and_sd_are_the_integrals(case: Case) -> None:
    mean, sd = case.moments

    assert case.distribution.mean == pytest.approx(mean, abs=2e-8 * sd)
    assert case.distribution.sd == pytest.approx(sd, rel=2e-8)


@every_case
@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_draws_follow_the_distribution(case: Case, sampling: str) -> None:
    (draws,) = draw_inputs([case.distribution], None, DRAWS, 20_260_630, sampling)
    mean, sd = case.distribution.mean, case.distribution.sd
    fourth = float(np.mean(((case.quantile((np.arange(9999) + 0.5) / 9999) - mean) / sd) ** 4))

    assert draws.mean() == pytest.approx(mean, abs=ERRORS * sd / math.sqrt(DRAWS))
    assert draws.std() == pytest.approx(sd, rel=ERRORS * math.sqrt((fourth - 1) / (4 * DRAWS)))
    p = np.array([0.01, 0.05, 0.1, 0.5, 0.9, 0.95, 0.99])
    quantiles = case.quantile(p)
    errors = np.sqrt(p * (1 - p) / DRAWS) / case.density(quantiles)
    assert np.all(np.abs(np.quantile(draws, p) - quantiles) <= ERRORS * errors)
    assert stats.kstest(case.cdf(draws), "uniform").pvalue > 1e-4


@every_case
def test_score_and_probability_lead_to_the_same_value(case: Case) -> None:
    z = np.linspace(-7.5, 7.5, 61)

    by_score = case.distribution.at_score(z)
    by_probability = case.distribution.inverse(stats.norm.cdf(z), stats.norm.sf(z))

    np.testing.assert_allclose(
        by_score, by_probability, rtol=1e-10, atol=1e-10 * case.distribution.sd
    )


@every_case
def test_argument_is_left_alone(case: Case) -> None:
    u = np.linspace(0.01, 0.99, 99)
    kept = u.copy()

    for method in ("quantile", "at_score", "cdf", "survival", "density"):
        getattr(case.distribution, method)(u)

    np.testing.assert_array_equal(u, kept)


DISCRETE = {
    "discrete": (
        build_distribution("discrete", {"values": (5.0, 0.0, 1.0), "weights": (0.5, 0.2, 0.3)}),
        {0.0: 0.2, 1.0: 0.3, 5.0: 0.5},
    ),
    "discrete with a value twice and one without weight": (
        build_distribution(
            "discrete", {"values": (1.0, 2.0, 1.0, 3.0), "weights": (0.3, 0.3, 0.4, 0.0)}
        ),
        {1.0: 0.7, 2.0: 0.3},
    ),
    "discrete with a floor": (
        build_distribution(
            "discrete", {"values": (5.0, 0.0, 1.0), "weights": (0.5, 0.2, 0.3)}, floor=1.0
        ),
        {1.0: 0.375, 5.0: 0.625},
    ),
    "discrete with a cap": (
        build_distribution(
            "discrete", {"values": (5.0, 0.0, 1.0), "weights": (0.5, 0.2, 0.3)}, cap=4.0
        ),
        {0.0: 0.4, 1.0: 0.6},
    ),
    "bernoulli": (build_distribution("bernoulli", {"probability": 0.35}), {0.0: 0.65, 1.0: 0.35}),
    "bernoulli that is certain": (build_distribution("bernoulli", {"probability": 1}), {1.0: 1.0}),
}


@pytest.mark.parametrize(("distribution", "expected"), DISCRETE.values(), ids=list(DISCRETE))
@pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
def test_discrete_draws_have_their_probabilities(
    distribution: Distribution, expected: dict[float, float], sampling: str
) -> None:
    (draws,) = draw_inputs([distribution], None, DRAWS, 0, sampling)
    values, counts = np.unique(draws, return_counts=True)

    assert values.tolist() == list(expected)
    weights = np.array(list(expected.values()))
    assert np.all(
        np.abs(counts - DRAWS * weights) <= ERRORS * np.sqrt(DRAWS * weights * (1 - weights))
    )
    mean = float(np.sum(values * weights))
    assert distribution.mean == pytest.approx(mean)
    assert distribution.sd == pytest.approx(math.sqrt(np.sum((values - mean) ** 2 * weights)))
    np.testing.assert_allclose(distribution.density(values), weights)
    np.testing.assert_allclose(distribution.cdf(values), np.cumsum(weights))
    np.testing.assert_allclose(distribution.survival(values), 1 - np.cumsum(weights), atol=1e-15)
    assert (distribution.lower, distribution.upper) == (values[0], values[-1])
    assert distribution.discrete


def test_discrete_quantile_is_the_least_value_that_reaches_the_probability() -> None:
    values = build_distribution(
        "discrete", {"values": (0.0, 1.0, 5.0), "weights": (0.25, 0.25, 0.5)}
    )

    at = values.quantile(np.array([1e-12, 0.25, 0.25 + 1e-12, 0.5, 0.5 + 1e-12, 1 - 1e-12]))

    assert at.tolist() == [0.0, 0.0, 1.0, 1.0, 5.0, 5.0]
    assert values.density(np.array([-1.0, 0.5, 7.0])).tolist() == [0.0, 0.0, 0.0]
