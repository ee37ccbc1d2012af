"""Internal rates of return of many draws at once."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from cellsim.functions.root_finding import bracket_outward, polish
from cellsim.values import ErrorValue, encode_error

FloatArray = npt.NDArray[np.float64]
_NUM = encode_error(ErrorValue.NUM)
_MOST_STEPS = 30
_SMALLEST_RATE = -1 + 1e-12
_LARGEST_RATE = 1e9


def internal_rates(
    flows: FloatArray, guess: FloatArray | float, years: FloatArray | None = None
) -> FloatArray:
    """The internal rate of return in each draw, the one nearest to the guess.

    Newton's method on all draws first. It is kept only where the flows change sign once, so that there
    is a single root above -1 (Descartes' rule of signs) and Newton's root must be it; all other draws
    are bracketed and polished one by one, exactly as for a single draw.

    Args:
        flows: Shape (flows, draws).
        guess: Where to begin, a number or shape (draws,).
        years: Years from the first flow, shape (flows, draws); whole periods if None.
    """
    draws = flows.shape[1]
    guesses = np.broadcast_to(np.asarray(guess, dtype=np.float64), (draws,))
    if years is None:
        rates = _newton_on_factor(flows, guesses)
        single = _single_sign_change(flows)
    else:
        rates = np.full(draws, np.nan)
        single = np.zeros(draws, dtype=bool)
    good = single & np.isfinite(rates) & (rates > _SMALLEST_RATE) & (guesses > -1)
    result = np.where(good, rates, _NUM)
    for draw in np.flatnonzero(~good):
        result[draw] = _one(flows[:, draw], float(guesses[draw]), None if years is None else years[:, draw])
    return result


def _single_sign_change(flows: FloatArray) -> npt.NDArray[np.bool_]:
    """Draws whose flows change sign exactly once, zeros passed over."""
    draws = flows.shape[1]
    last = np.zeros(draws)
    changes = np.zeros(draws, dtype=np.int32)
    for flow in flows:
        sign = np.sign(flow)
        changes += sign * last < 0
        last = np.where(sign != 0, sign, last)
    return np.asarray(changes == 1)


def _newton_on_factor(flows: FloatArray, guesses: FloatArray) -> FloatArray:
    """Newton's method on the discount factor with Horner's rule; NaN where it has not settled."""
    v = 1 / (1 + guesses)
    value, slope = np.empty_like(v), np.empty_like(v)
    settled = np.zeros(len(v), dtype=bool)
    for _ in range(_MOST_STEPS):
        value[:] = flows[-1]
        slope[:] = 0.0
        for flow in flows[-2::-1]:
            np.multiply(slope, v, out=slope)
            np.add(slope, value, out=slope)
            np.multiply(value, v, out=value)
            np.add(value, flow, out=value)
        step = value / slope
        settled |= np.abs(step) <= np.abs(v) * 4e-16
        np.copyto(v, np.where((v - step > 0) & (v - step < 10 * v), v - step, v / 2), where=~settled)
        if settled.all():
            break
        settled |= np.abs(step) <= np.abs(v) * 1e-13  # one more step has just been made
    rates: FloatArray = np.where(settled, 1 / v - 1, np.nan)
    return rates


def _one(flows: FloatArray, guess: float, years: FloatArray | None) -> float:
    amounts = [float(flow) for flow in flows]
    if any(math.isnan(flow) for flow in amounts):
        return math.nan
    if not (min(amounts) < 0 < max(amounts)) or guess <= -1:
        return _NUM
    times = [float(k) for k in range(len(amounts))] if years is None else [float(y) for y in years]
    if min(times) < 0:
        return _NUM

    def present(rate: float) -> float:
        return with_slope(rate)[0]

    def with_slope(rate: float) -> tuple[float, float]:
        value = slope = 0.0
        if years is None:
            factor = 1 / (1 + rate)
            for amount in reversed(amounts):
                slope = slope * factor + value
                value = value * factor + amount
            return value, -slope * factor * factor
        for amount, time in zip(amounts, times, strict=True):
            part = amount * math.pow(1 + rate, -time)
            value += part
            slope -= time * part / (1 + rate)
        return value, slope

    def safe(rate: float) -> float:
        try:
            return present(rate)
        except (OverflowError, ZeroDivisionError):
            return math.nan

    found = bracket_outward(safe, guess, _SMALLEST_RATE, _LARGEST_RATE)
    return _NUM if found is None else polish(with_slope, *found)
