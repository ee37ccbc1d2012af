"""Distribution functions against mpmath with 60 digits and against SciPy's tests of hypotheses."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any, cast

import mpmath as mp  # type: ignore[import-untyped]
import numpy as np
import pytest
from scipy import stats

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import Context, find_function
from cellsim.values import Array

CONTEXT = cast("Context", SimpleNamespace(date_1904=False, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001
LEAST = 1e-290  # below it numbers lose digits by themselves


def call(name: str, *arguments: Any) -> float:
    function = find_function(name)
    assert function is not None
    found = call_function(function, list(arguments), CONTEXT)
    assert type(found) is float, f"{name}{arguments}: {found}"
    return found


def column(numbers: Any) -> Array:
    return Array(len(numbers), 1, [float(number) for number in numbers])


def spread(seed: int, *ranges: tuple[float, float]) -> list[tuple[float, ...]]:
    """Forty points, their logarithms uniform within ranges."""
    rng = np.random.default_rng(seed)
    points = [np.exp(rng.uniform(np.log(low), np.log(high), 40)) for low, high in ranges]
    return [tuple(map(float, point)) for point in zip(*points, strict=True)]


def whole(points: list[tuple[float, ...]], *places: int) -> list[tuple[float, ...]]:
    return [tuple(np.ceil(x) if k in places else x for k, x in enumerate(p)) for p in points]


def beta_below(a: Any, b: Any, x: Any) -> Any:
    return mp.betainc(a, b, 0, x, regularized=True)


def gamma_below(a: Any, x: Any) -> Any:
    return mp.gammainc(a, 0, x, regularized=True)


def gamma_above(a: Any, x: Any) -> Any:
    return mp.gammainc(a, x, mp.inf, regularized=True)


def f_below(x: Any, m: Any, n: Any) -> Any:
    return beta_below(m / 2, n / 2, m * x / (m * x + n))


def f_above(x: Any, m: Any, n: Any) -> Any:
    return beta_below(n / 2, m / 2, n / (m * x + n))


def t_above(x: Any, n: Any) -> Any:
    return beta_below(n / 2, mp.mpf(1) / 2, n / (n + x * x)) / 2


def chi_above(x: Any, n: Any) -> Any:
    return gamma_above(n / 2, x / 2)


def f_density(x: Any, m: Any, n: Any) -> Any:
    scale = mp.sqrt((m * x) ** m * n**n / (m * x + n) ** (m + n))
    return scale / (x * mp.beta(m / 2, n / 2))


def t_density(x: Any, n: Any) -> Any:
    constant = mp.gamma((n + 1) / 2) / (mp.sqrt(n * mp.pi) * mp.gamma(n / 2))
    return constant * (1 + x * x / n) ** (-(n + 1) / 2)


def gamma_density(x: Any, a: Any, b: Any) -> Any:
    return mp.exp((a - 1) * mp.log(x / b) - x / b - mp.loggamma(a)) / b


def beta_density(x: Any, a: Any, b: Any) -> Any:
    return x ** (a - 1) * (1 - x) ** (b - 1) / mp.beta(a, b)


def choose(n: Any, k: Any) -> Any:
    return mp.binomial(n, k)


def binomial(k: Any, n: Any, p: Any) -> Any:
    return choose(n, k) * p**k * (1 - p) ** (n - k)


def failures(f: Any, s: Any, p: Any) -> Any:
    return choose(f + s - 1, f) * p**s * (1 - p) ** f


def poisson(k: Any, m: Any) -> Any:
    return mp.exp(k * mp.log(m) - m - mp.loggamma(k + 1))


def hypergeometric(x: Any, n: Any, m: Any, total: Any) -> Any:
    return choose(m, x) * choose(total - m, n - x) / choose(total, n)


def hypergeometric_sum(x: Any, n: Any, m: Any, total: Any) -> Any:
    least = max(0, int(n - (total - m)))
    return mp.fsum(hypergeometric(k, n, m, total) for k in range(least, int(x) + 1))


SHARES = spread(1, (1e-6, 0.9999), (0.05, 900), (0.05, 900))
BESIDE = [(float(a / (a + b)) * 0.93, a, b) for _, a, b in SHARES]
GAMMAS = spread(2, (1e-4, 600), (0.05, 300), (0.5, 2))
FREEDOM = whole(spread(3, (1e-3, 700), (1, 500)), 1)
RATIOS = whole(spread(4, (1e-3, 40), (1, 800), (1, 800)), 1, 2)
STUDENT = whole(spread(5, (1e-6, 200), (1, 2000)), 1)
ATTEMPTS = [
    (np.floor(n * share), n, p)
    for n, share, p in whole(spread(6, (1, 5e3), (1e-3, 1), (1e-5, 0.999)), 0)
]
FAILURES = whole(spread(7, (1, 900), (1, 400), (1e-3, 0.999)), 0, 1)
ARRIVALS = whole(spread(8, (1, 900), (1e-3, 700)), 0)
DRAWN = [
    (np.floor(min(m, n) * share), n, m, n + m + extra)
    for n, m, extra, share in whole(spread(9, (1, 300), (1, 300), (1, 900), (0.01, 1)), 0, 1, 2)
]

VALUES: list[tuple[str, list[tuple[float, ...]], tuple[Any, ...], Callable[..., Any]]] = [
    ("BETA.DIST", SHARES + BESIDE, (True,), lambda x, a, b: beta_below(a, b, x)),
    ("BETA.DIST", SHARES + BESIDE, (False,), beta_density),
    ("BETADIST", SHARES, (), lambda x, a, b: beta_below(a, b, x)),
    ("GAMMA.DIST", GAMMAS, (True,), lambda x, a, b: gamma_below(a, x / b)),
    ("GAMMA.DIST", GAMMAS, (False,), gamma_density),
    ("CHISQ.DIST", FREEDOM, (True,), lambda x, n: gamma_below(n / 2, x / 2)),
    ("CHISQ.DIST", FREEDOM, (False,), lambda x, n: gamma_density(x, n / 2, mp.mpf(2))),
    ("CHISQ.DIST.RT", FREEDOM, (), chi_above),
    ("F.DIST", RATIOS, (True,), f_below),
    ("F.DIST", RATIOS, (False,), f_density),
    ("F.DIST.RT", RATIOS, (), f_above),
    ("T.DIST", [(-x, n) for x, n in STUDENT], (True,), t_above),
    ("T.DIST", STUDENT, (False,), t_density),
    ("T.DIST.RT", STUDENT, (), t_above),
    ("TDIST", STUDENT, (2.0,), lambda x, n: 2 * t_above(x, n)),
    ("BINOM.DIST", ATTEMPTS, (False,), binomial),
    (
        "BINOM.DIST",
        ATTEMPTS,
        (True,),
        lambda k, n, p: 1 if k == n else beta_below(n - k, k + 1, 1 - p),
    ),
    ("NEGBINOM.DIST", FAILURES, (False,), failures),
    ("NEGBINOM.DIST", FAILURES, (True,), lambda f, s, p: beta_below(s, f + 1, p)),
    ("POISSON.DIST", ARRIVALS, (False,), poisson),
    ("POISSON.DIST", ARRIVALS, (True,), lambda k, m: gamma_above(k + 1, m)),
    ("HYPGEOM.DIST", DRAWN, (False,), hypergeometric),
    ("HYPGEOM.DIST", DRAWN, (True,), hypergeometric_sum),
    (
        "GAMMALN",
        [(x,) for (x,) in spread(10, (1e-3, 1e5)) + spread(11, (0.9, 2.2))],
        (),
        mp.loggamma,
    ),
    ("GAMMA", [(x - 6,) for (x,) in spread(12, (0.1, 170))], (), mp.gamma),
    ("EXPON.DIST", spread(13, (1e-6, 100), (1e-6, 5)), (True,), lambda x, r: -mp.expm1(-r * x)),
    (
        "WEIBULL.DIST",
        spread(14, (0.01, 3), (0.3, 4), (0.5, 2)),
        (True,),
        lambda x, a, b: -mp.expm1(-((x / b) ** a)),
    ),
    (
        "WEIBULL.DIST",
        spread(14, (0.01, 3), (0.3, 4), (0.5, 2)),
        (False,),
        lambda x, a, b: a / b * (x / b) ** (a - 1) * mp.exp(-((x / b) ** a)),
    ),
    ("GAUSS", spread(15, (1e-9, 8)), (), lambda z: mp.erf(z / mp.sqrt(2)) / 2),
]


@pytest.mark.parametrize(
    ("name", "points", "last", "exact"),
    VALUES,
    ids=[f"{name}-{last}" for name, _, last, _ in VALUES],
)
def test_values_agree_with_mpmath(
    name: str, points: list[tuple[float, ...]], last: tuple[Any, ...], exact: Callable[..., Any]
) -> None:
    compared = 0
    with mp.workdps(60):
        for point in points:
            wanted = exact(*(mp.mpf(x) for x in point))
            if abs(wanted) > LEAST:
                found = call(name, *point, *last)
                assert abs(found / wanted - 1) <= 1e-12, f"{name}{point}: {found!r}, {wanted}"
                compared += 1
    assert compared >= 20


TAILS = [p for (p,) in spread(20, (1e-200, 0.5))[:20] + spread(21, (1e-9, 1))[:20]]
HIGH = [1 - p / 2 for (p,) in spread(22, (1e-12, 1))[:20]]
SHAPES = spread(23, (0.2, 500), (0.2, 500))
WHOLE = whole(spread(24, (1, 600), (1, 600)), 0, 1)
ONE = mp.mpf(1)

QUANTILES: list[tuple[str, list[tuple[float, ...]], Callable[..., Any]]] = [
    ("BETA.INV", SHAPES, lambda x, a, b: beta_below(a, b, x)),
    ("GAMMA.INV", [(a, 1.0) for a, _ in SHAPES], lambda x, a, b: gamma_below(a, x / b)),
    ("CHISQ.INV", [(n,) for n, _ in WHOLE], lambda x, n: gamma_below(n / 2, x / 2)),
    ("CHISQ.INV.RT", [(n,) for n, _ in WHOLE], chi_above),
    ("F.INV", WHOLE, f_below),
    ("F.INV.RT", WHOLE, f_above),
    (
        "T.INV",
        [(n,) for n, _ in WHOLE],
        lambda x, n: t_above(-x, n) if x < 0 else 1 - t_above(x, n),
    ),
    ("T.INV.2T", [(n,) for n, _ in WHOLE], lambda x, n: 2 * t_above(x, n)),
]


@pytest.mark.parametrize(("name", "shapes", "exact"), QUANTILES, ids=[q[0] for q in QUANTILES])
def test_quantiles_have_the_probability_asked_for(
    name: str, shapes: list[tuple[float, ...]], exact: Callable[..., Any]
) -> None:
    """The quantile's relative error, as the error of the probability over the density."""
    compared = 0
    with mp.workdps(60):
        for p, shape in zip(TAILS + HIGH, shapes + shapes, strict=False):
            x = mp.mpf(call(name, p, *shape))
            if abs(x) < LEAST:
                continue
            step = abs(x) * mp.mpf(10) ** -20
            exactly = [mp.mpf(s) for s in shape]
            slope = (exact(x + step, *exactly) - exact(x - step, *exactly)) / (2 * step)
            error = abs((exact(x, *exactly) - mp.mpf(p)) / slope / x)
            assert error <= 1e-12, f"{name}({p}, {shape}): {float(x)}, off by {float(error)}"
            compared += 1
    assert compared >= 30


