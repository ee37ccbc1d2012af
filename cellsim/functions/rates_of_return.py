"""Internal rates of return of one series of flows.

With x = ln(1 + rate), flows a at times t are worth f(x) = sum a exp(-t x) today. By Laguerre's
extension of Descartes' rule of signs, f has no more roots above x = 0 than the partial sums of the flows
from the first on change sign, and no more below than the partial sums from the last back (Laguerre, "Sur
la theorie des equations numeriques", 1883; for rates above 0 also known as Norstrom's criterion, 1972).
Where both together leave one root, Newton's method finds it from the rate at which inflows and outflows
balance to first order. Elsewhere the root nearest the guess is enclosed by search rates on both sides of
the guess, between -1 + 1e-9 and 1e6; none there gives #NUM!.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence

from cellsim.functions.root_finding import HIGHEST_RATE, LOWEST_RATE, Evaluation, enclose, polish
from cellsim.values import ErrorValue

HIGHEST_POINT = math.log1p(HIGHEST_RATE)
LOWEST_POINT = math.log1p(LOWEST_RATE)
FARTHEST_START = 3.0
NEGLIGIBLE = 1e-17
"""A Newton step is the last where its square, times the longest time, is below this."""


def internal_rate_of(
    flows: Sequence[float], guess: float, times: Sequence[float] | None = None
) -> float | ErrorValue:
    """The internal rate of return of one series of flows.

    Args:
        flows: The flows.
        guess: Where to look first, above -1.
        times: The time of each flow in periods of the rate, none before the first; 0, 1, 2, ... if
            None.
    """
    if guess <= -1 or not any(flow > 0 for flow in flows) or not any(flow < 0 for flow in flows):
        return ErrorValue.NUM
    moments = [float(place) for place in range(len(flows))]
    if times is not None:
        order = sorted(range(len(times)), key=times.__getitem__)
        flows, moments = [flows[place] for place in order], [times[place] for place in order]
    above, below, total = _root_counts(flows)
    if above + below == 0:
        return ErrorValue.NUM if total else 0.0
    worth = _Worth(flows, moments, equal_periods=times is None)
    if above + below == 1 and total:
        low, high = (0.0, HIGHEST_POINT) if above else (LOWEST_POINT, 0.0)
        rising = (total < 0) == bool(above)
        start = min(max(_start(flows, moments), low), high)
    else:
        rates = enclose(
            worth.sign_at,
            guess,
            floor=LOWEST_RATE if below else 0.0,
            ceiling=HIGHEST_RATE if above else 0.0,
        )
        if rates is None or rates[0] == rates[1]:
            return ErrorValue.NUM if rates is None else rates[0]
        low, high = math.log1p(rates[0]), math.log1p(rates[1])
        rising = worth.sign_at(rates[0]) < 0
        start = (low + high) / 2
    x = polish(
        worth.function(at_end=high <= 0),
        low,
        high,
        start=start,
        rising=rising,
        negligible=math.sqrt(NEGLIGIBLE / max(moments[-1], 1.0)),
    )
    return math.expm1(x) if LOWEST_POINT < x < HIGHEST_POINT else ErrorValue.NUM


def _root_counts(flows: Sequence[float]) -> tuple[int, int, float]:
    """The most roots above and below a rate of 0, and the sum of the flows."""
    sums = list(itertools.accumulate(flows))
    total = sums[-1]
    above = _sign_changes(sums)
    below = _sign_changes([*(total - partial for partial in reversed(sums[:-1])), total])
    return above, below, total


def _sign_changes(values: Sequence[float]) -> int:
    signs = [value < 0 for value in values if value]
    return sum(a != b for a, b in itertools.pairwise(signs))


class _Worth:
    """The worth of flows as a function of x."""

    def __init__(
        self, flows: Sequence[float], times: Sequence[float], *, equal_periods: bool
    ) -> None:
        self._flows = flows
        self._times = times
        self._equal_periods = equal_periods

    def function(self, *, at_end: bool) -> Callable[[float], Evaluation]:
        """Value and derivative in x.

        Args:
            at_end: Whether the worth is taken at the last time and not today: it has the same roots
                and stays finite for rates far below 0.
        """
        if self._equal_periods:
            return self._at_last_period if at_end else self._today
        origin = self._times[-1] if at_end else 0.0
        terms = [(f, origin - t) for f, t in zip(self._flows, self._times, strict=True)]

        def at_times(x: float) -> Evaluation:
            value = slope = 0.0
            for flow, exponent in terms:
                part = flow * math.exp(exponent * x)
                value += part
                slope += exponent * part
            return value, slope

        return at_times

    def sign_at(self, rate: float) -> float:
        """A number with the sign of the worth at a rate."""
        return self.function(at_end=rate < 0)(math.log1p(rate))[0]

    def _today(self, x: float) -> Evaluation:
        discount = math.exp(-x)
        value = slope = 0.0
        for flow in reversed(self._flows):
            slope = slope * discount + value
            value = value * discount + flow
        return value, -discount * slope

    def _at_last_period(self, x: float) -> Evaluation:
        growth = math.exp(x)
        value = slope = 0.0
        for flow in self._flows:
            slope = slope * growth + value
            value = value * growth + flow
        return value, growth * slope


def _start(flows: Sequence[float], times: Sequence[float]) -> float:
    """The x at which inflows and outflows balance if each came at its mean time."""
    gained = lost = gain_time = loss_time = 0.0
    for flow, time in zip(flows, times, strict=True):
        if flow > 0:
            gained += flow
            gain_time += flow * time
        else:
            lost -= flow
            loss_time -= flow * time
    apart = gain_time / gained - loss_time / lost
    x = math.log(gained / lost) / apart if apart else 0.0
    return min(max(x, -FARTHEST_START), FARTHEST_START)
