"""Series of flows in all draws at once: their partial sums, and their worth as a function of a rate.

Rows are taken in groups, so that few operations on large arrays do the work; the order of operations in a
draw depends on the number of flows alone.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
Places = npt.NDArray[np.intp]


def _groups(count: int) -> tuple[int, int]:
    """How many rows make a group, and how many groups there are."""
    size = math.isqrt(count - 1) + 1 if count else 1
    return size, -(-count // size)


def running_sums(rows: FloatArray, sums: FloatArray) -> None:
    """Put the sums of the first rows, for each number of them, into an array of the same shape."""
    count = len(rows)
    size, _ = _groups(count)
    np.copyto(sums[::size], rows[::size])
    for place in range(1, size):
        here = sums[place::size]
        np.add(sums[place - 1 :: size][: len(here)], rows[place::size], out=here)
    for first in range(size, count, size):
        np.add(sums[first : first + size], sums[first - 1], out=sums[first : first + size])


def sum_of_rows(rows: FloatArray) -> FloatArray:
    """The sum of all rows, shape (draws,)."""
    size, _ = _groups(len(rows))
    partial = np.zeros((size, rows.shape[1]))
    for first in range(0, len(rows), size):
        group = rows[first : first + size]
        partial[: len(group)] += group
    total: FloatArray = partial[0].copy()
    for row in partial[1:]:
        total += row
    return total


class Flows:
    """Flows whose worth is sought to be nothing: `Equations` in x = ln(1 + rate).

    Attributes:
        flows: Shape (flows, draws).
        times: Shape (flows, 1) or (flows, draws); 0, 1, 2, ... if None.
        at_end: Whether their worth is taken at the last time and not today.
    """

    __slots__ = ("at_end", "flows", "times")

    def __init__(self, flows: FloatArray, times: FloatArray | None, *, at_end: bool) -> None:
        self.flows = flows
        self.times = times
        self.at_end = at_end

    @property
    def draws(self) -> int:
        """The number of draws."""
        return int(self.flows.shape[1])

    def subset(self, chosen: Places) -> Flows:
        """The flows of some draws."""
        times = self.times
        if times is not None and times.shape[1] > 1:
            times = times[:, chosen]
        return Flows(np.take(self.flows, chosen, axis=1), times, at_end=self.at_end)

    def gains_and_losses(self) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Inflows and the same times their times, then outflows likewise, without sign."""
        if self.times is not None:
            gains = np.maximum(self.flows, 0.0)
            losses = gains - self.flows
            parts = (gains, gains * self.times, losses, losses * self.times)
            gained, gain_time, lost, loss_time = (sum_of_rows(part) for part in parts)
            return gained, gain_time, lost, loss_time
        size, groups = _groups(len(self.flows))
        shape = (groups, self.draws)
        gain, gain_time, loss, loss_time = (np.zeros(shape) for _ in range(4))
        positive = np.empty(shape)
        for place in range(size - 1, -1, -1):
            terms = self.flows[place::size]
            here = slice(len(terms))
            np.maximum(terms, 0.0, out=positive[here])
            gain_time += gain  # so that each flow is counted as often as its place says
            gain[here] += positive[here]
            loss_time += loss
            loss[here] += np.subtract(positive[here], terms, out=positive[here])
        begin = np.arange(0.0, size * groups, size)[:, None]
        gain_time += begin * gain
        loss_time += begin * loss
        return (
            sum_of_rows(gain),
            sum_of_rows(gain_time),
            sum_of_rows(loss),
            sum_of_rows(loss_time),
        )

    def evaluate(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Worth and its derivative at a point for each draw."""
        if self.times is not None:
            exponents = self._exponents(self.times, at_end=self.at_end)
            parts = self.flows * np.exp(exponents * x)
            return sum_of_rows(parts), sum_of_rows(exponents * parts)
        if self.at_end:
            factor = np.exp(x)
            value, slope = polynomial(self.flows[::-1], factor)
            return value, factor * slope
        factor = np.exp(-x)
        value, slope = polynomial(self.flows, factor)
        return value, -factor * slope

    def values(self, rates: Sequence[float]) -> FloatArray:
        """Worth, true in sign, at the same rates in all draws, shape (rates, draws)."""
        points = np.log1p(np.array(rates))
        result = np.empty((len(rates), self.draws))
        for at_end in (False, True):
            chosen = (points < 0) == at_end
            if chosen.any():
                result[chosen] = self._worth_at(points[chosen][:, None], at_end=at_end)
        return result

    def _worth_at(self, points: FloatArray, *, at_end: bool) -> FloatArray:
        value = np.zeros((len(points), self.draws))
        if self.times is not None:
            exponents = self._exponents(self.times, at_end=at_end)
            for flow, exponent in zip(self.flows, exponents, strict=True):
                value += flow * np.exp(exponent * points)
            return value
        factor = np.exp(points if at_end else -points)
        for flow in self.flows if at_end else self.flows[::-1]:
            np.multiply(value, factor, out=value)
            np.add(value, flow, out=value)
        return value

    @staticmethod
    def _exponents(times: FloatArray, *, at_end: bool) -> FloatArray:
        return (times[-1] if at_end else 0.0) - times


def polynomial(coefficients: FloatArray, at: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Polynomials and their derivatives by Horner's rule, in two levels.

    Args:
        coefficients: From the constant term up, shape (terms, draws).
        at: Where, shape (draws,).
    """
    size, groups = _groups(len(coefficients))
    values = np.zeros((groups, len(at)))
    slopes = np.zeros((groups, len(at)))
    for place in range(size - 1, -1, -1):  # each group is a polynomial of its own
        terms = coefficients[place::size]
        value, slope = values[: len(terms)], slopes[: len(terms)]
        np.multiply(slope, at, out=slope)
        np.add(slope, value, out=slope)
        np.multiply(value, at, out=value)
        np.add(value, terms, out=value)
    before = np.ones_like(at)
    for _ in range(size - 1):
        before *= at
    power = before * at
    value, slope, by_power = values[-1], slopes[-1], np.zeros_like(at)
    for group in range(groups - 2, -1, -1):
        by_power = by_power * power + value
        value = value * power + values[group]
        slope = slope * power + slopes[group]
    return value, slope + size * before * by_power
