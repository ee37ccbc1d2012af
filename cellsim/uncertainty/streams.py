"""Counter-based random streams: any part of any stream can be had without what comes before it."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]

VALUES = 0
ORDER = 1
_PURPOSES = 2
_NUMBERS_IN_A_STEP = 4
_SMALLEST = 2.0**-54
"""Stands for the one value outside (0, 1) that a generator gives, 0."""
_HALF_STEP = 2.0**-25
"""Half the distance between the single precision numbers that a generator gives."""


def stream(seed: int, position: int, purpose: int, first_step: int = 0) -> np.random.Generator:
    """The stream of one input for one purpose.

    Guarantees: streams of different seeds, inputs or purposes are independent (Philox 4x64-10,
    Salmon et al. 2011, one key each); an input's streams do not depend on the other inputs.

    Args:
        seed: 0 to 2**64 - 1.
        position: The input's position in the study, counted from 0.
        purpose: `VALUES` or `ORDER`.
        first_step: How many steps of four numbers to leave out.
    """
    key = np.array([seed, position * _PURPOSES + purpose], dtype=np.uint64)
    return np.random.Generator(np.random.Philox(key=key, counter=first_step))


def fill_uniforms(out: FloatArray, seed: int, position: int, first: int) -> None:
    """Fills `out` with the uniforms of an input from draw `first` on, inside (0, 1).

    Guarantees: the value at a draw is the same whichever draws it is asked for with.

    Args:
        out: Shape (draws,), contiguous.
        seed: The study's seed.
        position: The input's position.
        first: Number of the first draw, counted from 0; a multiple of 4.
    """
    if first % _NUMBERS_IN_A_STEP:
        raise ValueError(f"a block must start at a multiple of {_NUMBERS_IN_A_STEP}, not {first}")
    stream(seed, position, VALUES, first // _NUMBERS_IN_A_STEP).random(out=out)
    np.maximum(out, _SMALLEST, out=out)


def fill_strata(out: FloatArray, seed: int, position: int) -> None:
    """Fills `out`, shape (draws,), with one uniform in each of as many equal strata, rising.

    The place inside its stratum has 24 random bits, so that it stays inside in double precision.
    """
    out[:] = stream(seed, position, VALUES).random(out.size, dtype=np.float32)
    out += _HALF_STEP
    out += np.arange(out.size)
    out /= out.size


def shuffle(out: FloatArray, seed: int, position: int) -> None:
    """Puts `out` into the input's own random order."""
    stream(seed, position, ORDER).shuffle(out)
