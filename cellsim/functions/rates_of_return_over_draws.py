"""Internal rates of return in all draws at once, by the method of `rates_of_return`."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from cellsim.functions.flows_over_draws import Flows, running_sums
from cellsim.functions.rates_of_return import (
    FARTHEST_START,
    HIGHEST_POINT,
    LOWEST_POINT,
    NEGLIGIBLE,
)
from cellsim.functions.root_finding import HIGHEST_RATE, LOWEST_RATE
from cellsim.functions.root_finding_over_draws import (
    Brackets,
    enclose_over_draws,
    polish_over_draws,
)
from cellsim.values import ErrorValue, encode_error

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.int64]
Places = npt.NDArray[np.intp]

_NUM = encode_error(ErrorValue.NUM)
_DRAWS_TOGETHER = 8192
"""So many draws make operations that are long beside the cost of starting them, on several threads too."""
_FIRST_TURNS = range(6)
"""Steps that settle most draws; the rest are gathered from all and taken together."""


def internal_rates(
    flows: FloatArray, guess: FloatArray | float, times: FloatArray | None = None
) -> FloatArray:
    """The internal rate of return in each draw.

    Args:
        flows: Shape (flows, draws).
        guess: A number or shape (draws,).
        times: Shape (flows, draws) or (flows, 1), in ascending order in each draw, from 0; 0, 1, 2,
            ... if None.

    Returns:
        Shape (draws,); #NUM! encoded where there is no root.
    """
    draws = flows.shape[1]
    guesses = np.broadcast_to(np.asarray(guess, dtype=np.float64), (draws,))
    search = _Search(flows, guesses, times)
    for begin in range(0, draws, _DRAWS_TOGETHER):
        search.begin(begin, min(begin + _DRAWS_TOGETHER, draws))
    search.enclose()
    search.polish()
    return search.rates


class _Search:
    """The search for the rates of all draws.

    Attributes:
        flows: Shape (flows, draws).
        times: Shape (flows, 1) or (flows, draws), or None.
        brackets: Where the roots lie.
        rates: The rates of draws that need no polishing, #NUM! elsewhere.
    """

    def __init__(self, flows: FloatArray, guesses: FloatArray, times: FloatArray | None) -> None:
        draws = flows.shape[1]
        self.flows = flows
        self.times = times
        self.guesses = guesses
        longest = len(flows) - 1.0 if times is None else times[-1]
        small = np.sqrt(NEGLIGIBLE / np.maximum(longest, 1.0))
        empty = np.full(draws, np.nan)
        self.brackets = Brackets(
            empty,
            empty.copy(),
            empty.copy(),
            np.zeros(draws, dtype=bool),
            np.broadcast_to(small, (draws,)),
        )
        self.rates = np.full(draws, _NUM)
        self._scratch = np.empty((2, len(flows), min(draws, _DRAWS_TOGETHER)))
        self.above = np.zeros(draws, dtype=np.int64)
        self.below = np.zeros(draws, dtype=np.int64)

    def begin(self, begin: int, end: int) -> None:
        """Count the roots of neighbouring draws, and take the first steps where there is one."""
        flows, sums = self._scratch[:, :, : end - begin]
        np.copyto(flows, self.flows[:, begin:end])
        running_sums(flows, sums)
        total = sums[-1]
        above, below = _root_counts(sums)
        known = ~np.isnan(total) & (self.guesses[begin:end] > -1)
        single = np.flatnonzero(known & (above + below == 1) & (total != 0))
        self.above[begin:end], self.below[begin:end] = known * above, known * below
        balanced = np.flatnonzero(known & (above + below == 0) & (total == 0))
        if len(balanced):
            worthless = (flows[:, balanced] != 0).any(axis=0)
            self.rates[begin + balanced] = np.where(worthless, 0.0, _NUM)
        if len(single):
            shared = self.times is None or self.times.shape[1] == 1
            times = self.times if shared or self.times is None else self.times[:, begin:end]
            self._take_first_steps(Flows(flows, times, at_end=False), total, single, begin)

    def _take_first_steps(
        self, flows: Flows, total: FloatArray, single: Places, begin: int
    ) -> None:
        is_above = self.above[begin + single] > 0
        start = _start(flows)
        brackets = self.brackets.subset(begin + single)
        brackets.low = np.where(is_above, 0.0, LOWEST_POINT)
        brackets.high = np.where(is_above, HIGHEST_POINT, 0.0)
        brackets.point = np.clip(start[single], brackets.low, brackets.high)
        brackets.rising = (total[single] < 0) == is_above
        equations = flows if len(single) == flows.draws else flows.subset(single)
        settled = polish_over_draws(equations, brackets, _FIRST_TURNS)
        self.brackets.rising[begin + single] = brackets.rising
        self.brackets.put(begin + single, brackets)
        self._finish(begin + single[settled])

    def _finish(self, draws: Places) -> None:
        """Turn settled points into rates; what settled at an end of the search is no root."""
        x = self.brackets.point[draws]
        inside = (x > LOWEST_POINT) & (x < HIGHEST_POINT)
        self.rates[draws] = np.where(inside, np.expm1(x), _NUM)
        self.brackets.low[draws] = np.nan

    def enclose(self) -> None:
        """Enclose the root nearest the guess in draws that may have several."""
        above, below = self.above > 0, self.below > 0
        several = (self.above + self.below > 1) & np.isnan(self.brackets.low)
        flows = Flows(self.flows, self.times, at_end=False)
        for floor, ceiling, among in (
            (0.0, HIGHEST_RATE, ~below),
            (LOWEST_RATE, 0.0, ~above),
            (LOWEST_RATE, HIGHEST_RATE, above & below),
        ):
            for guess in np.unique(self.guesses[several & among]):
                chosen = np.flatnonzero(several & among & (self.guesses == guess))
                low, high, rising = enclose_over_draws(
                    flows.subset(chosen), float(guess), floor, ceiling
                )
                exact = low == high
                self.rates[chosen[exact]] = low[exact]
                low[exact] = np.nan
                low, high = np.log1p(low), np.log1p(high)
                self.brackets.low[chosen], self.brackets.high[chosen] = low, high
                self.brackets.point[chosen] = (low + high) / 2
                self.brackets.rising[chosen] = rising

    def polish(self) -> None:
        """Settle all draws that are left."""
        for at_end in (False, True):
            left = ~np.isnan(self.brackets.low) & ((self.brackets.high <= 0) == at_end)
            chosen = np.flatnonzero(left)
            if len(chosen):
                flows = Flows(self.flows, self.times, at_end=at_end).subset(chosen)
                part = self.brackets.subset(chosen)
                settled = polish_over_draws(flows, part)
                self.brackets.put(chosen, part)
                self._finish(chosen[settled])


def _root_counts(sums: FloatArray) -> tuple[IntArray, IntArray]:
    """The most roots above and below a rate of 0 by the sign changes of partial sums of the flows."""
    total = sums[-1]
    above = _sign_changes(sums < 0, sums == 0)
    negative, zero = np.empty(sums.shape, dtype=bool), np.empty(sums.shape, dtype=bool)
    np.greater(sums[:-1], total, out=negative[1:])  # what is left after each flow
    np.equal(sums[:-1], total, out=zero[1:])
    np.less(total, 0, out=negative[0])
    np.equal(total, 0, out=zero[0])
    return above, _sign_changes(negative, zero)


def _sign_changes(negative: BoolArray, zero: BoolArray) -> IntArray:
    """How often signs change along the first axis, zeros passed over."""
    if zero.any():
        signs = np.where(zero, 0, np.where(negative, -1, 1)).astype(np.int8)
        for place in range(1, len(signs)):
            np.copyto(signs[place], signs[place - 1], where=zero[place])
        changed = signs[1:] * signs[:-1] < 0
    else:
        changed = negative[1:] != negative[:-1]
    narrow = np.uint8 if len(changed) < 256 else np.uint32
    count: IntArray = np.add.reduce(changed.view(np.uint8), axis=0, dtype=narrow).astype(np.int64)
    return count


def _start(flows: Flows) -> FloatArray:
    """The x at which inflows and outflows balance if each came at its mean time."""
    gained, gain_time, lost, loss_time = flows.gains_and_losses()
    x = np.log(gained / lost) / (gain_time / gained - loss_time / lost)
    return np.clip(np.where(np.isfinite(x), x, 0.0), -FARTHEST_START, FARTHEST_START)
