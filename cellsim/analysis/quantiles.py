"""Quantiles of a sample with confidence intervals that assume no distribution."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.special import bdtr, bdtrik

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Quantiles:
    """Quantiles of one sample.

    Attributes:
        probabilities: Shape (k,), ascending, 0 to 1.
        values: Shape (k,), the quantiles.
        lower: Shape (k,), lower ends of the confidence intervals; NaN where the sample is too small
            to bound the quantile from below.
        upper: Shape (k,), upper ends; NaN likewise.
        confidence: Confidence level of the intervals.
    """

    probabilities: FloatArray
    values: FloatArray
    lower: FloatArray
    upper: FloatArray
    confidence: float


def quantiles_of_sorted(ordered: FloatArray, probabilities: FloatArray) -> FloatArray:
    """Linear interpolation between order statistics (Hyndman and Fan 1996, type 7).

    Args:
        ordered: Shape (n,), n at least 1, finite, ascending.
        probabilities: Shape (k,), 0 to 1.

    Returns:
        Shape (k,).
    """
    place = probabilities * (len(ordered) - 1)
    below = np.minimum(np.floor(place).astype(np.int64), len(ordered) - 1)
    above = np.minimum(below + 1, len(ordered) - 1)
    weight = place - below
    low, high = ordered[below], ordered[above]
    between: FloatArray = np.where(low == high, low, low * (1 - weight) + high * weight)
    return np.clip(between, low, high)


def binomial_quantile(probability: float, count: int, shares: FloatArray) -> IntArray:
    """The smallest k with P(B <= k) at least `probability`, B binomial.

    Args:
        probability: 0 to 1.
        count: Number of independent tries.
        shares: Shape (k,), chances of success, strictly between 0 and 1.

    Returns:
        Shape (k,).
    """
    found = np.ceil(bdtrik(probability, count, shares))
    found = np.clip(np.nan_to_num(found, nan=0.0), 0, count)
    for step in (-1.0, 1.0):  # the inverse may be one off at a jump
        if step < 0:
            lower = np.maximum(found - 1, 0)
            found = np.where(bdtr(lower, count, shares) >= probability, lower, found)
        else:
            found = np.where(
                bdtr(found, count, shares) < probability, np.minimum(found + 1, count), found
            )
    whole: IntArray = found.astype(np.int64)
    return whole


def interval_ranks(
    count: int, probabilities: FloatArray, confidence: float
) -> tuple[IntArray, IntArray]:
    """Ranks of the order statistics that enclose a quantile (Conover 1999, section 3.2).

    With B binomial(count, p), the interval from the r-th to the s-th order statistic covers the
    p-quantile with probability P(r <= B <= s - 1) or more, whatever the distribution.

    Args:
        count: Sample size.
        probabilities: Shape (k,), strictly between 0 and 1.
        confidence: Confidence level.

    Returns:
        r and s, counted from 1, shape (k,) each; r = 0 or s = count + 1 where no order statistic is
        far enough out.
    """
    tail = (1 - confidence) / 2
    low = binomial_quantile(tail, count, probabilities)
    high = binomial_quantile(1 - tail, count, probabilities) + 1
    return low, high


def quantile_table(
    ordered: FloatArray, probabilities: FloatArray, confidence: float = 0.95
) -> Quantiles:
    """Quantiles with confidence intervals.

    Args:
        ordered: Shape (n,), n at least 1, finite, ascending.
        probabilities: Shape (k,), ascending, 0 to 1; 0 and 1 give the extremes, without interval.
        confidence: Confidence level.

    Returns:
        The quantiles.
    """
    count = len(ordered)
    lower = np.full(len(probabilities), np.nan)
    upper = np.full(len(probabilities), np.nan)
    inner = (probabilities > 0) & (probabilities < 1)
    if inner.any():
        low, high = interval_ranks(count, probabilities[inner], confidence)
        lower[inner] = np.where(low >= 1, ordered[np.maximum(low, 1) - 1], np.nan)
        upper[inner] = np.where(high <= count, ordered[np.minimum(high, count) - 1], np.nan)
    values = np.maximum.accumulate(
        quantiles_of_sorted(ordered, probabilities)
    )  # rounding may not turn it
    return Quantiles(probabilities, values, lower, upper, confidence)
