"""What a family accepts, what it answers otherwise, and how it describes itself."""

from __future__ import annotations

import ast
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import cellsim.uncertainty.sampling
from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.distributions.families import (
    FAMILIES,
    build_distribution,
    parameter_faults,
)
from cellsim.uncertainty.distributions.family import (
    ParameterError,
    ParameterValue,
    quantile_probability,
)

REFUSED: dict[str, tuple[str, dict[str, ParameterValue], str, str]] = {
    "unknown family": ("xyz", {}, "distribution", "no distribution is called xyz; known: bern.*"),
    "no spread": ("normal", {"mean": 1, "sd": 0}, "sd", "sd must be a number above 0, read 0"),
    "infinite mean": (
        "normal",
        {"mean": math.inf, "sd": 1},
        "mean",
        "mean must be a finite number, read inf",
    ),
    "infinite quantile": (
        "normal",
        {"p10": 1, "p90": math.nan},
        "p90",
        "p90 must be a finite number, read nan",
    ),
    "list for a number": (
        "normal",
        {"mean": (1.0, 2.0), "sd": 1},
        "mean",
        r"mean must be a finite number, read \[1, 2\]",
    ),
    "number for a list": (
        "discrete",
        {"values": 1, "weights": (1.0,)},
        "values",
        "values must be a list of one or more finite numbers, read 1",
    ),
    "number for weights": (
        "discrete",
        {"values": (1.0,), "weights": 1},
        "weights",
        "weights must be a list of probabilities, read 1",
    ),
    "three quantiles": (
        "normal",
        {"p10": 1, "p50": 2, "p90": 3},
        "",
        "normal takes mean and sd; or two quantiles .* read p10, p50 and p90",
    ),
    "equal bounds": (
        "uniform",
        {"low": 1, "high": 1},
        "low",
        "low must be below high, read 1 and 1",
    ),
    "low left at a default above high": (
        "beta",
        {"alpha": 1, "beta": 1, "high": -1},
        "low",
        "low must be below high, read 0 and -1",
    ),
    "mean outside default bounds": (
        "beta",
        {"mean": 1.5, "sd": 0.1},
        "mean",
        "mean must lie between 0 and 1, read 1.5",
    ),
    "shape out of reach": (
        "beta",
        {"alpha": 1e-9, "beta": 1},
        "alpha",
        "alpha must be a number from 0.001 to 100000000, read 1e-09",
    ),
    "spread out of reach": (
        "beta",
        {"mean": 0.5, "sd": 1e-6},
        "sd",
        "sd 1e-06 is too extreme for this mean and these bounds: it gives alpha 125000000000",
    ),
    "weight out of reach": (
        "pert",
        {"low": 0, "mode": 1, "high": 2, "weight": 1e9},
        "weight",
        "weight must be a number above 0 and below 100000000, read 1000000000",
    ),
    "quantile below the shift": (
        "lognormal",
        {"p10": 1, "p90": 3, "shift": 2},
        "",
        "the lower quantile must be above the shift, 2, read 1",
    ),
    "negative lognormal quantile": (
        "lognormal",
        {"p10": -1, "p90": 3},
        "",
        "the lower quantile must be above 0, read -1",
    ),
    "negative lognormal mean": (
        "lognormal",
        {"mean": -1, "sd": 3},
        "mean",
        "mean must be above 0, read -1",
    ),
    "lognormal without finite spread": (
        "lognormal",
        {"mu": 0, "sigma": 40},
        "sigma",
        "the logarithm's spread is too wide .* mu 0 and sigma 40",
    ),
}


@pytest.mark.parametrize(
    ("family", "parameters", "key", "message"), REFUSED.values(), ids=list(REFUSED)
)
def test_parameters_are_refused(
    family: str, parameters: dict[str, ParameterValue], key: str, message: str
) -> None:
    with pytest.raises(ParameterError, match=message) as caught:
        build_distribution(family, parameters)

    assert caught.value.key == key


@pytest.mark.parametrize(
    ("bounds", "key"),
    [
        ({"floor": 5.0}, "floor"),
        ({"cap": -5.0}, "cap"),
        ({"floor": 1.5, "cap": 9.0}, "floor"),
        ({"floor": -9.0, "cap": -1.0}, "cap"),
        ({"floor": 0.7, "cap": 0.2}, "floor"),
    ],
)
@pytest.mark.parametrize(
    ("family", "parameters"),
    [
        ("uniform", {"low": 0.0, "high": 1.0}),
        ("beta", {"alpha": 2.0, "beta": 2.0}),
        ("discrete", {"values": (0.0, 1.0), "weights": (0.5, 0.5)}),
    ],
)
def test_bounds_that_leave_nothing_are_refused(
    family: str, parameters: dict[str, ParameterValue], bounds: dict[str, float], key: str
) -> None:
    with pytest.raises(ParameterError) as caught:
        build_distribution(family, parameters, **bounds)

    assert caught.value.key == key


def test_faults_of_known_parameters_are_found_beside_unknown_ones() -> None:
    faults = parameter_faults("pert", {"low": 3.0, "high": 1.0}, ["low", "mode", "high"])

    assert [(fault.key, fault.message) for fault in faults] == [
        ("low", "low must not be above high, read 3 and 1")
    ]


def test_all_faulty_parameters_are_found() -> None:
    faults = parameter_faults("beta", {"alpha": -1.0, "beta": 0.0}, ["alpha", "beta"])

    assert [fault.key for fault in faults] == ["alpha", "beta"]


