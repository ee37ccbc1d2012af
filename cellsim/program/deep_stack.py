"""Room for deep recursion, for the rare chain of formulas that needs it."""

from __future__ import annotations

import sys
import threading
from collections.abc import Callable

from cellsim.errors import ModelError

_STACK_BYTES = 512 * 2**20
_DEEPEST = 150_000
_lock = threading.Lock()


def run_deeply(work: Callable[[], None]) -> None:
    """Run something with a large stack; whatever it raises is raised here.

    Raises:
        ModelError: Even that is not enough.
    """
    raised: list[BaseException] = []

    def target() -> None:
        try:
            work()
        except BaseException as error:  # noqa: BLE001  (handed to the caller below)
            raised.append(error)

    with _lock:
        limit, size = sys.getrecursionlimit(), threading.stack_size(_STACK_BYTES)
        sys.setrecursionlimit(max(limit, _DEEPEST))
        try:
            thread = threading.Thread(target=target, name="deep formulas")
            thread.start()
            thread.join()
        finally:
            threading.stack_size(size)
            sys.setrecursionlimit(limit)
    if raised and isinstance(raised[0], RecursionError):
        raise ModelError(
            "formulas depend on each other through computed references too deeply to be followed"
        )
    if raised:
        raise raised[0]
