"""Mean and standard deviation by quadrature over the quantile function."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from cellsim.uncertainty.distributions.distribution import FloatArray

_STEP = 1.0 / 32.0
_REACH = 6.0  # probabilities down to 1e-275


def _rule() -> tuple[FloatArray, FloatArray, FloatArray]:
    t = np.arange(-_REACH, _REACH + _STEP / 2, _STEP)
    s = math.pi * np.sinh(t)
    p = 1.0 / (1.0 + np.exp(-s))
    q = 1.0 / (1.0 + np.exp(s))
    weights = _STEP * math.pi * np.cosh(t) * p * q
    return p, q, weights / weights.sum()


_P, _Q, _WEIGHTS = _rule()


def moments_of(
    inverse: Callable[[FloatArray, FloatArray], FloatArray],
) -> tuple[float, float]:
    """Mean and standard deviation of a distribution whose density is smooth inside its bounds.

    The double exponential rule (Takahasi and Mori 1974) over probabilities from 1e-275 to
    1 - 1e-275, which takes singular ends in its stride.

    Args:
        inverse: The value with probability `p` below it and `q = 1 - p` above it.
    """
    with np.errstate(over="ignore"):
        values = inverse(_P, _Q)
    reached = np.isfinite(values)  # a probability below the least number has its value at infinity
    weights = _WEIGHTS[reached] / _WEIGHTS[reached].sum()
    middle = float(values[len(values) // 2])
    from_middle = values[reached] - middle
    unit = float(np.abs(from_middle).max()) or 1.0
    from_middle /= unit  # so that no square overflows
    shift = math.fsum(weights * from_middle)
    variance = math.fsum(weights * (from_middle - shift) ** 2)
    return middle + unit * shift, unit * math.sqrt(variance)


def combine_moments(pieces: Sequence[tuple[float, float, float]]) -> tuple[float, float]:
    """Mean and standard deviation of a mixture.

    Args:
        pieces: Mass (in any unit), mean and standard deviation of each part.
    """
    total = math.fsum(mass for mass, _, _ in pieces)
    mean = math.fsum(mass / total * part for mass, part, _ in pieces)
    variance = math.fsum(mass / total * (sd**2 + (part - mean) ** 2) for mass, part, sd in pieces)
    return mean, math.sqrt(variance)
