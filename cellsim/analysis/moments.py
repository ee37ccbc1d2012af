"""Moments of a sample and their standard errors."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Moments:
    """Location, spread and shape of a sample.

    Attributes:
        count: Number of values.
        mean: Arithmetic mean.
        sd: Sample standard deviation (divisor count - 1); None for a single value.
        mean_se: Standard error of the mean for independent values; None for a single value.
        sd_se: Standard error of the standard deviation for independent values, from the sample's
            own fourth moment; None below four values.
        skewness: Adjusted sample skewness (G1, as the worksheet function SKEW); None below three
            values or without spread.
        excess_kurtosis: Adjusted sample excess kurtosis (G2, as KURT); None below four values or
            without spread.
        minimum: Smallest value.
        maximum: Largest value.
    """

    count: int
    mean: float
    sd: float | None
    mean_se: float | None
    sd_se: float | None
    skewness: float | None
    excess_kurtosis: float | None
    minimum: float
    maximum: float


def moments(values: FloatArray) -> Moments:
    """Moments by the corrected two-pass algorithm (Chan, Golub and LeVeque 1983, eq. 1.7).

    Values are first divided by a power of two, which is exact, so that squares and fourth powers
    neither overflow nor vanish.

    Args:
        values: Shape (n,), n at least 1, all finite.

    Returns:
        The moments.

    Raises:
        ValueError: There are no values.
    """
    count = len(values)
    if count == 0:
        raise ValueError("moments of no values")
    low, high = float(values.min()), float(values.max())
    if low == high:
        zero = 0.0 if count > 1 else None
        return Moments(count, low, zero, zero, 0.0 if count > 3 else None, None, None, low, high)
    exponent = math.frexp(max(abs(low), abs(high)))[1]
    scaled = np.ldexp(values, -exponent)
    rough = float(scaled.mean())
    rough += float((scaled - rough).mean())
    mean = min(max(math.ldexp(rough, exponent), low), high)
    deviations = scaled - rough
    spread = float(np.abs(deviations).max())
    if spread == 0.0:
        return Moments(count, mean, 0.0, 0.0, None, None, None, low, high)
    deviations /= spread
    squares = deviations * deviations
    m2 = (float(squares.sum()) - float(deviations.sum()) ** 2 / count) / count
    m3 = float((squares * deviations).mean())
    m4 = float((squares * squares).mean())
    unit = math.ldexp(spread, exponent)
    sd = math.sqrt(m2 * count / (count - 1))
    return Moments(
        count=count,
        mean=mean,
        sd=sd * unit,
        mean_se=sd / math.sqrt(count) * unit,
        sd_se=_sd_error(count, sd, m4, unit),
        skewness=_skewness(count, m2, m3),
        excess_kurtosis=_excess_kurtosis(count, m2, m4),
        minimum=low,
        maximum=high,
    )


def _sd_error(count: int, sd: float, m4: float, unit: float) -> float | None:
    """From Var(s^2) = (mu4 - (n - 3) / (n - 1) sigma^4) / n and the delta method."""
    if count < 4:
        return None
    variance = (m4 - (count - 3) / (count - 1) * (sd * sd) ** 2) / count
    return math.sqrt(max(variance, 0.0)) / (2 * sd) * unit


def _skewness(count: int, m2: float, m3: float) -> float | None:
    """G1 of Joanes and Gill (1998)."""
    if count < 3:
        return None
    return m3 / (m2 * math.sqrt(m2)) * math.sqrt(count * (count - 1)) / (count - 2)


def _excess_kurtosis(count: int, m2: float, m4: float) -> float | None:
    """G2 of Joanes and Gill (1998)."""
    if count < 4:
        return None
    plain = m4 / (m2 * m2) - 3
    factor = (count - 1) / ((count - 2) * (count - 3))
    return factor * ((count + 1) * plain + 6)
