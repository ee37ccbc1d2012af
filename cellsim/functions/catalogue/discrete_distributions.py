"""Distributions of counts: binomial, negative binomial, Poisson, hypergeometric."""

from __future__ import annotations

import numpy as np
from scipy.special import betainc, betaincc, gammaincc

from cellsim.functions.encoded import Condition, FloatArray, Numbers, checked, numeric_function
from cellsim.functions.hypergeometric import hypergeometric_below, hypergeometric_mass
from cellsim.functions.registry import Logical, Number, Whole
from cellsim.functions.saddle_point import binomial_mass, poisson_mass
from cellsim.values import ErrorValue

_NUM = ErrorValue.NUM
_LARGEST_COUNT = 2.0**53
"""Beyond it whole numbers have gaps and cannot be counted."""

_TIE = 2e-14
"""A cumulative probability that reaches another but for rounding reaches it."""


def _float(number: Numbers) -> FloatArray:
    return np.asarray(number, dtype=np.float64)


def _truncated(number: Numbers) -> FloatArray:
    return np.trunc(_float(number))


def _is_set(flag: Numbers) -> Condition:
    return np.not_equal(flag, 0)


def _binomial_below(k: FloatArray, n: FloatArray, p: FloatArray) -> FloatArray:
    """The probability of at most k successes; 0 for negative k."""
    found = betaincc(k + 1, n - k, p)
    return np.where(k < 0, 0.0, np.where(k >= n, 1.0, found))


def _binomial_above(k: FloatArray, n: FloatArray, p: FloatArray) -> FloatArray:
    """The probability of more than k successes; 1 for negative k."""
    found = betainc(k + 1, n - k, p)
    return np.where(k < 0, 1.0, np.where(k >= n, 0.0, found))


@numeric_function("BINOM.DIST", "BINOMDIST")
def binomial(
    successes: Whole, trials: Whole, probability: Number, cumulative: Logical
) -> FloatArray:
    """The binomial distribution: cumulative, or the probability of so many successes."""
    k, n, p = _truncated(successes), _truncated(trials), _float(probability)
    found = np.where(_is_set(cumulative), _binomial_below(k, n, p), binomial_mass(k, n, p, 1 - p))
    return checked(found, ((k < 0) | (k > n) | (p < 0) | (p > 1) | (n > _LARGEST_COUNT), _NUM))


@numeric_function("BINOM.DIST.RANGE")
def binomial_between(
    trials: Whole, probability: Number, least: Whole, most: Whole | None = None
) -> FloatArray:
    """The probability of a number of successes, or of a number between two limits."""
    n, p, low = _truncated(trials), _float(probability), _truncated(least)
    high = low if most is None else _truncated(most)
    below, above = _binomial_below(low - 1, n, p), _binomial_above(high, n, p)
    # A difference of the tails on the side where they are small, so that they do not cancel.
    from_below = _binomial_below(high, n, p) - below
    from_above = _binomial_above(low - 1, n, p) - above
    across = 1 - below - above
    found = np.where(low > n * p, from_above, np.where(high < n * p, from_below, across))
    found = np.where(low == high, binomial_mass(low, n, p, 1 - p), found)
    outside = (low < 0) | (low > high) | (high > n) | (n > _LARGEST_COUNT)
    return checked(found, (outside | (p < 0) | (p > 1), _NUM))


@numeric_function("BINOM.INV", "CRITBINOM")
def binomial_quantile(trials: Whole, probability: Number, alpha: Number) -> FloatArray:
    """The least number of successes whose cumulative probability reaches a limit."""
    n, p, limit = np.broadcast_arrays(_truncated(trials), _float(probability), _float(alpha))
    outside = (n < 0) | (n > _LARGEST_COUNT) | (p < 0) | (p > 1) | (limit < 0) | (limit > 1)
    low, high = np.zeros(n.shape), np.where(outside | np.isnan(p * limit), 0.0, n)
    while np.any(low < high):
        middle = np.floor((low + high) / 2)
        reached = _reaches(middle, n, p, limit)
        low, high = np.where(reached, low, middle + 1), np.where(reached, middle, high)
        high = np.maximum(low, high)
    return checked(low, (outside | np.isnan(p * limit), _NUM))


