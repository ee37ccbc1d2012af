"""Running a program over many draws: in blocks, on several threads, with bounded memory."""

from __future__ import annotations

import os
import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import FIRST_EXCEPTION, ThreadPoolExecutor, wait

import numpy as np
import numpy.typing as npt

from cellsim.program.buffers import plan_buffers
from cellsim.program.calculation import Calculation
from cellsim.program.ir import Program
from cellsim.program.numpy_backend import BlockEvaluator

FloatArray = npt.NDArray[np.float64]
Progress = Callable[[int], None]

_STEP = 512
"""Blocks are multiples of this, so that every draw is treated alike by vector instructions."""
_SMALLEST_BLOCK = 512
_LARGEST_BLOCK = 32_768
_BUFFER_BYTES = 64 * 2**20
"""What the buffers of one thread may take; larger ones fall out of the processor's caches."""
_FEWEST_FOR_THREADS = 8_192
"""With smaller blocks, threads wait longer for each other than their steps take."""
_ONE_THREAD_BLOCK = 4_096
_ONE_THREAD_BYTES = 256 * 2**20
"""Where one thread works alone its blocks may be larger: fewer steps outweigh the caches."""


class BlockEngine:
    """Evaluates one program over draws; keeps its evaluators for the next call.

    Attributes:
        threads: How many threads work.
        block: The most draws in a block.
    """

    def __init__(
        self,
        program: Program,
        base: Calculation,
        *,
        threads: int | None = None,
        block: int | None = None,
    ) -> None:
        self._program = program
        self._base = base
        self.block = block_size(program) if block is None else rounded_block(block)
        useful = available_cores() if self.block >= _FEWEST_FOR_THREADS else 1
        self.threads = max(1, threads if threads is not None else useful)
        self._idle: list[BlockEvaluator] = []
        self._lock = threading.Lock()
        self.unsettled = 0

    def run(self, draws: Sequence[FloatArray], progress: Progress | None = None) -> FloatArray:
        """Evaluate every draw.

        Args:
            draws: The inputs' values, each of shape (draws,).
            progress: Called with the number of draws that have been done since its last call; from
                any thread, one call at a time.

        Returns:
            Shape (outputs, draws); failed draws are NaN whose payload names the error.
        """
        count = len(draws[0])
        out = np.empty((len(self._program.outputs), count))
        block = self._block_for(count)
        starts = iter(range(0, count, block))
        workers = min(self.threads, -(-count // block))
        self._idle = [evaluator for evaluator in self._idle if evaluator.block == block]
        stop = threading.Event()
        self.unsettled = 0
        if workers <= 1:
            self._work(draws, out, starts, block, stop, progress)
            return out
        with ThreadPoolExecutor(workers) as pool:
            futures = [
                pool.submit(self._work, draws, out, starts, block, stop, progress)
                for _ in range(workers)
            ]
            try:
                wait(futures, return_when=FIRST_EXCEPTION)
            finally:
                stop.set()
            for future in futures:
                future.result()
        return out

    def _work(
        self,
        draws: Sequence[FloatArray],
        out: FloatArray,
        starts: Iterator[int],
        block: int,
        stop: threading.Event,
        progress: Progress | None,
    ) -> None:
        evaluator = self._take_evaluator(block)
        try:
            while not stop.is_set():
                with self._lock:
                    start = next(starts, None)
                if start is None:
                    break
                end = min(start + block, out.shape[1])
                evaluator.evaluate([values[start:end] for values in draws], out[:, start:end])
                if progress is not None:
                    with self._lock:
                        progress(end - start)
        finally:
            with self._lock:
                self.unsettled += evaluator.unsettled
                evaluator.unsettled = 0
                self._idle.append(evaluator)

    def _block_for(self, count: int) -> int:
        """A block such that threads have equal shares; a last block's empty places cost time."""
        pieces = -(-count // self.block)
        if self.threads > 1 and (pieces > 1 or count >= 2 * _FEWEST_FOR_THREADS):
            pieces = -(-pieces // self.threads) * self.threads
        return rounded_block(-(-count // pieces))

    def _take_evaluator(self, block: int) -> BlockEvaluator:
        with self._lock:
            if self._idle:
                return self._idle.pop()
        return BlockEvaluator(self._program, self._base, block)


def available_cores() -> int:
    """The processor cores that this process may use."""
    affinity = getattr(os, "sched_getaffinity", None)
    return len(affinity(0)) if affinity is not None else os.cpu_count() or 1


def rounded_block(draws: int) -> int:
    """A block of about so many draws."""
    return max(_STEP, -(-draws // _STEP) * _STEP)


def block_size(program: Program) -> int:
    """Draws in a block such that all buffers stay within their share of memory."""
    draw_bytes = 8 * (sum(plan_buffers(program).counts.values()) or 1)
    block = min(_LARGEST_BLOCK, _BUFFER_BYTES // draw_bytes)
    if block < _FEWEST_FOR_THREADS:
        block = min(_ONE_THREAD_BLOCK, _ONE_THREAD_BYTES // draw_bytes)
    return max(_SMALLEST_BLOCK, block // _STEP * _STEP)