@pytest.mark.parametrize("attempts", [1, 7, 40, 1000])
@pytest.mark.parametrize("probability", [0.1, 0.5, 0.9, 1e-3])
def test_binomial_quantiles_stop_where_the_cumulative_probability_reaches_the_limit(
    attempts: int, probability: float
) -> None:
    """At the cumulative probability itself, rounded to a float, and just above it."""
    with mp.workdps(60):
        p = mp.mpf(probability)
        below = mp.mpf(0)
        for k in range(min(attempts, 40)):
            below += binomial(k, mp.mpf(attempts), p)
            limit = float(below)
            if limit > 1 - 1e-9 or binomial(k + 1, mp.mpf(attempts), p) < 1e-9:
                break
            found = call("BINOM.INV", float(attempts), probability, limit)
            assert found == k
            assert call("CRITBINOM", float(attempts), probability, limit * (1 + 1e-12)) == k + 1


def test_ranges_of_counts_do_not_cancel_far_from_the_mean() -> None:
    with mp.workdps(60):
        for low, high in ((400, 420), (0, 30), (150, 400), (200, 205), (470, 470)):
            wanted = mp.fsum(binomial(k, mp.mpf(1000), mp.mpf(0.2)) for k in range(low, high + 1))
            found = call("BINOM.DIST.RANGE", 1000.0, 0.2, float(low), float(high))
            assert abs(found / wanted - 1) <= 1e-12


