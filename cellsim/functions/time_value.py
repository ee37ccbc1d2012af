"""The time value of money: level payments, their parts and their rate.

All follow pv G + pmt (1 + r due) (G - 1) / r + fv = 0 with G = (1 + r)^n (ECMA-376 Part 1, PV), and
pv + pmt n + fv = 0 at r = 0. G - 1 is taken from expm1, so that small rates lose no digits; principal and
interest are written so that they do not come from differences of nearly equal amounts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.functions.encoded import FloatArray, Numbers, checked
from cellsim.functions.root_finding_over_draws import (
    Brackets,
    enclose_over_draws,
    polish_over_draws,
)
from cellsim.values import ErrorValue, encode_error

_NUM, _DIV0 = ErrorValue.NUM, ErrorValue.DIV0
_SERIES = 1e-4
"""Below this, x times the number of periods, three terms of the series are exact."""
_NEGLIGIBLE = 1e-17
"""A Newton step is the last where its square, times the number of periods, is below this."""


def growth_less_one(rate: Numbers, periods: Numbers) -> FloatArray:
    """(1 + rate)^periods - 1; #NUM! or #DIV/0! where the power has no meaning."""
    base = 1 + np.asarray(rate)
    grown = np.expm1(periods * np.log1p(np.maximum(rate, -1)))
    if np.any(base <= 0):
        below = checked(
            np.power(base, periods) - 1,
            ((base == 0) & (np.asarray(periods) < 0), _DIV0),
            (np.asarray(periods) != np.trunc(periods), _NUM),
        )
        grown = np.where(base <= 0, below, grown)
    return np.asarray(grown)


def level_payment(
    rate: Numbers, periods: Numbers, present: Numbers, future: Numbers, due: Numbers
) -> FloatArray:
    """The level payment; `due` is 1 where payments come at the beginning of each period, else 0."""
    grown = growth_less_one(rate, periods)
    paid = -(present * (grown + 1) + future) * rate / ((1 + rate * due) * grown)
    paid = np.where(np.isnan(grown), grown, checked(paid))
    flat = np.asarray(rate) == 0
    paid = np.where(flat, -(present + future) / np.asarray(periods), paid)
    return np.where(np.asarray(periods) == 0, encode_error(_NUM), paid)


def annuity_present_value(
    rate: Numbers, periods: Numbers, paid: Numbers, future: Numbers, due: Numbers
) -> FloatArray:
    """The value today of level payments and a final amount."""
    grown = growth_less_one(rate, periods)
    payments = paid * (1 + rate * due) * grown / rate
    value = checked(-(future + payments) / (grown + 1), (grown == -1, _DIV0))
    value = np.where(np.isnan(grown), grown, value)
    return np.where(np.asarray(rate) == 0, checked(-(future + paid * periods)), value)


def annuity_future_value(
    rate: Numbers, periods: Numbers, paid: Numbers, present: Numbers, due: Numbers
) -> FloatArray:
    """The value at the end of level payments and a first amount."""
    grown = growth_less_one(rate, periods)
    value = checked(-(present * (grown + 1) + paid * (1 + rate * due) * grown / rate))
    value = np.where(np.isnan(grown), grown, value)
    return np.where(np.asarray(rate) == 0, checked(-(present + paid * periods)), value)


@dataclass(frozen=True, slots=True)
class Loan:
    """A loan or annuity with level payments.

    Attributes:
        rate: The rate per period.
        periods: The number of periods.
        present: The amount at the beginning.
        future: The amount left at the end.
        due: 1 where payments come at the beginning of each period, else 0.
    """

    rate: Numbers
    periods: Numbers
    present: Numbers
    future: Numbers
    due: Numbers

    def interest(self, period: Numbers) -> FloatArray:
        """The interest part of a payment, counted from 1; #NUM! where there is no such payment."""
        before = growth_less_one(self.rate, period - np.float64(1))
        left = growth_less_one(self.rate, self.periods - period + np.float64(1))
        part = self._factor() * (self.present * (before + 1) * left - self.future * before)
        part = np.where((np.asarray(self.due) != 0) & (np.asarray(period) == 1), 0.0, part)
        return self._at(period, np.where(np.asarray(self.rate) == 0, 0.0, part))

    def principal(self, period: Numbers) -> FloatArray:
        """The principal part of a payment."""
        before = growth_less_one(self.rate, period - np.float64(1))
        part = self._factor() * (self.present + self.future) * (before + 1)
        whole = level_payment(self.rate, self.periods, self.present, self.future, self.due)
        part = np.where((np.asarray(self.due) != 0) & (np.asarray(period) == 1), whole, part)
        flat = -(self.present + self.future) / np.asarray(self.periods)
        return self._at(period, np.where(np.asarray(self.rate) == 0, flat, part))

    def _factor(self) -> FloatArray:
        grown = growth_less_one(self.rate, self.periods)
        factor = checked(-self.rate / (grown * (1 + self.rate * self.due)))
        return np.where(np.isnan(grown), grown, factor)

    def _at(self, period: Numbers, part: FloatArray) -> FloatArray:
        period = np.asarray(period)
        return checked(part, ((period < 1) | (period >= self.periods + np.float64(1)), _NUM))


