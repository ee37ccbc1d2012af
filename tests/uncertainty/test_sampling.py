"""Draws are the same bits whenever the same is asked, and Latin hypercube draws fill every stratum."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import cellsim.uncertainty.reordering
import cellsim.uncertainty.sampling
from cellsim.uncertainty.distributions.families import build_distribution
from cellsim.uncertainty.sampling import draw_inputs
from cellsim.uncertainty.streams import fill_strata, fill_uniforms, stream

INPUTS = [
    build_distribution("normal", {"mean": 1, "sd": 2}),
    build_distribution("pert", {"low": 0, "mode": 1, "high": 4}),
    build_distribution("uniform", {"low": 0, "high": 1}),
    build_distribution("lognormal", {"mean": 2, "sd": 1}, cap=6),
    build_distribution("triangular", {"low": 0, "mode": 1, "high": 4}),
    build_distribution("discrete", {"values": (0.0, 1.0), "weights": (0.3, 0.7)}),
]
MATRIX = np.eye(6)
for _first, _second, _rank in ((0, 3, 0.6), (3, 4, -0.3), (1, 2, 0.9)):
    MATRIX[_first, _second] = MATRIX[_second, _first] = _rank

both_ways = pytest.mark.parametrize("sampling", ["random", "latin-hypercube"])
with_and_without_dependence = pytest.mark.parametrize(
    "matrix", [None, MATRIX], ids=["free", "tied"]
)


@both_ways
@with_and_without_dependence
@pytest.mark.parametrize("seed", [0, 1, 2**64 - 1])
def test_same_seed_gives_the_same_bits_for_any_number_of_threads(
    sampling: str, matrix: np.ndarray | None, seed: int
) -> None:
    first = draw_inputs(INPUTS, matrix, 70_001, seed, sampling)

    for threads in (1, 2, 5):
        again = draw_inputs(INPUTS, matrix, 70_001, seed, sampling, threads)
        assert first.tobytes() == again.tobytes()
    assert first.shape == (6, 70_001)
    assert first.flags.c_contiguous


@both_ways
@with_and_without_dependence
def test_block_size_changes_no_bit(
    sampling: str, matrix: np.ndarray | None, monkeypatch: pytest.MonkeyPatch
) -> None:
    first = draw_inputs(INPUTS, None, 5_003, 9, sampling)
    tied = draw_inputs(INPUTS, matrix, 5_003, 9, "random")

    monkeypatch.setattr(cellsim.uncertainty.sampling, "_BLOCK", 1024)

    assert draw_inputs(INPUTS, None, 5_003, 9, sampling).tobytes() == first.tobytes()
    assert draw_inputs(INPUTS, matrix, 5_003, 9, "random").tobytes() == tied.tobytes()


@both_ways
def test_seeds_differ(sampling: str) -> None:
    draws = [draw_inputs(INPUTS[:1], None, 1000, seed, sampling)[0] for seed in (0, 1, 2)]

    assert np.max(np.abs(np.corrcoef(draws) - np.eye(3))) < 0.15


@both_ways
@with_and_without_dependence
def test_further_input_changes_no_draw_of_the_others(
    sampling: str, matrix: np.ndarray | None
) -> None:
    fewer = None if matrix is None else matrix[:4, :4]
    more = None if matrix is None else matrix[:5, :5]

    before = draw_inputs(INPUTS[:4], fewer, 3000, 5, sampling)
    after = draw_inputs(INPUTS[:5], more, 3000, 5, sampling)

    np.testing.assert_array_equal(after[:4], before)


@with_and_without_dependence
def test_fewer_random_draws_are_the_beginning_of_more(matrix: np.ndarray | None) -> None:
    many = draw_inputs(INPUTS, matrix, 50_000, 5, "random")
    few = draw_inputs(INPUTS, matrix, 777, 5, "random")

    np.testing.assert_array_equal(many[:, :777], few)


@with_and_without_dependence
@pytest.mark.parametrize("draws", [1, 2, 7, 1000, 65_537])
def test_each_stratum_of_each_input_is_drawn_once(matrix: np.ndarray | None, draws: int) -> None:
    found = draw_inputs(INPUTS, matrix, draws, 3, "latin-hypercube")

    for distribution, row in zip(INPUTS[:5], found, strict=False):
        strata = np.sort(distribution.cdf(row)) * draws
        assert np.all(np.abs(strata - np.arange(draws) - 0.5) <= 0.5 + 1e-9 * draws)


def test_order_of_strata_is_not_the_order_of_draws() -> None:
    rows = draw_inputs(INPUTS[:3], None, 10_000, 3, "latin-hypercube")

    with_draw_number = np.corrcoef(np.vstack([np.arange(10_000), rows]))
    assert np.max(np.abs(with_draw_number - np.eye(4))) < 0.045


def test_place_inside_a_stratum_is_uniform() -> None:
    (row,) = draw_inputs([INPUTS[2]], None, 100_000, 3, "latin-hypercube")

    inside = np.sort(row) * 100_000 - np.arange(100_000)

    assert inside.mean() == pytest.approx(0.5, abs=4.5 / np.sqrt(12 * 100_000))
    assert np.histogram(inside, 10, (0, 1))[0] == pytest.approx(np.full(10, 10_000), abs=430)


@both_ways
def test_inputs_are_independent(sampling: str) -> None:
    rows = draw_inputs(INPUTS, None, 40_000, 3, sampling)

    assert np.max(np.abs(np.corrcoef(rows) - np.eye(6))) < 4.5 / np.sqrt(40_000)


def test_no_inputs_give_no_rows() -> None:
    assert draw_inputs([], None, 10, 1, "random").shape == (0, 10)


@pytest.mark.parametrize(
    ("draws", "sampling", "message"),
    [(0, "random", "at least 1"), (5, "sobol", "unknown sampling 'sobol'")],
)
def test_what_cannot_be_drawn_is_refused(draws: int, sampling: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        draw_inputs(INPUTS, None, draws, 1, sampling)


def test_generator_gives_the_published_numbers() -> None:
    """Known answer of Philox 4x64-10 for counter and key 0 (Random123 distribution, kat_vectors).

    The generator steps its counter before each block, so the one before 0 is asked for.
    """
    generator = stream(0, 0, 0, 2**256 - 1).bit_generator

    assert [f"{number:016x}" for number in generator.random_raw(4)] == [
        "16554d9eca36314c",
        "db20fe9d672d0fdc",
        "d7e772cee186176b",
        "7e68b68aec7ba23b",
    ]


@settings(max_examples=30)
@given(st.lists(st.integers(0, 500), min_size=1, max_size=5))
def test_any_part_of_a_stream_can_be_had_by_itself(starts: Sequence[int]) -> None:
    whole = np.empty(4 * 500 + 100)
    fill_uniforms(whole, 12, 3, 0)

    for start in starts:
        part = np.empty(97)
        fill_uniforms(part, 12, 3, 4 * start)
        np.testing.assert_array_equal(part, whole[4 * start : 4 * start + 97])


def test_block_must_start_where_the_generator_steps() -> None:
    with pytest.raises(ValueError, match="multiple of 4, not 6"):
        fill_uniforms(np.empty(4), 1, 1, 6)


def test_uniforms_lie_inside_the_interval() -> None:
    out = np.empty(100_000)
    fill_uniforms(out, 0, 0, 0)

    assert 0 < out.min() < out.max() < 1


@pytest.mark.parametrize("draws", [1, 3, 2**20])
def test_strata_stay_inside_the_interval(draws: int) -> None:
    out = np.empty(draws)
    fill_strata(out, 1, 0)

    assert out[0] > 0
    assert out[-1] < 1
    np.testing.assert_array_equal(np.floor(out * draws), np.arange(draws))
