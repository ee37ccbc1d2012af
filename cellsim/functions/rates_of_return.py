"""Internal rates of return: the same method for one draw and for many.

With x = ln(1 + rate), flows a at times t are worth f(x) = sum a exp(-t x) today. Where the flows
change sign once there is one root (Descartes' rule of signs): Newton's method finds it from the rate
at which inflows and outflows balance to first order. Elsewhere there may be several or none: the root
nearest the guess is enclosed by growing an interval around the guess, and polished by Newton's
method kept inside the interval. No sign change anywhere gives #NUM!.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from cellsim.values import ErrorValue, encode_error

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

_NUM = encode_error(ErrorValue.NUM)
_MOST_STEPS = 40
_MOST_POLISHING = 200
_SETTLED = 2e-12
"""A Newton step this small has squared error far below rounding."""
_LOWEST = -1 + 1e-9
_HIGHEST = 1e6
_FIRST_STEP = 0.005
_GROWTH = 1.25
_FARTHEST_START = 3.0
_FARTHEST_ROOT = 14.0
_CHUNK = 16_384


def search_rates(guess: float) -> tuple[list[float], list[float]]:
    """The rates at which roots are looked for, upward and downward from a guess, both beginning there."""
    up, down = [guess], [guess]
    step = _FIRST_STEP
    while up[-1] < _HIGHEST:
        up.append(min(up[-1] + step, _HIGHEST))
        step *= _GROWTH
    step = _FIRST_STEP
    while down[-1] > _LOWEST:
        reach = down[-1] - _LOWEST
        down.append(
            down[-1] - step
            if step < reach / 2
            else down[-1] - reach / 2
            if reach > 1e-9
            else _LOWEST
        )
        step *= _GROWTH
    return up, down


def internal_rate_of(
    flows: Sequence[float], guess: float, times: Sequence[float] | None = None
) -> float | ErrorValue:
    """The internal rate of return of one series of flows.

    Args:
        flows: The flows.
        guess: Where to look first, above -1.
        times: The time of each flow in periods of the rate; 0, 1, 2, ... if None.
    """
    if guess <= -1 or not any(flow > 0 for flow in flows) or not any(flow < 0 for flow in flows):
        return ErrorValue.NUM
    moments = [float(k) for k in range(len(flows))] if times is None else list(times)

    def evaluate(x: float) -> tuple[float, float]:
        value = slope = 0.0
        if times is None:
            v = math.exp(-x)
            for flow in reversed(flows):
                slope = slope * v + value
                value = value * v + flow
            return value, -v * slope
        for flow, time in zip(flows, moments, strict=True):
            part = flow * math.exp(-time * x)
            value += part
            slope -= time * part
        return value, slope

    if _sign_changes(flows, moments) == 1:
        x = _newton(evaluate, _start(flows, moments))
        if x is not None:
            return math.expm1(x)
    interval = _enclose(lambda rate: evaluate(math.log1p(rate))[0], guess)
    if interval is None:  # two roots between neighbouring rates, or none
        x = _newton(evaluate, math.log1p(guess))
        return ErrorValue.NUM if x is None or abs(x) >= _FARTHEST_ROOT else math.expm1(x)
    return math.expm1(_polish(evaluate, *(math.log1p(rate) for rate in interval)))


def _sign_changes(flows: Sequence[float], times: Sequence[float]) -> int:
    ordered = [
        flow for _, flow in sorted(zip(times, flows, strict=True), key=lambda pair: pair[0]) if flow
    ]
    return sum((a < 0) != (b < 0) for a, b in itertools.pairwise(ordered))


def _start(flows: Sequence[float], times: Sequence[float]) -> float:
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
    return max(-_FARTHEST_START, min(_FARTHEST_START, x))


def _newton(evaluate: Callable[[float], tuple[float, float]], x: float) -> float | None:
    for _ in range(_MOST_STEPS):
        try:
            value, slope = evaluate(x)
        except OverflowError:
            return None
        if not slope or not math.isfinite(value) or not math.isfinite(slope):
            return None
        step = value / slope
        x -= step
        if abs(step) <= _SETTLED:
            return x
    return None


def _enclose(value: Callable[[float], float], guess: float) -> tuple[float, float] | None:
    up, down = search_rates(guess)

    def safe(rate: float) -> float:
        try:
            return value(rate)
        except OverflowError:
            return math.nan

    here = safe(guess)
    if here == 0:
        return guess, guess
    above = below = here
    for place in range(1, max(len(up), len(down))):
        if place < len(up):
            new = safe(up[place])
            if new == 0 or (above < 0 < new) or (new < 0 < above):
                return up[place - 1], up[place]
            above = new
        if place < len(down):
            new = safe(down[place])
            if new == 0 or (below < 0 < new) or (new < 0 < below):
                return down[place], down[place - 1]
            below = new
    return None


def _polish(evaluate: Callable[[float], tuple[float, float]], low: float, high: float) -> float:
    if low == high:
        return low
    rising = evaluate(low)[0] < evaluate(high)[0]
    x = (low + high) / 2
    for _ in range(_MOST_POLISHING):
        value, slope = evaluate(x)
        if value == 0:
            return x
        if (value < 0) == rising:
            low = x
        else:
            high = x
        new = x - value / slope if slope else math.nan
        if not low < new < high:
            new = (low + high) / 2
        if abs(new - x) <= 1e-15 * max(1e-3, abs(x)) or new in (low, high):
            return new
        x = new
    return x


# Over draws.


def internal_rates(
    flows: FloatArray, guess: FloatArray | float, times: FloatArray | None = None
) -> FloatArray:
    """The internal rate of return in each draw.

    Args:
        flows: Shape (flows, draws).
        guess: A number or shape (draws,).
        times: Shape (flows, draws) or (flows, 1); 0, 1, 2, ... if None.

    Returns:
        Shape (draws,); #NUM! encoded where there is no root.
    """
    draws = flows.shape[1]
    guesses = np.broadcast_to(np.asarray(guess, dtype=np.float64), (draws,))
    moments = np.arange(float(len(flows)))[:, None] if times is None else times
    x = np.full(draws, np.nan)
    single = _single_change(flows, moments)
    if single.all():
        x = _newton_over_draws(flows, times, _start_over_draws(flows, moments))
    elif single.any():
        chosen = np.flatnonzero(single)
        part, part_times = flows[:, chosen], _columns(times, chosen)
        start = _start_over_draws(part, _columns(moments, chosen))
        x[chosen] = _newton_over_draws(part, part_times, start)
    rates = np.where(np.isfinite(x), np.expm1(x), _NUM)
    left = np.flatnonzero(~np.isfinite(x) & ~np.isnan(flows).any(axis=0) & (guesses > -1))
    both = (flows[:, left] > 0).any(axis=0) & (flows[:, left] < 0).any(axis=0)
    left = left[both]
    for start_rate in np.unique(guesses[left]):
        chosen = left[guesses[left] == start_rate]
        rates[chosen] = _enclosed_over_draws(
            flows[:, chosen], _columns(times, chosen), float(start_rate)
        )
    return rates


def _columns(times: FloatArray | None, chosen: npt.NDArray[np.intp]) -> FloatArray | None:
    if times is None or times.shape[1] == 1:
        return times
    return times[:, chosen]


def _single_change(flows: FloatArray, times: FloatArray) -> BoolArray:
    if len(times) > 1 and (np.diff(times, axis=0) < 0).any():
        return np.zeros(flows.shape[1], dtype=bool)  # flows out of order are enclosed instead
    negative = flows < 0
    if (flows == 0).any():
        changes = np.zeros(flows.shape[1], dtype=np.int32)
        last = np.zeros(flows.shape[1])
        for flow in flows:
            changes += flow * last < 0
            np.copyto(last, np.sign(flow), where=flow != 0)
        return np.asarray(changes == 1)
    return np.asarray((negative[1:] != negative[:-1]).sum(axis=0) == 1)


def _start_over_draws(flows: FloatArray, times: FloatArray | None) -> FloatArray:
    draws = flows.shape[1]
    gained, gain_time, total, total_time = (np.zeros(draws) for _ in range(4))
    positive, weighted = np.empty(draws), np.empty(draws)
    for place, flow in enumerate(flows):
        time = float(place) if times is None else times[place]
        np.maximum(flow, 0.0, out=positive)
        gained += positive
        total += flow
        gain_time += np.multiply(positive, time, out=weighted)
        total_time += np.multiply(flow, time, out=weighted)
    lost, loss_time = gained - total, gain_time - total_time
    x = np.log(gained / lost) / (gain_time / gained - loss_time / lost)
    return np.clip(np.where(np.isfinite(x), x, 0.0), -_FARTHEST_START, _FARTHEST_START)


def _evaluate(
    flows: FloatArray, times: FloatArray | None, x: FloatArray
) -> tuple[FloatArray, FloatArray]:
    if times is not None:
        parts = flows * np.exp(-times * x)
        return parts.sum(axis=0), -(times * parts).sum(axis=0)
    v = np.exp(-x)
    value = flows[-1].copy()
    slope = np.zeros_like(value)
    for flow in flows[-2::-1]:
        np.multiply(slope, v, out=slope)
        np.add(slope, value, out=slope)
        np.multiply(value, v, out=value)
        np.add(value, flow, out=value)
    return value, -v * slope


def _values(flows: FloatArray, times: FloatArray | None, rates: Sequence[float]) -> FloatArray:
    """Worth today at several rates, shape (rates, draws)."""
    x = np.log1p(np.array(rates))[:, None]
    if times is not None:
        return np.stack([(flows * np.exp(-times * point)).sum(axis=0) for point in x])
    v = np.exp(-x)
    value = np.broadcast_to(flows[-1], (len(rates), flows.shape[1])).copy()
    for flow in flows[-2::-1]:
        np.multiply(value, v, out=value)
        np.add(value, flow, out=value)
    return value


class _Unsettled:
    """The draws that a search still moves; their flows are packed together as they get fewer."""

    def __init__(
        self, flows: FloatArray, times: FloatArray | None, places: npt.NDArray[np.intp]
    ) -> None:
        self.places = places
        self.flows = (
            flows if len(places) == flows.shape[1] else np.ascontiguousarray(flows[:, places])
        )
        self.times = _columns(times, places)

    def keep(self, still: BoolArray) -> BoolArray | None:
        """Drop the draws that have settled; None if there are too few of them to be worth it."""
        if still.sum() * 4 > len(still) * 3 and still.any():
            return None
        self.places = self.places[still]
        self.flows = np.ascontiguousarray(self.flows[:, still])
        self.times = (
            self.times[:, still]
            if self.times is not None and self.times.shape[1] > 1
            else self.times
        )
        return still


def _newton_over_draws(
    flows: FloatArray, times: FloatArray | None, start: FloatArray
) -> FloatArray:
    """Newton's method; NaN in draws where it has not settled."""
    result = np.full(len(start), np.nan)
    left = _Unsettled(flows, times, np.arange(len(start)))
    x = start.copy()
    active = np.ones(len(x), dtype=bool)
    for _ in range(_MOST_STEPS):
        value, slope = _evaluate(left.flows, left.times, x)
        step = value / slope
        np.subtract(x, step, out=x, where=active)
        settled = active & (np.abs(step) <= _SETTLED)
        result[left.places[settled]] = x[settled]
        active &= ~settled & np.isfinite(x)
        if not active.any():
            break
        if left.keep(active) is not None:
            x = x[active]
            active = np.ones(len(x), dtype=bool)
    return result


