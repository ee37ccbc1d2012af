"""The normal and the lognormal distribution."""

from __future__ import annotations

import math

import numpy as np
from scipy.special import ndtr, ndtri

from cellsim.functions.registry import FloatArray, Logical, Number, over_draws, spreadsheet_function
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


@spreadsheet_function("PHI")
def standard_density(z: Number) -> float:
    """The density of the standard normal distribution."""
    return _density(z)


@spreadsheet_function("GAUSS")
def above_the_median(z: Number) -> float:
    """The standard normal probability between the median and a value."""
    return float(ndtr(z)) - 0.5


@spreadsheet_function("CONFIDENCE", "CONFIDENCE.NORM")
def confidence_half_width(alpha: Number, deviation: Number, size: Number) -> float | ErrorValue:
    """Half the width of a normal confidence interval of a mean."""
    if not 0 < alpha < 1 or deviation <= 0 or int(size) < 1:
        return ErrorValue.NUM
    return -float(ndtri(alpha / 2)) * deviation / math.sqrt(int(size))


@spreadsheet_function("LOGNORM.DIST")
def lognormal(
    x: Number, mean: Number, deviation: Number, cumulative: Logical
) -> float | ErrorValue:
    """The lognormal distribution: cumulative, or its density."""
    if x <= 0 or deviation <= 0:
        return ErrorValue.NUM
    z = (math.log(x) - mean) / deviation
    return float(ndtr(z)) if cumulative else _density(z) / (deviation * x)


@spreadsheet_function("LOGNORMDIST")
def lognormal_cumulative(x: Number, mean: Number, deviation: Number) -> float | ErrorValue:
    """The cumulative lognormal distribution."""
    return lognormal(x, mean, deviation, True)


@spreadsheet_function("LOGNORM.INV", "LOGINV")
def lognormal_quantile(probability: Number, mean: Number, deviation: Number) -> float | ErrorValue:
    """The lognormal quantile."""
    if not 0 < probability < 1 or deviation <= 0:
        return ErrorValue.NUM
    return math.exp(mean + deviation * float(ndtri(probability)))


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
    return np.where(np.asarray(deviation) <= 0, _NUM, found)


def _inside(probability: FloatArray | float) -> FloatArray:
    p = np.asarray(probability, dtype=np.float64)
    return np.where((p > 0) & (p < 1), ndtri(np.clip(p, 1e-300, 1 - 1e-16)), _NUM)


@over_draws("NORM.S.INV", "NORMSINV")
def standard_normal_quantile_over_draws(probability: FloatArray) -> FloatArray:
    """NORM.S.INV over draws."""
    return _inside(probability)


@over_draws("NORM.INV", "NORMINV")
def normal_quantile_over_draws(
    probability: FloatArray, mean: FloatArray | float, deviation: FloatArray | float
) -> FloatArray:
    """NORM.INV over draws."""
    z = _inside(probability)
    found = np.where(np.isnan(z), z, mean + deviation * z)
    return np.where(np.asarray(deviation) <= 0, _NUM, found)
