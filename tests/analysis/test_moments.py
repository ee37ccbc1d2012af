"""Moments against certified values and against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from cellsim.analysis.moments import moments

# NIST Statistical Reference Datasets, univariate summary statistics (public domain): the data of
# Mavro, Michelso and Lew and the rules that make NumAcc1 to 4, with the certified mean and standard deviation.
MAVRO = [
    2.00180, 2.00170, 2.00180, 2.00190, 2.00180, 2.00170, 2.00150, 2.00140, 2.00150, 2.00150,
    2.00170, 2.00180, 2.00180, 2.00190, 2.00190, 2.00210, 2.00200, 2.00160, 2.00140, 2.00130,
    2.00130, 2.00150, 2.00150, 2.00160, 2.00150, 2.00140, 2.00130, 2.00140, 2.00150, 2.00140,
    2.00150, 2.00160, 2.00150, 2.00160, 2.00190, 2.00200, 2.00200, 2.00210, 2.00220, 2.00230,
    2.00240, 2.00250, 2.00270, 2.00260, 2.00260, 2.00260, 2.00270, 2.00260, 2.00250, 2.00240,
]  # fmt: skip
MICHELSO = [
    299.85, 299.74, 299.90, 300.07, 299.93, 299.85, 299.95, 299.98, 299.98, 299.88, 300.00, 299.98,
    299.93, 299.65, 299.76, 299.81, 300.00, 300.00, 299.96, 299.96, 299.96, 299.94, 299.96, 299.94,
    299.88, 299.80, 299.85, 299.88, 299.90, 299.84, 299.83, 299.79, 299.81, 299.88, 299.88, 299.83,
    299.80, 299.79, 299.76, 299.80, 299.88, 299.88, 299.88, 299.86, 299.72, 299.72, 299.62, 299.86,
    299.97, 299.95, 299.88, 299.91, 299.85, 299.87, 299.84, 299.84, 299.85, 299.84, 299.84, 299.84,
    299.89, 299.81, 299.81, 299.82, 299.80, 299.77, 299.76, 299.74, 299.75, 299.76, 299.91, 299.92,
    299.89, 299.86, 299.88, 299.72, 299.84, 299.85, 299.85, 299.78, 299.89, 299.84, 299.78, 299.81,
    299.76, 299.81, 299.79, 299.81, 299.82, 299.85, 299.87, 299.87, 299.81, 299.74, 299.81, 299.94,
    299.95, 299.80, 299.81, 299.87,
]  # fmt: skip
LEW = [
    -213, -564, -35, -15, 141, 115, -420, -360, 203, -338, -431, 194, -220, -513, 154, -125, -559,
    92, -21, -579, -52, 99, -543, -175, 162, -457, -346, 204, -300, -474, 164, -107, -572, -8, 83,
    -541, -224, 180, -420, -374, 201, -236, -531, 83, 27, -564, -112, 131, -507, -254, 199, -311,
    -495, 143, -46, -579, -90, 136, -472, -338, 202, -287, -477, 169, -124, -568, 17, 48, -568,
    -135, 162, -430, -422, 172, -74, -577, -13, 92, -534, -243, 194, -355, -465, 156, -81, -578,
    -64, 139, -449, -384, 193, -198, -538, 110, -44, -577, -6, 66, -552, -164, 161, -460, -344,
    205, -281, -504, 134, -28, -576, -118, 156, -437, -381, 200, -220, -540, 83, 11, -568, -160,
    172, -414, -408, 188, -125, -572, -32, 139, -492, -321, 205, -262, -504, 142, -83, -574, 0, 48,
    -571, -106, 137, -501, -266, 190, -391, -406, 194, -186, -553, 83, -13, -577, -49, 103, -515,
    -280, 201, 300, -506, 131, -45, -578, -80, 138, -462, -361, 201, -211, -554, 32, 74, -533,
    -235, 187, -372, -442, 182, -147, -566, 25, 68, -535, -244, 194, -351, -463, 174, -125, -570,
    15, 72, -550, -190, 172, -424, -385, 198, -218, -536, 96,
]  # fmt: skip
CERTIFIED = {
    "NumAcc1": ([10000001, 10000003, 10000002], 10000002, 1),
    "NumAcc2": ([1.2, *[1.1, 1.3] * 500], 1.2, 0.1),
    "NumAcc3": ([1000000.2, *[1000000.1, 1000000.3] * 500], 1000000.2, 0.1),
    "NumAcc4": ([10000000.2, *[10000000.1, 10000000.3] * 500], 10000000.2, 0.1),
    "Mavro": (MAVRO, 2.001856, 0.000429123454003053),
    "Michelso": (MICHELSO, 299.8524, 0.0790105478190518),
    "Lew": (LEW, -177.435, 277.332168044316),
}


@pytest.mark.parametrize("name", CERTIFIED)
def test_mean_and_sd_agree_with_certified_values(name: str) -> None:
    data, mean, sd = CERTIFIED[name]
    found = moments(np.array(data, dtype=np.float64))
    assert found.mean == pytest.approx(mean, rel=1e-14)
    # the data of NumAcc3 and 4 are rounded to doubles, which their deviations feel
    assert found.sd == pytest.approx(sd, rel=1e-8 if name in {"NumAcc3", "NumAcc4"} else 1e-12)


def test_skewness_and_kurtosis_are_those_of_spreadsheets() -> None:
    # scipy's bias-corrected skew and kurtosis are G1 and G2, which SKEW and KURT define
    data = np.random.default_rng(3).gamma(2.0, 3.0, 500)
    found = moments(data)
    assert found.skewness == pytest.approx(stats.skew(data, bias=False), rel=1e-12)
    assert found.excess_kurtosis == pytest.approx(stats.kurtosis(data, bias=False), rel=1e-12)


def test_standard_errors_match_the_spread_of_repeated_samples() -> None:
    samples = np.random.default_rng(11).exponential(size=(4000, 400))
    found = [moments(sample) for sample in samples]
    # the spread of 4000 values is known to about 1.1 %; 5 % is more than four standard errors
    means = np.array([f.mean for f in found])
    assert np.mean([f.mean_se or 0.0 for f in found]) == pytest.approx(means.std(), rel=0.05)
    sds = np.array([f.sd or 0.0 for f in found])
    roots = np.sqrt(np.mean([(f.sd_se or 0.0) ** 2 for f in found]))
    assert roots == pytest.approx(sds.std(), rel=0.08)


def test_a_single_value_has_a_mean_and_no_spread() -> None:
    found = moments(np.array([7.0]))
    assert (found.mean, found.minimum, found.maximum, found.count) == (7.0, 7.0, 7.0, 1)
    shape = (found.sd, found.mean_se, found.sd_se, found.skewness, found.excess_kurtosis)
    assert shape == (None,) * 5


def test_equal_values_have_exactly_no_spread() -> None:
    found = moments(np.full(1001, 0.1))
    assert (found.mean, found.sd, found.mean_se, found.skewness) == (0.1, 0.0, 0.0, None)


@pytest.mark.parametrize("scale", [1e-300, 1e-12, 1e15, 1e300])
def test_moments_scale_with_the_values(scale: float) -> None:
    data = np.random.default_rng(5).normal(1.0, 0.3, 1000)
    plain, scaled = moments(data), moments(data * scale)
    assert scaled.mean == pytest.approx(plain.mean * scale, rel=1e-12, abs=0)
    assert plain.sd is not None
    assert scaled.sd == pytest.approx(plain.sd * scale, rel=1e-12, abs=0)
    assert plain.sd_se is not None
    assert scaled.sd_se == pytest.approx(plain.sd_se * scale, rel=1e-9, abs=0)
    assert scaled.skewness == pytest.approx(plain.skewness, rel=1e-9, abs=1e-12)


def test_no_values_are_an_error() -> None:
    with pytest.raises(ValueError, match="no values"):
        moments(np.array([]))
