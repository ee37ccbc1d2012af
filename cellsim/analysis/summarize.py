"""Everything that a report says about one sample, from one sort."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.analysis.histogram import Histogram, histogram
from cellsim.analysis.moments import Moments, moments
from cellsim.analysis.quantiles import Quantiles, quantile_table
from cellsim.analysis.shares import Exceedance, exceedance

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Summary:
    """One sample in figures.

    Attributes:
        draws: Number of draws, failed ones included.
        failed: Failed draws: values that are NaN or not finite; kept out of everything else.
        moments: Moments.
        quantiles: Quantiles at the probabilities asked for.
        exceedances: For each value asked for, how the draws lie about it.
        histogram: The histogram.
    """

    draws: int
    failed: int
    moments: Moments
    quantiles: Quantiles
    exceedances: tuple[Exceedance, ...]
    histogram: Histogram


def summarize(
    values: FloatArray,
    probabilities: Sequence[float] | FloatArray,
    *,
    about: Sequence[float] = (),
    confidence: float = 0.95,
) -> Summary | None:
    """Describe a sample.

    Args:
        values: Shape (draws,); NaN in failed draws.
        probabilities: Ascending, 0 to 1.
        about: Values about which the shares below and above are wanted; finite.
        confidence: Confidence level of all intervals.

    Returns:
        The summary, or None if no draw is finite.

    Raises:
        ValueError: A probability is not between 0 and 1, or they do not ascend, or a value asked
            about is not finite.
    """
    wanted = np.asarray(probabilities, dtype=np.float64)
    if not (np.all((wanted >= 0) & (wanted <= 1)) and np.all(np.diff(wanted) > 0)):
        raise ValueError("expected ascending probabilities from 0 to 1")
    if not all(math.isfinite(value) for value in about):
        raise ValueError("expected finite values to compare with")
    ordered = np.sort(values)
    finite = np.isfinite(ordered)
    if not finite.all():
        ordered = ordered[finite]
    if len(ordered) == 0:
        return None
    return Summary(
        draws=len(values),
        failed=len(values) - len(ordered),
        moments=moments(ordered),
        quantiles=quantile_table(ordered, wanted, confidence),
        exceedances=tuple(exceedance(ordered, value, confidence) for value in about),
        histogram=histogram(ordered),
    )
