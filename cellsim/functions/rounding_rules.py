"""Rounding as a person does it on paper: on the decimal digits that a number shows.

2.15 is stored as 2.149999999999999911; spreadsheet programs round it to 2.2 (Microsoft Support, ROUND),
so the digits that count are the first 15 significant ones.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]

_MOST_DIGITS = 300
_POWERS = [10.0**k for k in range(23)]
_NEARLY = 4e-15
"""How far, relatively, a scaled number may lie below a tie that its 15 digits reach."""

_NEARLY_WHOLE = 5e-16
"""The same below a whole number that is to be cut off: stored values show 0.39999999999999947 cut to 0.3."""


def power_of_ten(digits: int) -> float:
    """10 to a power of 0 or more, exact as far as doubles are."""
    return _POWERS[digits] if digits < len(_POWERS) else float(f"1e{digits}")


def scaled(number: float, digits: int) -> float:
    """A number shifted by some decimal places."""
    return number * power_of_ten(digits) if digits >= 0 else number / power_of_ten(-digits)


def unscaled(number: float, digits: int) -> float:
    """A number shifted back."""
    return number / power_of_ten(digits) if digits >= 0 else number * power_of_ten(-digits)


def round_half_away(number: float, digits: int) -> float:
    """A number to some decimal places, ties away from zero."""
    if number == 0 or digits > _MOST_DIGITS:
        return number
    if digits < -_MOST_DIGITS:
        return 0.0
    shifted = scaled(abs(number), digits)
    if not shifted < 2.0**52:
        return number
    whole = math.floor(shifted)
    fraction = shifted - whole
    if fraction >= 0.5 or 0.5 - fraction <= shifted * _NEARLY:
        whole += 1
    return math.copysign(unscaled(float(whole), digits), number)


def round_half_away_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """`round_half_away` on arrays; digits already cut to whole numbers."""
    return _round_over_draws(number, digits, _half_away)


def round_up_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """`round_up` on arrays; digits already cut to whole numbers."""
    return _round_over_draws(number, digits, _up)


def round_down_over_draws(number: FloatArray, digits: FloatArray | float) -> FloatArray:
    """`round_down` on arrays; digits already cut to whole numbers."""
    return _round_over_draws(number, digits, _down)


def _half_away(shifted: FloatArray) -> FloatArray:
    whole = np.floor(shifted)
    fraction = shifted - whole
    return whole + ((fraction >= 0.5) | (0.5 - fraction <= shifted * _NEARLY))


def _up(shifted: FloatArray) -> FloatArray:
    whole = np.floor(shifted)
    return whole + (shifted - whole > shifted * _NEARLY)


def _down(shifted: FloatArray) -> FloatArray:
    whole = np.floor(shifted)
    return whole + (whole + 1 - shifted <= shifted * _NEARLY_WHOLE)


def _round_over_draws(
    number: FloatArray, digits: FloatArray | float, to_whole: Callable[[FloatArray], FloatArray]
) -> FloatArray:
    """Shift, make whole, shift back, by the same steps as for single numbers; NaN stays NaN."""
    numbers = np.asarray(number, dtype=np.float64)
    places = np.asarray(digits, dtype=np.float64)
    up = np.where(places >= 0, _power_array(np.maximum(places, 0)), 1.0)
    down = np.where(places < 0, _power_array(np.maximum(-places, 0)), 1.0)
    size = np.abs(numbers)
    shifted = np.where(places >= 0, size * up, size / down)
    whole = to_whole(shifted)
    back = np.where(places >= 0, whole / up, whole * down)
    result = np.where(shifted < 2.0**52, np.copysign(back, numbers), numbers)
    return np.where(
        (numbers == 0) | np.isnan(numbers) | np.isnan(places), numbers + places * 0, result
    )


def _power_array(places: FloatArray) -> FloatArray:
    if places.ndim == 0:
        return np.asarray(power_of_ten(int(places)) if np.isfinite(places) else 1.0)
    finite = np.where(np.isfinite(places), places, 0.0)
    unique, inverse = np.unique(finite, return_inverse=True)
    return np.array([power_of_ten(min(int(p), 308)) for p in unique])[inverse].reshape(places.shape)


def round_up(number: float, digits: int) -> float:
    """A number to some decimal places, away from zero."""
    if number == 0 or digits > _MOST_DIGITS:
        return number
    shifted = scaled(abs(number), digits)
    if not shifted < 2.0**52:
        return number
    whole = math.floor(shifted)
    if shifted - whole > shifted * _NEARLY:
        whole += 1
    return math.copysign(unscaled(float(whole), digits), number)


def round_down(number: float, digits: int) -> float:
    """A number to some decimal places, toward zero."""
    if number == 0 or digits > _MOST_DIGITS:
        return number
    shifted = scaled(abs(number), digits)
    if not shifted < 2.0**52:
        return number
    whole = math.floor(shifted)
    if whole + 1 - shifted <= shifted * _NEARLY_WHOLE:
        whole += 1
    return math.copysign(unscaled(float(whole), digits), number)


def nearly_whole(quotient: float) -> float:
    """A quotient, made whole where its 15 digits are."""
    nearest = float(round(quotient)) if abs(quotient) < 2.0**52 else quotient
    return nearest if abs(quotient - nearest) <= abs(quotient) * _NEARLY else quotient
