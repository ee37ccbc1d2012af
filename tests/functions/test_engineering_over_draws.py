"""Engineering functions over draws: each draw by itself gives the same, errors included."""

from __future__ import annotations

import datetime as dt
from types import SimpleNamespace
from typing import cast

import numpy as np
import pytest

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.dispatch import call_function
from cellsim.functions.registry import Context, find_function, find_over_draws
from cellsim.values import decode_error

CONTEXT = cast("Context", SimpleNamespace(date_1904=False, now=dt.datetime(2026, 6, 30)))  # noqa: DTZ001
DRAWS = 400

BITS = ["BITAND", "BITOR", "BITXOR"]
SHIFTS = ["BITLSHIFT", "BITRSHIFT"]
ONE_NUMBER = ["ERF", "ERF.PRECISE", "ERFC", "ERFC.PRECISE", "DELTA", "GESTEP"]
TWO_NUMBERS = ["ERF", "DELTA", "GESTEP"]


def check(name: str, *arguments: np.ndarray | float) -> set[object]:
    """Compare each draw with the function alone; gives the errors that came up."""
    function, kernel = find_function(name), find_over_draws(name)
    assert function is not None
    assert kernel is not None
    with np.errstate(all="ignore"):
        found = np.broadcast_to(np.asarray(kernel(*arguments)), (DRAWS,))
    errors: set[object] = set()
    for draw in range(DRAWS):
        singles = [float(np.broadcast_to(a, (DRAWS,))[draw]) for a in arguments]
        alone = call_function(function, singles, CONTEXT)
        if found[draw] == found[draw]:
            assert type(alone) is float, f"{name}{singles}: {found[draw]!r}, {alone!r}"
            assert abs(found[draw] - alone) <= 1e-12 * max(abs(alone), 1e-9)
        else:
            assert decode_error(float(found[draw])) is alone, f"{name}{singles}: {alone!r}"
            errors.add(alone)
    return errors


def whole_and_other_numbers(seed: int) -> np.ndarray:
    """48-bit whole numbers, and among them negative, too large and broken ones."""
    rng = np.random.default_rng(seed)
    values = np.floor(2.0 ** rng.uniform(0, 48, DRAWS))
    values[::9] += 0.5
    values[::13] = -1.0
    values[::17] = 2.0**48
    values[::19] = 2.0**48 - 1
    return values


@pytest.mark.parametrize("name", BITS)
def test_bits_of_each_draw_are_those_alone(name: str) -> None:
    assert len(check(name, whole_and_other_numbers(1), whole_and_other_numbers(2))) == 1
    check(name, whole_and_other_numbers(3), 25.0)


@pytest.mark.parametrize("name", SHIFTS)
def test_shifts_of_each_draw_are_those_alone(name: str) -> None:
    places = np.random.default_rng(4).uniform(-56, 56, DRAWS)
    assert len(check(name, whole_and_other_numbers(5), places)) == 1
    check(name, whole_and_other_numbers(6), 2.0)


@pytest.mark.parametrize("name", ONE_NUMBER)
def test_functions_of_one_number_are_those_alone(name: str) -> None:
    values = np.round(np.random.default_rng(7).normal(0, 2, DRAWS), 1)
    values[::10] = 0.0
    values[3] = 1e300
    assert not check(name, values)


@pytest.mark.parametrize("name", TWO_NUMBERS)
def test_functions_of_two_numbers_are_those_alone(name: str) -> None:
    rng = np.random.default_rng(8)
    first, second = (np.round(rng.normal(0, 1, DRAWS), 1) for _ in range(2))
    assert not check(name, first, second)
    assert not check(name, first, 0.5)