DESCRIBED: list[tuple[str, dict[str, ParameterValue], dict[str, float], str]] = [
    ("lognormal", {"mean": 0.03, "sd": 0.025}, {}, "lognormal, mean 0.03, sd 0.025"),
    ("normal", {"p10": 2.0, "p90": 1e7}, {}, "normal, p10 2, p90 10000000"),
    ("uniform", {"low": 0, "high": 1}, {"cap": 0.5}, "uniform, low 0, high 1, cap 0.5"),
    (
        "discrete",
        {"values": (0.0, 1.0), "weights": (0.35, 0.65)},
        {},
        "discrete, values [0, 1], weights [0.35, 0.65]",
    ),
]


@pytest.mark.parametrize(("family", "parameters", "bounds", "words"), DESCRIBED)
def test_distribution_describes_itself(
    family: str, parameters: dict[str, ParameterValue], bounds: dict[str, float], words: str
) -> None:
    distribution = build_distribution(family, parameters, **bounds)

    assert distribution.describe() == words
    assert distribution.family == family


@pytest.mark.parametrize(
    ("key", "probability"),
    [
        ("p10", 0.1),
        ("p05", 0.05),
        ("p5", 0.05),
        ("p2_5", 0.025),
        ("p99_9", 0.999),
        ("p0_1", 0.001),
        ("p0", None),
        ("p00", None),
        ("p100", None),
        ("p", None),
        ("p_5", None),
        ("P10", None),
        ("probability", None),
    ],
)
def test_quantile_keys(key: str, probability: float | None) -> None:
    assert quantile_probability(key) == pytest.approx(probability)


def test_bounds_that_cut_nothing_change_nothing() -> None:
    plain = build_distribution("pert", {"low": 0, "mode": 1, "high": 3})
    wide = build_distribution("pert", {"low": 0, "mode": 1, "high": 3}, floor=-1, cap=4)
    u = np.linspace(0.001, 0.999, 999)

    np.testing.assert_allclose(wide.quantile(u), plain.quantile(u), rtol=1e-12)
    assert (wide.mean, wide.sd) == pytest.approx((plain.mean, plain.sd), rel=1e-11)


numbers = st.floats(-1e6, 1e6)
spreads = st.floats(1e-3, 1e3)
shapes = st.floats(0.2, 200)
shares = st.floats(0.0, 1.0)


@st.composite
def distributions(draw: st.DrawFn) -> Distribution:
    """Any continuous distribution, some of them truncated."""
    family = draw(st.sampled_from(["normal", "lognormal", "uniform", "triangular", "pert", "beta"]))
    low, width, share = draw(numbers), draw(spreads), draw(shares)
    assume(low + width > low)
    parameters: dict[str, float] = {
        "normal": {"mean": low, "sd": width},
        "lognormal": {"mu": low / 1e5, "sigma": share + 0.01},
        "uniform": {"low": low, "high": low + width},
        "triangular": {
            "low": low,
            "mode": min(low + share * width, low + width),
            "high": low + width,
        },
        "pert": {"low": low, "mode": min(low + share * width, low + width), "high": low + width},
        "beta": {"alpha": draw(shapes), "beta": draw(shapes), "low": low, "high": low + width},
    }[family]
    plain = build_distribution(family, parameters)
    if not draw(st.booleans()):
        return plain
    floor, cap = plain.quantile(np.array(sorted([draw(st.floats(0.01, 0.4)), 0.6])))
    assume(floor < cap)
    return build_distribution(family, parameters, float(floor), float(cap))


@settings(deadline=None, max_examples=200)
@given(distributions(), st.lists(st.floats(1e-6, 1 - 1e-6), min_size=1, max_size=20))
def test_cdf_undoes_quantile(distribution: Distribution, probabilities: list[float]) -> None:
    u = np.array(sorted(probabilities))

    x = distribution.quantile(u)

    resolution = 4 * np.spacing(np.abs(x)) * distribution.density(x)
    assert np.all(np.abs(distribution.cdf(x) - u) <= 1e-9 + resolution)
    assert np.all(np.abs(distribution.survival(x) - (1 - u)) <= 1e-9 + resolution)
    assert np.all(np.diff(x) >= 0)
    assert np.all((x >= distribution.lower) & (x <= distribution.upper))


@pytest.mark.parametrize(
    ("alpha", "beta"), [(0.001, 0.001), (0.001, 1e8), (1000.0, 1e8), (10.0, 1e7), (1e8, 1e8)]
)
def test_extreme_shapes_have_right_quantiles(alpha: float, beta: float) -> None:
    """Where the shapes differ by many powers of ten a library's own inverse is off by half."""
    distribution = build_distribution("beta", {"alpha": alpha, "beta": beta})
    u = np.array([1e-4, 0.05, 0.3, 0.5, 0.9, 0.999])

    x = distribution.quantile(u)

    held = (x > 1e-300) & (x < 1 - 1e-16)  # else the true value has no number of its own
    np.testing.assert_allclose(distribution.cdf(x)[held], u[held], rtol=1e-6)
    np.testing.assert_array_equal(np.sort(x), x)


def test_package_does_not_import_scipy_stats() -> None:
    """It takes long to import; special functions are enough."""
    folder = Path(cellsim.uncertainty.sampling.__file__).parent
    imported = set()
    for module in folder.rglob("*.py"):
        for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                imported |= {name.name for name in node.names}
            elif isinstance(node, ast.ImportFrom):
                imported |= {f"{node.module}.{name.name}" for name in node.names}

    assert not {name for name in imported if name.startswith("scipy.")} - {"scipy.special"}


def test_every_family_says_which_parameters_it_takes() -> None:
    for family in FAMILIES.values():
        with pytest.raises(ParameterError, match=f"{family.name} takes .*; read no parameters"):
            family.set_for([])
