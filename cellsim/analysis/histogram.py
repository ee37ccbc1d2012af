"""Histograms with round bin edges that long tails do not spoil."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.analysis.quantiles import quantiles_of_sorted

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

_STEPS = (10, 20, 25, 50, 100)
_FEWEST, _MOST = 12, 30
_LONG_TAIL = 1.5
_LARGEST_MULTIPLE = 1e12


@dataclass(frozen=True, slots=True, eq=False)
class Histogram:
    """Counts of a sample, by bin or by value.

    Attributes:
        lower: Shape (k,), lower edges, included; -inf for a bin that takes the tail below. For a
            sample of few separate values: the values.
        upper: Shape (k,), upper edges, not included except by the last; inf for the tail above. For
            separate values: the values.
        counts: Shape (k,).
        separate: Whether each bin is one value.
    """

    lower: FloatArray
    upper: FloatArray
    counts: IntArray
    separate: bool

    @property
    def highest_share(self) -> float:
        """Share of the sample in its fullest bin."""
        return float(self.counts.max() / self.counts.sum())

    def bin_of(self, value: float) -> int | None:
        """The bin that holds a value, counted from 0; None if none does."""
        if self.separate:
            hits = np.flatnonzero(self.lower == value)
            return int(hits[0]) if len(hits) else None
        place = int(np.searchsorted(self.lower, value, side="right")) - 1
        if place < 0 or value > self.upper[-1]:
            return None
        return place


def histogram(ordered: FloatArray, *, most_separate: int = 12) -> Histogram:
    """A histogram of a sorted sample.

    At most `most_separate` different values are counted one by one. Otherwise bins are about as wide
    as the rule of Freedman and Diaconis (1981) says, rounded to 1, 2, 2.5 or 5 times a power of ten,
    with edges at multiples of the width. Where the sample reaches far beyond its 0.5 % or 99.5 %
    quantile, what lies beyond is counted in one open bin.

    Args:
        ordered: Shape (n,), n at least 1, finite, ascending.
        most_separate: How many different values still count as separate.

    Returns:
        The histogram; its counts add up to n.
    """
    starts = np.flatnonzero(np.concatenate(([True], ordered[1:] != ordered[:-1])))
    if len(starts) <= most_separate:
        values = ordered[starts]
        counts = np.diff(np.append(starts, len(ordered)))
        return Histogram(values, values, counts.astype(np.int64), separate=True)
    edges = _edges(ordered)
    cuts = np.searchsorted(ordered, edges, side="left")
    if edges[-1] >= ordered[-1]:
        cuts[-1] = len(ordered)
    counts = np.diff(cuts)
    lower, upper = edges[:-1], edges[1:]
    if cuts[0] > 0:
        lower, upper = np.append(-np.inf, lower), np.append(edges[0], upper)
        counts = np.append(cuts[0], counts)
    if cuts[-1] < len(ordered):
        lower, upper = np.append(lower, edges[-1]), np.append(upper, np.inf)
        counts = np.append(counts, len(ordered) - cuts[-1])
    return Histogram(lower, upper, counts.astype(np.int64), separate=False)


def _edges(ordered: FloatArray) -> FloatArray:
    """Round edges over the body of the sample."""
    q = quantiles_of_sorted(ordered, np.array([0.005, 0.25, 0.75, 0.995]))
    low, high = float(ordered[0]), float(ordered[-1])
    body = float(q[3] - q[0])
    if body > 0:
        low = float(q[0]) if q[0] - low > _LONG_TAIL * body / 4 else low
        high = float(q[3]) if high - q[3] > _LONG_TAIL * body / 4 else high
    span = high / 2 - low / 2  # halved: the range of values near the largest double overflows
    wanted = float(q[2] - q[1]) * len(ordered) ** (-1 / 3)
    wanted = min(max(wanted, span / _MOST), span / _FEWEST) * 2
    step, power = round_width(wanted)
    width = step * 10.0**power
    first, last = low / width, high / width
    if not (
        width > 0
        and math.isfinite(first)
        and math.isfinite(last)
        and max(-first, last) < _LARGEST_MULTIPLE
    ):
        return np.unique(np.linspace(low, high, _FEWEST + 1, dtype=np.float64))
    multiples = np.arange(math.floor(first), math.ceil(last) + 1, dtype=np.float64) * step
    if power >= 0:
        return multiples * 10.0**power
    edges: FloatArray = multiples / 10.0**-power
    return edges


def round_width(wanted: float) -> tuple[int, int]:
    """The smallest of 1, 2, 2.5 and 5 times a power of ten that is at least `wanted`.

    Args:
        wanted: Positive and finite.

    Returns:
        The rounded width as a whole number and the power of ten that it is multiplied with.
    """
    power = math.floor(math.log10(wanted)) - 1
    digits = wanted / 10.0 ** max(power, -300) / 10.0 ** min(power + 300, 0)
    return next((step for step in _STEPS if step >= digits * (1 - 1e-12)), _STEPS[-1]), power