def test_large_populations_are_summed_in_full() -> None:
    found = call("HYPGEOM.DIST", 2.5e5, 5e5, 5e5, 1e6, True)
    mass = call("HYPGEOM.DIST", 2.5e5, 5e5, 5e5, 1e6, False)
    assert found == pytest.approx(0.5 + mass / 2, rel=1e-12)  # the distribution is symmetric here


@pytest.mark.parametrize("seed", range(6))
def test_tests_of_hypotheses_agree_with_scipy(seed: int) -> None:
    rng = np.random.default_rng(seed)
    first = rng.normal(10, 2, 8)
    second, longer = rng.normal(11, 3, 8), rng.normal(9, 1, 13)
    a, b, c = column(first), column(second), column(longer)
    paired = stats.ttest_rel(first, second).pvalue
    pooled = stats.ttest_ind(first, longer).pvalue
    welch = stats.ttest_ind(first, longer, equal_var=False).pvalue
    assert call("T.TEST", a, b, 2.0, 1.0) == pytest.approx(paired, rel=1e-11)
    assert call("T.TEST", a, c, 2.0, 2.0) == pytest.approx(pooled, rel=1e-11)
    assert call("TTEST", a, c, 1.0, 3.0) == pytest.approx(welch / 2, rel=1e-11)
    ratio = np.var(first, ddof=1) / np.var(longer, ddof=1)
    both = 2 * min(stats.f.cdf(ratio, 7, 12), stats.f.sf(ratio, 7, 12))
    assert call("F.TEST", a, c) == pytest.approx(both, rel=1e-11)
    z = (first.mean() - 9.5) / (2.5 / np.sqrt(8))
    assert call("Z.TEST", a, 9.5, 2.5) == pytest.approx(stats.norm.sf(z), rel=1e-11)
    counts = rng.integers(5, 60, (3, 4)).astype(float)
    table = stats.chi2_contingency(counts, correction=False)
    observed = Array(3, 4, counts.ravel().tolist())
    expected = Array(3, 4, table.expected_freq.ravel().tolist())
    assert call("CHISQ.TEST", observed, expected) == pytest.approx(table.pvalue, rel=1e-11)
    row = stats.chisquare(counts[0], np.full(4, counts[0].mean())).pvalue
    even = Array(1, 4, [float(counts[0].mean())] * 4)
    assert call("CHITEST", Array(1, 4, counts[0].tolist()), even) == pytest.approx(row, rel=1e-11)
