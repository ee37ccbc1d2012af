"""Draws the inputs of a study."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from functools import partial

import numpy as np
import numpy.typing as npt
from scipy import special

from cellsim.uncertainty.dependence import dependent_groups, lower_factor, normal_score_correlation
from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.specs import RANDOM
from cellsim.uncertainty.streams import fill_uniforms

FloatArray = npt.NDArray[np.float64]

_BLOCK = 32_768
"""Draws handled at once, so that what passes between steps stays in the processor's cache."""


def draw_inputs(
    distributions: Sequence[Distribution],
    rank_correlation: FloatArray | None,
    draws: int,
    seed: int,
    sampling: str,
    threads: int = 1,
) -> FloatArray:
    """Draws every input.

    Guarantees: the same arguments give the same bits with any number of threads; an input added at
    the end changes no draw of the others; with "random", fewer draws are the beginning of more.

    Args:
        distributions: One for each input.
        rank_correlation: Spearman rank correlations asked for, shape (inputs, inputs), or None.
        draws: Number of draws, at least 1.
        seed: 0 to 2**64 - 1.
        sampling: "latin-hypercube" or "random".
        threads: How many threads share the work.

    Returns:
        Shape (inputs, draws), each row contiguous.
    """
    out = np.empty((len(distributions), draws))
    if sampling != RANDOM:
        raise ValueError(f"unknown sampling {sampling!r}")
    matrix = np.eye(len(distributions)) if rank_correlation is None else rank_correlation
    groups = dependent_groups(matrix)
    factor = lower_factor(normal_score_correlation(matrix))
    tied = {position for group in groups for position in group}
    tasks: list[Callable[[], None]] = []
    for first in range(0, draws, _BLOCK):
        block = out[:, first : first + _BLOCK]
        for position, distribution in enumerate(distributions):
            if position not in tied:
                tasks.append(
                    partial(_draw_alone, block[position], distribution, seed, position, first)
                )
        tasks += [
            partial(_draw_group, block, distributions, group, factor, seed, first)
            for group in groups
        ]
    _run(tasks, threads)
    return out


def _draw_alone(
    row: FloatArray, distribution: Distribution, seed: int, position: int, first: int
) -> None:
    fill_uniforms(row, seed, position, first)
    row[:] = distribution.quantile(row)


def _draw_group(
    block: FloatArray,
    distributions: Sequence[Distribution],
    group: Sequence[int],
    factor: FloatArray,
    seed: int,
    first: int,
) -> None:
    for position in group:
        fill_uniforms(block[position], seed, position, first)
        special.ndtri(block[position], out=block[position])
    for position in reversed(group):  # from the last, since a row needs those before it unmixed
        _mix(block, group, factor, position)
    for position in group:
        block[position] = distributions[position].at_score(block[position])


def _mix(block: FloatArray, group: Sequence[int], factor: FloatArray, position: int) -> None:
    row = block[position]
    row *= factor[position, position]
    for other in group:
        if other < position and factor[position, other] != 0.0:
            row += factor[position, other] * block[other]


def _run(tasks: Sequence[Callable[[], None]], threads: int) -> None:
    if threads <= 1:
        for task in tasks:
            task()
        return
    with ThreadPoolExecutor(threads) as pool:
        for future in [pool.submit(task) for task in tasks]:
            future.result()
