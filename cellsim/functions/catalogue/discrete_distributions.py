"""Distributions of counts: binomial, negative binomial, Poisson, hypergeometric, and any given one."""

from __future__ import annotations

import numpy as np
from scipy.special import betainc, betaincc, gammaincc, ndtri

from cellsim.functions.encoded import (
    Condition,
    FloatArray,
    Numbers,
    apart,
    checked,
    chosen,
    numeric_function,
    single,
)
from cellsim.functions.hypergeometric import hypergeometric_below, hypergeometric_mass
from cellsim.functions.least_squares import paired_numbers
from cellsim.functions.registry import (
    ArrayValues,
    Logical,
    Number,
    Stack,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.functions.saddle_point import binomial_mass, poisson_mass
from cellsim.values import ErrorValue

_NUM = ErrorValue.NUM
_LARGEST_COUNT = 2.0**53
"""Beyond it whole numbers have gaps and cannot be counted."""

_TIE = 2e-14
"""A cumulative probability that reaches another but for rounding reaches it; relative."""

_HALF_DIGIT = 2.0**-53
"""By so much a limit near 1 may have been rounded."""


def _float(number: Numbers) -> FloatArray:
    return np.asarray(number, dtype=np.float64)


def _truncated(number: Numbers) -> FloatArray:
    return np.trunc(_float(number))


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
    successes: Whole, attempts: Whole, probability: Number, cumulative: Logical
) -> FloatArray:
    """The binomial distribution: cumulative, or the probability of so many successes."""
    k, n, p = _truncated(successes), _truncated(attempts), _float(probability)
    found = chosen(
        cumulative, lambda: _binomial_below(k, n, p), lambda: binomial_mass(k, n, p, 1 - p)
    )
    return checked(found, ((k < 0) | (k > n) | (p < 0) | (p > 1) | (n > _LARGEST_COUNT), _NUM))


@numeric_function("BINOM.DIST.RANGE")
def binomial_between(
    attempts: Whole, probability: Number, least: Whole, most: Whole | None = None
) -> FloatArray:
    """The probability of a number of successes, or of a number between two limits."""
    n, p, low = _truncated(attempts), _float(probability), _truncated(least)
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
def binomial_quantile(attempts: Whole, probability: Number, alpha: Number) -> FloatArray:
    """The least number of successes whose cumulative probability reaches a limit."""
    n, p, limit = np.broadcast_arrays(_truncated(attempts), _float(probability), _float(alpha))
    outside = (n < 0) | (n > _LARGEST_COUNT) | (p < 0) | (p > 1) | (limit < 0) | (limit > 1)
    outside = outside | np.isnan(n) | np.isnan(p) | np.isnan(limit)
    most = np.where(outside, 0.0, n)
    low, high = _near_quantile(most, p, limit)
    high = np.where(_reaches(high, n, p, limit), high, most)
    low = np.where(_reaches(low - 1, n, p, limit), 0.0, np.minimum(low, high))
    while np.any(low < high):
        middle = np.floor((low + high) / 2)
        reached = _reaches(middle, n, p, limit)
        # Where the two have met, the middle is the answer, which its own test must not move.
        low, high = (
            np.where(reached | (low == high), low, middle + 1),
            np.where(reached, middle, high),
        )
    return checked(low, (outside, _NUM))


def _near_quantile(
    n: FloatArray, p: FloatArray, limit: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Two counts that mostly enclose the quantile, by the expansion of Cornish and Fisher."""
    z = ndtri(limit)
    guess = n * p + np.sqrt(n * p * (1 - p)) * z + (np.square(z) - 1) * (1 - 2 * p) / 6
    guess = np.where(np.isfinite(guess), np.floor(guess), 0.0)
    return np.clip(guess - 1, 0.0, n), np.clip(guess + 2, 0.0, n)


def _reaches(k: FloatArray, n: FloatArray, p: FloatArray, limit: FloatArray) -> Condition:
    """Whether the cumulative probability of k reaches a limit, judged by the smaller tail."""
    low = limit < 0.5
    tail = apart(low, betaincc, betainc, k + 1, n - k, p)
    by_below = tail >= limit * (1 - _TIE)
    by_above = tail <= (1 - limit) * (1 + _TIE) + _HALF_DIGIT
    # An upper tail below the least positive number counts as zero, yet certainty comes with n only.
    found = np.where(low, by_below, by_above & ((limit < 1) | (p == 0)))
    return np.asarray((k >= n) | ((k >= 0) & found) | ((k < 0) & (limit == 0)))


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
    found = chosen(
        cumulative,
        lambda: np.asarray(betainc(s, f + 1, p), dtype=np.float64),
        lambda: s / (s + f) * binomial_mass(s, s + f, p, 1 - p),
    )
    return checked(found, (outside, _NUM))


@numeric_function("NEGBINOMDIST")
def negative_binomial_mass(failures: Whole, successes: Whole, probability: Number) -> FloatArray:
    """The probability of a number of failures before so many successes."""
    f, s, p, outside = _failures(failures, successes, probability)
    return checked(s / (s + f) * binomial_mass(s, s + f, p, 1 - p), (outside, _NUM))


@numeric_function("POISSON.DIST", "POISSON")
def poisson(count: Whole, mean: Number, cumulative: Logical) -> FloatArray:
    """The Poisson distribution: cumulative, or the probability of a count."""
    k, m = _truncated(count), _float(mean)
    found = chosen(cumulative, lambda: gammaincc(k + 1, m), lambda: poisson_mass(k, m))
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
    # What is outside is not summed: it might never end.
    found = chosen(
        cumulative,
        lambda: hypergeometric_below(np.where(outside, -1.0, x), n, m, total),
        lambda: hypergeometric_mass(x, n, m, total),
    )
    return checked(found, (outside, _NUM))


@numeric_function("HYPGEOMDIST")
def hypergeometric_count(
    successes: Whole, sample: Whole, marked: Whole, population: Whole
) -> FloatArray:
    """The probability of so many marked items in a sample without replacement."""
    x, n, m, total = (_truncated(part) for part in (successes, sample, marked, population))
    return checked(hypergeometric_mass(x, n, m, total), (_cannot_draw(x, n, m, total), _NUM))


def _between(
    values: FloatArray, shares: FloatArray, low: Numbers, high: Numbers | None
) -> FloatArray:
    """PROB of items along the first axis; sums are taken one by one, so that draws stay apart."""
    if not len(values):
        return checked(0.0, (True, _NUM))
    wrong = ((shares <= 0) | (shares > 1)).any(axis=0)
    wrong = wrong | (np.abs(np.cumsum(shares, axis=0)[-1] - 1) > 1e-9)
    within = (values >= low) & (values <= (low if high is None else high))
    return checked(np.cumsum(np.where(within, shares, 0.0), axis=0)[-1], (wrong, _NUM))


@spreadsheet_function("PROB")
def probability_between(
    values: ArrayValues, probabilities: ArrayValues, low: Number, high: Number | None = None
) -> float | ErrorValue:
    """The probability that a value lies between two limits."""
    pairs = paired_numbers(values, probabilities)
    return single(_between)(*(np.array(numbers) for numbers in pairs), low, high)


@over_draws("PROB")
def probability_between_over_draws(
    values: Stack, probabilities: Stack, low: Numbers, high: Numbers | None = None
) -> FloatArray:
    """PROB over draws."""
    if len(values.data) != len(probabilities.data):
        return checked(0.0, (True, ErrorValue.NA))
    return _between(values.data, probabilities.data, low, high)