def _reaches(k: FloatArray, n: FloatArray, p: FloatArray, limit: FloatArray) -> Condition:
    """Whether the cumulative probability of k reaches a limit, judged by the smaller tail."""
    by_below = _binomial_below(k, n, p) >= limit * (1 - _TIE)
    by_above = _binomial_above(k, n, p) <= (1 - limit) * (1 + _TIE)
    # An upper tail below the least positive number counts as zero, yet certainty comes with n only.
    certain = (k >= n) | (p == 0)
    return np.where(limit < 0.5, by_below, np.where(limit == 1, certain, by_above))


def _failures(
    failures: Numbers, successes: Numbers, probability: Numbers
) -> tuple[FloatArray, FloatArray, FloatArray, Condition]:
    f, s, p = _truncated(failures), _truncated(successes), _float(probability)
    # Without a chance of success there is no distribution: stored values show #NUM!.
    outside = (f < 0) | (s < 1) | (p <= 0) | (p > 1) | (f + s > _LARGEST_COUNT)
    return f, s, p, outside


@numeric_function("NEGBINOM.DIST")
def negative_binomial(
    failures: Whole, successes: Whole, probability: Number, cumulative: Logical
) -> FloatArray:
    """The number of failures before so many successes: cumulative, or the probability of it."""
    f, s, p, outside = _failures(failures, successes, probability)
    mass = s / (s + f) * binomial_mass(s, s + f, p, 1 - p)
    return checked(np.where(_is_set(cumulative), betainc(s, f + 1, p), mass), (outside, _NUM))


@numeric_function("NEGBINOMDIST")
def negative_binomial_mass(failures: Whole, successes: Whole, probability: Number) -> FloatArray:
    """The probability of a number of failures before so many successes."""
    f, s, p, outside = _failures(failures, successes, probability)
    return checked(s / (s + f) * binomial_mass(s, s + f, p, 1 - p), (outside, _NUM))


@numeric_function("POISSON.DIST", "POISSON")
def poisson(count: Whole, mean: Number, cumulative: Logical) -> FloatArray:
    """The Poisson distribution: cumulative, or the probability of a count."""
    k, m = _truncated(count), _float(mean)
    found = np.where(_is_set(cumulative), gammaincc(k + 1, m), poisson_mass(k, m))
    return checked(found, ((k < 0) | (m < 0), _NUM))


def _cannot_draw(
    x: FloatArray, sample: FloatArray, marked: FloatArray, population: FloatArray
) -> Condition:
    """Whether the numbers describe no sample.

    A count below the least that can be drawn is possible with probability 0, as stored values show.
    """
    negative = (x < 0) | (sample < 0) | (marked < 0)
    too_many = (sample > population) | (marked > population) | (population > _LARGEST_COUNT)
    return negative | too_many | (x > np.minimum(sample, marked))


@numeric_function("HYPGEOM.DIST")
def hypergeometric(
    successes: Whole, sample: Whole, marked: Whole, population: Whole, cumulative: Logical
) -> FloatArray:
    """Marked items in a sample without replacement: cumulative, or the probability of so many."""
    x, n, m, total = (_truncated(part) for part in (successes, sample, marked, population))
    outside = _cannot_draw(x, n, m, total)
    wanted = _is_set(cumulative) & ~outside
    summed = hypergeometric_below(np.where(wanted, x, -1.0), n, m, total)
    found = np.where(wanted, summed, hypergeometric_mass(x, n, m, total))
    return checked(found, (outside, _NUM))


@numeric_function("HYPGEOMDIST")
def hypergeometric_count(
    successes: Whole, sample: Whole, marked: Whole, population: Whole
) -> FloatArray:
    """The probability of so many marked items in a sample without replacement."""
    x, n, m, total = (_truncated(part) for part in (successes, sample, marked, population))
    return checked(hypergeometric_mass(x, n, m, total), (_cannot_draw(x, n, m, total), _NUM))
