"""The order and the sameness of values for sorting and grouping.

Numbers come before text, text before logicals, logicals before errors, errors by their number (that
of ERROR.TYPE, ECMA-376 Part 1, 18.17.7.103); blanks come last in either direction; text is taken
without regard to case. That of the types is common practice, no source, and is what stored values show.
Numbers are told apart exactly here: only an exact order is transitive.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeAlias

from cellsim.values import ErrorValue, Scalar

ValueKey: TypeAlias = tuple[int, float | str]

_NUMBER, _TEXT, _LOGICAL, _ERROR, _BLANK = range(5)
_ERROR_PLACES = {error: float(place) for place, error in enumerate(ErrorValue)}


def value_key(value: Scalar) -> ValueKey:
    """What orders a value; the keys of two values are equal when they count as the same."""
    if type(value) is float:
        return (_NUMBER, value)
    if isinstance(value, str):
        return (_TEXT, value.casefold())
    if isinstance(value, bool):
        return (_LOGICAL, float(value))
    if isinstance(value, ErrorValue):
        return (_ERROR, _ERROR_PLACES[value])
    return (_BLANK, 0.0)


def is_blank_key(key: ValueKey) -> bool:
    """Whether a key is that of a blank."""
    return key[0] == _BLANK


def sorted_places(
    count: int, keys: Sequence[tuple[Sequence[ValueKey], bool]], places: Sequence[int] | None = None
) -> list[int]:
    """The places of items in order; items whose keys are all equal keep their order.

    Args:
        count: How many items there are.
        keys: From the first key to the last: the key of each item, and whether it descends.
        places: The places to be ordered; all of them where it is left out.
    """
    order = list(range(count)) if places is None else list(places)
    for column, descending in reversed(keys):
        filled = [place for place in order if not is_blank_key(column[place])]
        blank = [place for place in order if is_blank_key(column[place])]
        filled.sort(key=column.__getitem__, reverse=descending)
        order = filled + blank
    return order
