"""Shares of draws beyond a value, with Wilson's interval."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Share:
    """A share of draws.

    Attributes:
        hits: Draws counted.
        count: All draws.
        share: hits / count.
        lower: Lower end of the confidence interval.
        upper: Upper end.
    """

    hits: int
    count: int
    share: float
    lower: float
    upper: float


@dataclass(frozen=True, slots=True)
class Exceedance:
    """How the draws lie about one value.

    Attributes:
        value: The value.
        below: Share of draws strictly below it.
        equal: Draws equal to it.
        above: Share of draws strictly above it.
        mean_above: Mean of the draws strictly above it; None if there are none.
        mean_others: Mean of the draws at or below it; None if there are none.
    """

    value: float
    below: Share
    equal: int
    above: Share
    mean_above: float | None
    mean_others: float | None


def wilson_share(hits: int, count: int, confidence: float = 0.95) -> Share:
    """A share with the score interval of Wilson (1927).

    Args:
        hits: Draws counted, 0 to count.
        count: All draws, at least 1.
        confidence: Confidence level.

    Returns:
        The share.
    """
    z = NormalDist().inv_cdf((1 + confidence) / 2)
    share = hits / count
    weight = 1 + z * z / count
    centre = (share + z * z / (2 * count)) / weight
    half = z / weight * math.sqrt(share * (1 - share) / count + z * z / (4 * count * count))
    lower = 0.0 if hits == 0 else max(centre - half, 0.0)
    upper = 1.0 if hits == count else min(centre + half, 1.0)
    return Share(hits, count, share, lower, upper)


def exceedance(ordered: FloatArray, value: float, confidence: float = 0.95) -> Exceedance:
    """How a sample lies about a value.

    Args:
        ordered: Shape (n,), n at least 1, finite, ascending.
        value: The value.
        confidence: Confidence level of the intervals.

    Returns:
        The shares below and above, the number equal, and the means on both sides.
    """
    count = len(ordered)
    below = int(np.searchsorted(ordered, value, side="left"))
    up_to = int(np.searchsorted(ordered, value, side="right"))
    return Exceedance(
        value,
        wilson_share(below, count, confidence),
        up_to - below,
        wilson_share(count - up_to, count, confidence),
        _mean(ordered[up_to:]),
        _mean(ordered[:up_to]),
    )


def _mean(values: FloatArray) -> float | None:
    """The mean; divided before it is summed, so that numbers near the largest double do not overflow."""
    return float(np.sum(values / len(values))) if len(values) else None
