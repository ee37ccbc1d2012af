"""Where the tables that charts and links point to stand."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from cellsim.analysis.histogram import Histogram
from cellsim.report.figures import PROBABILITIES, Figures, OutputFigures

HEADLINE = "Headline"
QUANTILES = "Quantiles"
DISTRIBUTION = "Distribution"
INPUTS = "Inputs"
DEPENDENCE = "Dependence"
FAILED_DRAWS = "Failed draws"
MODEL_CHECK = "Model check"
RUN_RECORD = "Run record"
DRAWS = "Draws"

_BLOCKS_START = 6
_EMPTY_BLOCK = 4
_CHART_ROWS = 34


@dataclass(frozen=True, slots=True)
class Block:
    """The rows of one output on a sheet.

    Attributes:
        top: Row of its heading.
        first: First row of its table's body.
        last: Last row of its table's body.
        following: First row after it.
    """

    top: int
    first: int
    last: int
    following: int


def quantile_blocks(figures: Figures) -> tuple[Block, ...]:
    """The blocks of the sheet Quantiles: a heading and a row a probability."""
    return _stacked(len(PROBABILITIES) if output.summary else 0 for output in figures.outputs)


def distribution_blocks(figures: Figures) -> tuple[Block, ...]:
    """The blocks of the sheet Distribution: a heading and a row a bin, beside charts."""
    return _stacked(
        (
            len(output.summary.histogram.counts) if output.summary else 0
            for output in figures.outputs
        ),
        least=_CHART_ROWS,
        before=3,
    )


def base_bin(output: OutputFigures) -> int | None:
    """The bin of an output's histogram in which its base case lies."""
    found: Histogram | None = output.summary.histogram if output.summary else None
    return found.bin_of(output.base) if found is not None and output.base is not None else None


def _stacked(bodies: Iterable[int], *, least: int = 0, before: int = 2) -> tuple[Block, ...]:
    return tuple(_stack(bodies, least, before))


def _stack(bodies: Iterable[int], least: int, before: int) -> Iterator[Block]:
    row = _BLOCKS_START
    for body in bodies:
        first = row + before
        rows = max(body, least) if body else _EMPTY_BLOCK
        block = Block(row, first, first + max(body, 1) - 1, first + rows + 1)
        yield block
        row = block.following
