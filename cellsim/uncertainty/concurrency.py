"""Shares independent pieces of work between threads."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TypeAlias

Task: TypeAlias = Callable[[], None]


def run_tasks(tasks: Sequence[Task], threads: int) -> None:
    """Runs every task, in any order; raises what the first failing one raises.

    Args:
        tasks: Pieces of work none of which writes where another reads or writes.
        threads: How many run at once; 1 or less runs them here.
    """
    if threads <= 1 or len(tasks) <= 1:
        for task in tasks:
            task()
        return
    with ThreadPoolExecutor(threads) as pool:
        for future in [pool.submit(task) for task in tasks]:
            future.result()
