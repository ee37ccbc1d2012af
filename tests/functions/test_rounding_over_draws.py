"""Rounding of many draws at once, held against published examples and against single numbers."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from cellsim.functions.registry import find_over_draws
from cellsim.functions.rounding_rules import round_down, round_half_away, round_up
from cellsim.values import ErrorValue, encode_error

SINGLE = {
    "ROUND": round_half_away,
    "ROUNDUP": round_up,
    "ROUNDDOWN": round_down,
    "TRUNC": round_down,
}


def over_draws(name: str) -> Callable[..., np.ndarray]:
    kernel = find_over_draws(name)
    assert kernel is not None
    return kernel


@pytest.mark.parametrize(
    ("name", "number", "digits", "expected"),
    [  # The examples of Microsoft Support's pages on ROUNDUP, ROUNDDOWN and TRUNC, from memory.
        ("ROUNDUP", 3.2, 0, 4.0),
        ("ROUNDUP", 76.9, 0, 77.0),
        ("ROUNDUP", 3.14159, 3, 3.142),
        ("ROUNDUP", -3.14159, 1, -3.2),
        ("ROUNDUP", 31415.92654, -2, 31500.0),
        ("ROUNDDOWN", 3.2, 0, 3.0),
        ("ROUNDDOWN", 76.9, 0, 76.0),
        ("ROUNDDOWN", 3.14159, 3, 3.141),
        ("ROUNDDOWN", -3.14159, 1, -3.1),
        ("ROUNDDOWN", 31415.92654, -2, 31400.0),
        ("TRUNC", 8.9, 0, 8.0),
        ("TRUNC", -8.9, 0, -8.0),
        ("TRUNC", 0.45, 0, 0.0),
    ],
)
def test_published_examples_hold_over_draws(
    name: str, number: float, digits: int, expected: float
) -> None:
    assert over_draws(name)(np.full(3, number), float(digits)).tolist() == [expected] * 3


@pytest.mark.parametrize("name", SINGLE)
@pytest.mark.parametrize("one_place_for_all", [True, False])
def test_every_draw_is_rounded_as_a_single_number_bit_for_bit(
    name: str, one_place_for_all: bool
) -> None:
    """Whole numbers, numbers a few units in the last place beside them, ties, both signs, all sizes."""
    rng = np.random.default_rng(20261201)
    whole = rng.integers(-400, 400, 3_000) / 12.0
    sizes = rng.choice([-1.0, 1.0], 2_000) * 10.0 ** rng.uniform(-12, 18, 2_000)
    ties = rng.integers(-(10**6), 10**6, 2_000) / 1000.0 + 0.0005
    numbers = np.concatenate(
        [whole, whole * (1 + 4e-16), whole * (1 - 9e-15), sizes, ties, [0.0, -0.0, 2.0**52, -1e300]]
    )
    for place in range(-6, 7):
        digits = np.full(len(numbers), float(place))
        if not one_place_for_all:
            digits = rng.permutation(np.arange(len(numbers)) % 13 - 6.0)
        found = over_draws(name)(numbers, float(place) if one_place_for_all else digits)
        expected = [SINGLE[name](float(n), int(d)) for n, d in zip(numbers, digits, strict=True)]
        assert found.tolist() == expected


@pytest.mark.parametrize("name", SINGLE)
def test_an_error_in_a_draw_stays_an_error(name: str) -> None:
    found = over_draws(name)(np.array([1.26, encode_error(ErrorValue.DIV0)]), 1.0)
    assert np.isnan(found).tolist() == [False, True]
