"""The hypergeometric distribution over draws or for one."""

from __future__ import annotations

import itertools

import numpy as np
import numpy.typing as npt

from cellsim.functions.encoded import FloatArray
from cellsim.functions.saddle_point import binomial_mass

_TERMS_AT_ONCE = (64, 1024)
"""Terms in a stretch: of the first stretches, and of those after them."""

_FIRST_STRETCHES = 20
_NEGLIGIBLE = 1e-18


def hypergeometric_mass(
    x: FloatArray, sample: FloatArray, marked: FloatArray, population: FloatArray
) -> FloatArray:
    """The probability of exactly x marked items in a sample drawn without replacement.

    Arguments are whole numbers, arrays that broadcast, with 0 <= sample, marked <= population.
    Outside of what can be drawn it is 0.

    Source: Loader (2000), as a quotient of binomial masses.
    """
    p, q = sample / population, (population - sample) / population
    rest = population - marked
    found = (
        binomial_mass(x, marked, p, q)
        * binomial_mass(sample - x, rest, p, q)
        / binomial_mass(sample, population, p, q)
    )
    found = np.where((sample == 0) | (population == 0), 1.0, found)
    possible = (x >= 0) & (x <= marked) & (x <= sample) & (sample - x <= rest)
    return np.where(possible, found, 0.0)


def hypergeometric_below(
    x: FloatArray, sample: FloatArray, marked: FloatArray, population: FloatArray
) -> FloatArray:
    """The probability of at most x marked items; arguments as for `hypergeometric_mass`.

    Terms are summed from x away from the mean, each from the one before, until the rest is
    negligible; above the mean it is 1 less those beyond x.
    """
    k, n, m, total = (
        part.astype(np.float64).ravel()
        for part in np.broadcast_arrays(x, sample, marked, population)
    )
    least, most = np.maximum(0.0, n - (total - m)), np.minimum(n, m)
    found = np.where(k < least, 0.0, 1.0)
    inside = np.flatnonzero((k >= least) & (k < most))
    upward = k[inside] * total[inside] > n[inside] * m[inside]
    # Counting the items that are not marked turns the upper tail into a lower one.
    first = np.where(upward, n[inside] - k[inside] - 1, k[inside])
    of = np.where(upward, total[inside] - m[inside], m[inside])
    tail = _lower_tail(first, n[inside], of, total[inside])
    found[inside] = np.where(upward, 1 - tail, tail)
    return found.reshape(
        np.broadcast_shapes(*(np.shape(p) for p in (x, sample, marked, population)))
    )


def _lower_tail(k: FloatArray, n: FloatArray, m: FloatArray, total: FloatArray) -> FloatArray:
    """The sum of the masses up to k, in a row of draws; each draw's terms stop by themselves."""
    term = hypergeometric_mass(k, n, m, total)
    result = term.copy()
    going: npt.NDArray[np.intp] = np.flatnonzero(term > 0)
    at = k.copy()
    for stretch in itertools.count():
        if not going.size:
            break
        length = _TERMS_AT_ONCE[stretch >= _FIRST_STRETCHES]
        steps = np.arange(length, dtype=np.float64)[:, None]
        j, drawn, marked = at[going] - steps, n[going], m[going]
        ratios = j * (total[going] - marked - drawn + j) / ((marked - j + 1) * (drawn - j + 1))
        # Below the least number that can be drawn the products stay zero.
        terms = term[going] * np.cumprod(ratios, axis=0)
        # Summed one after the other: then a draw's sum does not depend on how many are beside it.
        result[going] += np.cumsum(terms, axis=0)[-1]
        last, ratio = terms[-1], ratios[-1]
        term[going], at[going] = last, at[going] - length
        going = going[last > _NEGLIGIBLE * result[going] * (1 - ratio)]
    return result
