"""The normal and the lognormal distribution."""

from __future__ import annotations

import math

import numpy as np
from scipy.special import erf, ndtr, ndtri

from cellsim.functions.encoded import checked, numeric_function
from cellsim.functions.registry import (
    FloatArray,
    Logical,
    Number,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import ErrorValue, encode_error

_DENSITY = 1 / math.sqrt(2 * math.pi)
_NUM = encode_error(ErrorValue.NUM)


def _density(z: float) -> float:
    return _DENSITY * math.exp(-z * z / 2)


@spreadsheet_function("NORM.S.DIST")
def standard_normal(z: Number, cumulative: Logical) -> float:
    """The standard normal distribution: cumulative, or its density."""
    return float(ndtr(z)) if cumulative else _density(z)


@spreadsheet_function("NORMSDIST")
def standard_normal_cumulative(z: Number) -> float:
    """The cumulative standard normal distribution."""
    return float(ndtr(z))


@spreadsheet_function("NORM.DIST", "NORMDIST")
def normal(x: Number, mean: Number, deviation: Number, cumulative: Logical) -> float | ErrorValue:
    """The normal distribution: cumulative, or its density."""
    if deviation <= 0:
        return ErrorValue.NUM
    z = (x - mean) / deviation
    return float(ndtr(z)) if cumulative else _density(z) / deviation


@spreadsheet_function("NORM.S.INV", "NORMSINV")
def standard_normal_quantile(probability: Number) -> float | ErrorValue:
    """The standard normal quantile."""
    return float(ndtri(probability)) if 0 < probability < 1 else ErrorValue.NUM


@spreadsheet_function("NORM.INV", "NORMINV")
def normal_quantile(probability: Number, mean: Number, deviation: Number) -> float | ErrorValue:
    """The normal quantile."""
    if not 0 < probability < 1 or deviation <= 0:
        return ErrorValue.NUM
    return mean + deviation * float(ndtri(probability))


@numeric_function("PHI")
def standard_density(z: Number) -> FloatArray:
    """The density of the standard normal distribution."""
    return checked(_DENSITY * np.exp(-np.square(z) / 2))


@numeric_function("GAUSS")
def above_the_median(z: Number) -> FloatArray:
    """The standard normal probability between the median and a value."""
    return checked(erf(np.asarray(z, dtype=np.float64) / math.sqrt(2)) / 2)


@numeric_function("STANDARDIZE")
def standard_score(number: Number, centre: Number, deviation: Number) -> FloatArray:
    """How many standard deviations a number lies from a mean."""
    spread = np.asarray(deviation, dtype=np.float64)
    return checked((number - np.asarray(centre)) / spread, (spread <= 0, ErrorValue.NUM))


@numeric_function("CONFIDENCE", "CONFIDENCE.NORM")
def confidence_half_width(alpha: Number, deviation: Number, size: Whole) -> FloatArray:
    """Half the width of a normal confidence interval of a mean."""
    level, spread, n = (
        np.asarray(alpha),
        np.asarray(deviation),
        np.trunc(np.asarray(size, dtype=np.float64)),
    )
    return checked(
        -ndtri(level / 2) * spread / np.sqrt(n),
        ((level <= 0) | (level >= 1) | (spread <= 0) | (n < 1), ErrorValue.NUM),
    )


@numeric_function("LOGNORM.DIST")
def lognormal(x: Number, mean: Number, deviation: Number, cumulative: Logical) -> FloatArray:
    """The lognormal distribution: cumulative, or its density."""
    at, spread = np.asarray(x, dtype=np.float64), np.asarray(deviation, dtype=np.float64)
    z = (np.log(at) - mean) / spread
    density = _DENSITY * np.exp(-np.square(z) / 2) / (spread * at)
    found = np.where(np.not_equal(cumulative, 0), ndtr(z), density)
    return checked(found, ((at <= 0) | (spread <= 0), ErrorValue.NUM))


@numeric_function("LOGNORMDIST")
def lognormal_cumulative(x: Number, mean: Number, deviation: Number) -> FloatArray:
    """The cumulative lognormal distribution."""
    at, spread = np.asarray(x, dtype=np.float64), np.asarray(deviation, dtype=np.float64)
    z = (np.log(at) - mean) / spread
    return checked(ndtr(z), ((at <= 0) | (spread <= 0), ErrorValue.NUM))


@numeric_function("LOGNORM.INV", "LOGINV")
def lognormal_quantile(probability: Number, mean: Number, deviation: Number) -> FloatArray:
    """The lognormal quantile."""
    p, spread = np.asarray(probability, dtype=np.float64), np.asarray(deviation)
    return checked(
        np.exp(mean + spread * ndtri(p)),
        ((p <= 0) | (p >= 1) | (spread <= 0), ErrorValue.NUM),
    )


@over_draws("NORMSDIST")
def standard_normal_cumulative_over_draws(z: FloatArray) -> FloatArray:
    """NORMSDIST over draws."""
    return np.asarray(ndtr(z))


@over_draws("NORM.S.DIST")
def standard_normal_over_draws(z: FloatArray, cumulative: FloatArray | float) -> FloatArray:
    """NORM.S.DIST over draws."""
    return np.where(np.asarray(cumulative) != 0, ndtr(z), _DENSITY * np.exp(-np.square(z) / 2))


@over_draws("NORM.DIST", "NORMDIST")
def normal_over_draws(
    x: FloatArray,
    mean: FloatArray | float,
    deviation: FloatArray | float,
    cumulative: FloatArray | float,
) -> FloatArray:
    """NORM.DIST over draws."""
    z = (x - mean) / np.asarray(deviation)
    density = _DENSITY * np.exp(-np.square(z) / 2) / deviation
    found = np.where(np.asarray(cumulative) != 0, ndtr(z), density)
    return checked(found, (np.asarray(deviation) <= 0, ErrorValue.NUM))


def _inside(probability: FloatArray | float) -> FloatArray:
    p = np.asarray(probability, dtype=np.float64)
    return np.where((p > 0) & (p < 1), ndtri(p), _NUM)


@over_draws("NORM.S.INV", "NORMSINV")
def standard_normal_quantile_over_draws(probability: FloatArray) -> FloatArray:
    """NORM.S.INV over draws."""
    return _inside(probability)


@over_draws("NORM.INV", "NORMINV")
def normal_quantile_over_draws(
    probability: FloatArray, mean: FloatArray | float, deviation: FloatArray | float
) -> FloatArray:
    """NORM.INV over draws."""
    found = mean + deviation * _inside(probability)
    return checked(found, (np.asarray(deviation) <= 0, ErrorValue.NUM))