def periods_needed(
    rate: Numbers, paid: Numbers, present: Numbers, future: Numbers, due: Numbers
) -> FloatArray:
    """The number of periods of level payments; #NUM! where no number will do."""
    rate, paid = np.asarray(rate), np.asarray(paid)
    level = paid * (1 + rate * due) / rate
    quotient = (level - future) / (level + present)
    change = -(present + future) / (
        level + present
    )  # the quotient less 1, exact where that is small
    logarithm = np.where(np.abs(change) < 0.5, np.log1p(change), np.log(quotient))
    count = logarithm / np.log1p(rate)
    impossible = (rate <= -1) | (level + present == 0) | (quotient <= 0)
    count = checked(count, (impossible, _NUM))
    flat = checked(-(present + future) / paid, (paid == 0, _NUM))
    return np.where(rate == 0, flat, count)


def annuity_rates(
    periods: Numbers,
    paid: Numbers,
    present: Numbers,
    future: Numbers,
    due: Numbers,
    guess: Numbers,
) -> FloatArray:
    """The rate per period, of several the one nearest the guess.

    Returns:
        The rates; #NUM! where there is none between -1 + 1e-9 and 1e6.
    """
    shape = np.broadcast_shapes(
        *(np.shape(a) for a in (periods, paid, present, future, due, guess))
    )
    n, p, v, f, d, g = (
        np.broadcast_to(np.asarray(a, dtype=np.float64), shape).reshape(-1)
        for a in (periods, paid, present, future, due, guess)
    )
    rates = np.full(n.shape, encode_error(_NUM))
    good = (n > 0) & (g > -1) & np.isfinite(n + p + v + f)
    for start in np.unique(g[good]):
        chosen = np.flatnonzero(good & (g == start))
        equations = _Annuities(n, p, v, f, d).subset(chosen)
        low, high, rising = enclose_over_draws(equations, float(start))
        exact = low == high
        rates[chosen[exact]] = low[exact]
        inside = np.flatnonzero(np.isfinite(low) & ~exact)
        low, high = np.log1p(low[inside]), np.log1p(high[inside])
        small = np.sqrt(_NEGLIGIBLE / np.maximum(n[chosen[inside]], 1.0))
        brackets = Brackets(low, high, (low + high) / 2, rising[inside], small)
        polish_over_draws(equations.subset(inside), brackets)
        rates[chosen[inside]] = checked(np.expm1(brackets.point))
    return rates.reshape(shape)


class _Annuities:
    """Worth of loans or annuities as `Equations` in x = ln(1 + rate); at the end for x < 0.

    The worth today is that at the end times exp(-n x), with the same roots; each stays finite on its
    side.
    """

    def __init__(
        self,
        periods: FloatArray,
        paid: FloatArray,
        present: FloatArray,
        future: FloatArray,
        due: FloatArray,
    ) -> None:
        self._terms = (periods, paid, present, future, due)

    @property
    def draws(self) -> int:
        """The number of draws."""
        return len(self._terms[0])

    def subset(self, chosen: npt.NDArray[np.intp]) -> _Annuities:
        """Those of some draws."""
        return _Annuities(*(term[chosen] for term in self._terms))

    def values(self, rates: Sequence[float]) -> FloatArray:
        """Worth, true in sign, at the same rates in all draws, shape (rates, draws)."""
        return self.evaluate(np.log1p(np.array(rates))[:, None])[0]

    def evaluate(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Worth and its derivative at a point for each draw."""
        n, paid, present, future, due = self._terms
        payments, change = _annuity_factor(np.abs(x), n)
        fading = np.exp(-n * np.abs(x))
        growth = np.exp(np.abs(x))
        # n payments: at their periods' ends seen from the nearer side, a period apart at the other
        near = (due != 0) == (x >= 0)
        change = np.where(near, growth * (payments + change), change)
        payments = np.where(near, growth * payments, payments)
        today = present + paid * payments + future * fading
        at_end = present * fading + paid * payments + future
        slope = paid * change - n * fading * np.where(x < 0, present, future)
        return np.where(x < 0, at_end, today), np.where(x < 0, -slope, slope)


def _annuity_factor(x: FloatArray, n: FloatArray) -> tuple[FloatArray, FloatArray]:
    """(1 - exp(-n x)) / (exp(x) - 1) for x >= 0, and its derivative."""
    near = x * np.maximum(n, 1.0) < _SERIES
    first, second = n * (n + 1) / 2, n * (n + 1) * (2 * n + 1) / 6
    rate = np.expm1(np.where(near, 1.0, x))
    value = -np.expm1(-n * x) / rate
    slope = (n * np.exp(-n * x) - value * (1 + rate)) / rate
    value = np.where(near, n - x * (first - second / 2 * x), value)
    return value, np.where(near, second * x - first, slope)
