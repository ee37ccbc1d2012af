"""Draws the inputs of a study."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
import numpy.typing as npt
from scipy import special

from cellsim.uncertainty.concurrency import Task, run_tasks
from cellsim.uncertainty.dependence import (
    dependent_groups,
    lower_factor,
    mix_rows,
    normal_score_correlation,
)
from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.reordering import correlate_scores, normal_scores, order_like
from cellsim.uncertainty.specs import LATIN_HYPERCUBE, RANDOM
from cellsim.uncertainty.streams import fill_strata, fill_uniforms, shuffle

FloatArray = npt.NDArray[np.float64]

_BLOCK = 32_768
"""Draws handled at once, so that what passes between steps stays in the processor's cache."""


@dataclass(frozen=True, slots=True)
class _Group:
    """Inputs drawn together: their positions and the lower factor of their normal scores."""

    positions: tuple[int, ...]
    factor: FloatArray


@dataclass(frozen=True, slots=True)
class _Plan:
    """What is to be drawn, and where to."""

    out: FloatArray
    distributions: Sequence[Distribution]
    alone: tuple[int, ...]
    groups: tuple[_Group, ...]
    seed: int


def draw_inputs(
    distributions: Sequence[Distribution],
    rank_correlation: FloatArray | None,
    draws: int,
    seed: int,
    sampling: str,
    threads: int = 1,
) -> FloatArray:
    """Draws every input.

    Inputs without correlations have streams of their own. Correlated ones are tied by a Gaussian
    copula: with "random" through their normal scores, with "latin-hypercube" by reordering (Iman
    and Conover 1982), so that every input has exactly one draw in each of `draws` equally probable
    strata either way.

    Guarantees: the same arguments give the same bits with any number of threads; an input added at
    the end changes no draw of the others; with "random", fewer draws are the beginning of more.

    Args:
        distributions: One for each input.
        rank_correlation: Spearman rank correlations asked for, shape (inputs, inputs), or None; one
            in which `dependence.matrix_fault` finds nothing.
        draws: Number of draws, at least 1.
        seed: 0 to 2**64 - 1.
        sampling: "latin-hypercube" or "random".
        threads: How many threads share the work.

    Returns:
        Shape (inputs, draws), each row contiguous.

    Raises:
        ValueError: The way of sampling is not known or there are no draws.
    """
    if draws < 1:
        raise ValueError(f"draws must be at least 1, not {draws}")
    if sampling not in (LATIN_HYPERCUBE, RANDOM):
        raise ValueError(f"unknown sampling {sampling!r}")
    groups = _groups(rank_correlation)
    tied = {position for group in groups for position in group.positions}
    plan = _Plan(
        out=np.empty((len(distributions), draws)),
        distributions=distributions,
        alone=tuple(k for k in range(len(distributions)) if k not in tied),
        groups=groups,
        seed=seed,
    )
    if sampling == RANDOM:
        _draw_at_random(plan, threads)
    else:
        _draw_latin_hypercube(plan, threads)
    return plan.out


def achieved_rank_correlation(draws: FloatArray) -> FloatArray:
    """Spearman rank correlations of draws; equal values share the mean of their ranks.

    Args:
        draws: Shape (inputs, draws), at least two draws.

    Returns:
        Shape (inputs, inputs); NaN where an input takes one value only, except on the diagonal.
    """
    ranks = np.array([_mid_ranks(row) for row in draws])
    ranks -= ranks.mean(axis=1, keepdims=True)
    products = ranks @ ranks.T
    spread = np.sqrt(np.diag(products))
    with np.errstate(invalid="ignore", divide="ignore"):
        result: FloatArray = products / np.outer(spread, spread)
    np.clip(result, -1.0, 1.0, out=result)
    np.fill_diagonal(result, 1.0)
    return result


def _mid_ranks(values: FloatArray) -> FloatArray:
    order = np.argsort(values)
    sorted_values = values[order]
    starts = np.flatnonzero(np.append(True, sorted_values[1:] != sorted_values[:-1]))
    ends = np.append(starts[1:], len(values))
    ranks = np.empty(len(values))
    ranks[order] = np.repeat((starts + ends - 1) / 2.0, ends - starts)
    return ranks


def _groups(rank_correlation: FloatArray | None) -> tuple[_Group, ...]:
    if rank_correlation is None:
        return ()
    scores = normal_score_correlation(rank_correlation)
    return tuple(
        _Group(tuple(positions), lower_factor(scores[np.ix_(positions, positions)]))
        for positions in dependent_groups(rank_correlation)
    )


def _draw_at_random(plan: _Plan, threads: int) -> None:
    tasks: list[Task] = []
    for first in range(0, plan.out.shape[1], _BLOCK):
        tasks += [partial(_random_alone, plan, position, first) for position in plan.alone]
        tasks += [partial(_random_group, plan, group, first) for group in plan.groups]
    run_tasks(tasks, threads)


def _random_alone(plan: _Plan, position: int, first: int) -> None:
    row = plan.out[position, first : first + _BLOCK]
    fill_uniforms(row, plan.seed, position, first)
    row[:] = plan.distributions[position].quantile(row)


def _random_group(plan: _Plan, group: _Group, first: int) -> None:
    rows = [plan.out[position, first : first + _BLOCK] for position in group.positions]
    for position, row in zip(group.positions, rows, strict=True):
        fill_uniforms(row, plan.seed, position, first)
        special.ndtri(row, out=row)
    mix_rows(rows, group.factor)
    for position, row in zip(group.positions, rows, strict=True):
        row[:] = plan.distributions[position].at_score(row)


def _draw_latin_hypercube(plan: _Plan, threads: int) -> None:
    tied = [position for group in plan.groups for position in group.positions]
    tasks: list[Task] = [partial(_strata_alone, plan, position) for position in plan.alone]
    if tied:
        scores = normal_scores(plan.out.shape[1])
        tasks += [partial(_shuffled_scores, plan, position, scores) for position in tied]
    run_tasks(tasks, threads)
    for group in plan.groups:
        rows = [plan.out[position] for position in group.positions]
        correlate_scores(rows, group.factor, threads)
    run_tasks([partial(_strata_by_scores, plan, position) for position in tied], threads)


def _strata_alone(plan: _Plan, position: int) -> None:
    row = plan.out[position]
    _fill_stratified(row, plan, position)
    shuffle(row, plan.seed, position)


def _shuffled_scores(plan: _Plan, position: int, scores: FloatArray) -> None:
    row = plan.out[position]
    row[:] = scores
    shuffle(row, plan.seed, position)


def _strata_by_scores(plan: _Plan, position: int) -> None:
    row = plan.out[position]
    values = np.empty_like(row)
    _fill_stratified(values, plan, position)
    row[:] = order_like(values, row)


def _fill_stratified(out: FloatArray, plan: _Plan, position: int) -> None:
    """Fills `out` with one value from each stratum of the input, rising."""
    fill_strata(out, plan.seed, position)
    for first in range(0, out.size, _BLOCK):
        block = out[first : first + _BLOCK]
        block[:] = plan.distributions[position].quantile(block)
