"""The worked example of the reordering step, digit by digit.

Source: S. Mildenhall, "Correlation and Aggregate Loss Distributions, with an Emphasis on the
Iman-Conover Method" (Casualty Actuarial Society working party paper, 2005), simple example with
20 draws of 4 variables, as carried in the documentation of the Python package `aggregate`.
"""

from __future__ import annotations

import numpy as np
import pytest

from cellsim.uncertainty.dependence import lower_factor
from cellsim.uncertainty.reordering import correlate_scores, normal_scores, order_like

MARGINS = np.array(
    [
        [int(value) for value in row.split()]
        for row in (
            (
                "123567 126109 138713 139016 152213 153224 153407 155716 155780 161678 "
                "161805 167447 170737 171592 178881 181678 184381 206940 217092 240935"
            ),
            (
                "44770 45191 47453 47941 49345 49420 50686 52931 54010 57346 "
                "57685 57698 58380 60948 66972 68053 70592 72243 86685 87138"
            ),
            (
                "15934 16839 17233 17265 17620 17859 20804 21110 22728 24072 "
                "25198 25393 30357 30779 32634 33117 35248 36656 38483 39483"
            ),
            (
                "13273 15406 16706 16891 18821 19569 20166 20796 20968 21178 "
                "23236 23375 24019 24785 25000 26754 27079 30136 30757 35108"
            ),
        )
    ],
    dtype=float,
)
SCORE_RANKS = np.array(
    [
        list(range(1, 21)),
        [18, 2, 20, 9, 16, 3, 6, 7, 4, 14, 8, 13, 10, 1, 12, 17, 5, 19, 11, 15],
        [4, 2, 16, 17, 13, 6, 18, 7, 12, 11, 3, 15, 9, 5, 20, 19, 1, 14, 10, 8],
        [7, 16, 6, 4, 20, 12, 8, 10, 15, 3, 14, 13, 18, 9, 1, 19, 17, 2, 11, 5],
    ]
)
RESULT_RANKS = np.array(
    [
        list(range(1, 21)),
        [7, 1, 11, 3, 10, 2, 4, 8, 6, 13, 9, 15, 12, 5, 16, 18, 14, 19, 17, 20],
        [1, 2, 5, 17, 7, 8, 19, 6, 16, 9, 4, 15, 10, 13, 20, 18, 3, 12, 14, 11],
        [3, 15, 6, 7, 19, 13, 12, 8, 17, 2, 11, 14, 18, 9, 4, 20, 16, 1, 10, 5],
    ]
)
TARGET = np.array(
    [[1.0, 0.8, 0.4, 0.0], [0.8, 1.0, 0.3, -0.2], [0.4, 0.3, 1.0, 0.1], [0.0, -0.2, 0.1, 1.0]]
)
SPREAD = 0.8686748  # population standard deviation of the scores, as published
UPPER = np.triu_indices(4, 1)


@pytest.fixture
def shuffled() -> np.ndarray:
    scores: np.ndarray = normal_scores(20)[SCORE_RANKS - 1]
    return scores


@pytest.fixture
def correlated(shuffled: np.ndarray) -> np.ndarray:
    correlate_scores(list(shuffled), lower_factor(TARGET))
    return shuffled


def test_scores(shuffled: np.ndarray) -> None:
    assert shuffled[0].std() == pytest.approx(SPREAD, abs=5e-8)
    assert shuffled[0, -1] / SPREAD == pytest.approx(1.92062, abs=5e-6)


def test_factor_of_the_target() -> None:
    published = np.array(
        [[1, 0, 0, 0], [0.8, 0.6, 0, 0], [0.4, -0.033, 0.916, 0], [0, -0.333, 0.097, 0.938]]
    )

    np.testing.assert_allclose(lower_factor(TARGET), published, atol=5e-4)


def test_shuffled_scores_are_correlated_by_chance(shuffled: np.ndarray) -> None:
    published = [0.0486, 0.0898, -0.0960, 0.4504, -0.2408, -0.3192]

    np.testing.assert_allclose(np.corrcoef(shuffled)[UPPER], published, atol=5e-5)


def test_first_draw_of_the_correlated_scores(correlated: np.ndarray) -> None:
    published = [-1.92062, -0.74213, -2.28105, -1.33232]

    np.testing.assert_allclose(correlated[:, 0] / SPREAD, published, atol=5e-6)


def test_correlated_scores_have_the_target_exactly(correlated: np.ndarray) -> None:
    np.testing.assert_allclose(np.corrcoef(correlated), TARGET, atol=1e-14)


def test_every_cell_of_the_reordered_sample(correlated: np.ndarray) -> None:
    found = np.array(
        [order_like(margin, scores) for margin, scores in zip(MARGINS, correlated, strict=True)]
    )
    expected = np.take_along_axis(MARGINS, RESULT_RANKS - 1, axis=1)

    np.testing.assert_array_equal(found, expected)
    published = [0.85, 0.26, -0.11, 0.19, -0.20, 0.10]
    np.testing.assert_allclose(np.corrcoef(found)[UPPER], published, atol=5e-3)