def _enclosed_over_draws(flows: FloatArray, times: FloatArray | None, guess: float) -> FloatArray:
    """Roots nearest a guess, enclosed on the common grid of rates and polished."""
    draws = flows.shape[1]
    up, down = search_rates(guess)
    low, high = np.full(draws, np.nan), np.full(draws, np.nan)
    here = _values(flows, times, [guess])[0]
    low[here == 0] = high[here == 0] = guess
    left = np.flatnonzero(here != 0)
    place = 1
    while len(left) and place < max(len(up), len(down)):
        end = place + max(4, min(64, _CHUNK // len(left)))
        part, part_times = flows[:, left], _columns(times, left)
        first = np.full(len(left), np.iinfo(np.int64).max)
        for rates, upward in ((up, True), (down, False)):
            chunk = rates[place - 1 : end]
            if len(chunk) < 2:
                continue
            values = _values(part, part_times, chunk)
            crossed = (
                (values[1:] == 0)
                | ((values[:-1] < 0) & (values[1:] > 0))
                | ((values[:-1] > 0) & (values[1:] < 0))
            )
            steps = np.where(crossed.any(axis=0), crossed.argmax(axis=0), np.iinfo(np.int64).max)
            better = steps < first
            first = np.where(better, steps, first)
            found = np.flatnonzero(better)
            near, far = (np.array(chunk)[steps[found] + k] for k in (0, 1))
            low[left[found]] = near if upward else far
            high[left[found]] = far if upward else near
        left = left[~np.isfinite(low[left])]
        place = end
    return _finish_over_draws(flows, times, low, high, guess)


def _finish_over_draws(
    flows: FloatArray, times: FloatArray | None, low: FloatArray, high: FloatArray, guess: float
) -> FloatArray:
    """Polish what is enclosed; what is not gets Newton's method from the guess as its last chance."""
    rates = np.full(len(low), _NUM)
    enclosed = np.flatnonzero(np.isfinite(low))
    if len(enclosed):
        part, part_times = flows[:, enclosed], _columns(times, enclosed)
        x = _polish_over_draws(part, part_times, np.log1p(low[enclosed]), np.log1p(high[enclosed]))
        rates[enclosed] = np.expm1(x)
    left = np.flatnonzero(~np.isfinite(low))
    if len(left):
        start = np.full(len(left), math.log1p(guess))
        x = _newton_over_draws(flows[:, left], _columns(times, left), start)
        rates[left] = np.where(np.isfinite(x) & (np.abs(x) < _FARTHEST_ROOT), np.expm1(x), _NUM)
    return rates


def _polish_over_draws(
    flows: FloatArray, times: FloatArray | None, low: FloatArray, high: FloatArray
) -> FloatArray:
    result = (low + high) / 2
    rising = _evaluate(flows, times, low)[0] < _evaluate(flows, times, high)[0]
    left = _Unsettled(flows, times, np.flatnonzero(low != high))
    low, high, rising = low[left.places], high[left.places], rising[left.places]
    x = (low + high) / 2
    active = np.ones(len(x), dtype=bool)
    for _ in range(_MOST_POLISHING):
        value, slope = _evaluate(left.flows, left.times, x)
        is_low = (value < 0) == rising
        low, high = np.where(is_low, x, low), np.where(is_low, high, x)
        new = x - value / slope
        new = np.where((new > low) & (new < high), new, (low + high) / 2)
        new = np.where(value == 0, x, new)
        settled = (
            (np.abs(new - x) <= 1e-15 * np.maximum(1e-3, np.abs(x))) | (new == low) | (new == high)
        )
        settled = active & (settled | (value == 0))
        result[left.places[settled]] = new[settled]
        active &= ~settled
        x = new
        if not active.any():
            break
        if left.keep(active) is not None:
            x, low, high, rising = x[active], low[active], high[active], rising[active]
            active = np.ones(len(x), dtype=bool)
    return result
