"""What bounds arrays: how many items one may have, and how much text may lie in it.

A bound is checked before anything is made, so that a formula that asks for too much ends at once.
"""

from __future__ import annotations

from collections.abc import Iterable

from cellsim.values import Array, ErrorValue, Fault, Scalar

LARGEST_ARRAY = 20_000_000
"""More items than this in one array are refused with #NUM!, so that no formula fills the memory."""

LARGEST_MADE = 4_194_304
"""The same for an array larger than all that it is made of: four full columns of a sheet."""

MOST_TEXT = 67_108_864
"""The most characters of text that one operation puts into an array, likewise #NUM! beyond."""


def bounded_shape(rows: int, columns: int) -> tuple[int, int]:
    """The shape itself.

    Raises:
        Fault: An array made in this shape is too large (#NUM!).
    """
    if rows * columns > LARGEST_MADE:
        raise Fault(ErrorValue.NUM)
    return rows, columns


def bounded_growth(rows: int, columns: int, arrays: Iterable[Array]) -> tuple[int, int]:
    """The shape itself, for an array that is put together from others.

    Raises:
        Fault: It is too large, or large and larger than each of them (#NUM!).
    """
    size = rows * columns
    if size > LARGEST_ARRAY or (
        size > LARGEST_MADE and size > max(array.rows * array.columns for array in arrays)
    ):
        raise Fault(ErrorValue.NUM)
    return rows, columns


class TextBudget:
    """Counts the text that an operation puts into an array, item by item."""

    __slots__ = ("_left",)

    def __init__(self) -> None:
        self._left = MOST_TEXT

    def take(self, item: Scalar) -> Scalar:
        """The item itself.

        Raises:
            Fault: Together with those before it, it is too much text (#NUM!).
        """
        if type(item) is str:
            self._left -= len(item)
            if self._left < 0:
                raise Fault(ErrorValue.NUM)
        return item
