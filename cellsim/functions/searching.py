"""Finding a key among values: first equal, binary search, next smaller or larger.

Approximate matching is a binary search even on unsorted data, as spreadsheet programs do it: values of
another type than the key's are passed over, and of equal values the last is taken (ECMA-376 Part 1,
MATCH, for sorted data; the rest common practice, no source).
"""

from __future__ import annotations

from cellsim.functions.comparison import compare, same_type, type_rank
from cellsim.functions.wildcards import has_wildcards, wildcard_regex
from cellsim.values import Array, ErrorValue, Scalar


def find_equal(
    key: Scalar, items: list[Scalar], *, wildcards: bool = True, last: bool = False
) -> int | None:
    """The place, from 0, of the first (or last) item equal to a key; None if there is none."""
    places = range(len(items) - 1, -1, -1) if last else range(len(items))
    if isinstance(key, str) and wildcards and has_wildcards(key):
        matches = wildcard_regex(key).match
        for place in places:
            item = items[place]
            if isinstance(item, str) and matches(item):
                return place
        return None
    if type(key) is float:
        for place in places:
            item = items[place]
            if type(item) is float and (item == key or compare(item, key) == 0):
                return place
        return None
    for place in places:
        item = items[place]
        if same_type(item, key) and not isinstance(item, ErrorValue) and compare(item, key) == 0:
            return place
    return None


def find_at_most(key: Scalar, items: list[Scalar]) -> int | None:
    """The place of the last item not above a key, by binary search over ascending items."""
    low, high = 0, len(items) - 1
    found: int | None = None
    while low <= high:
        middle = (low + high) // 2
        probe = middle
        while probe <= high and not _comparable(items[probe], key):
            probe += 1
        if probe > high:
            high = middle - 1
            continue
        if compare(items[probe], key) <= 0:
            found = probe
            low = probe + 1
        else:
            high = middle - 1
    return found


def find_at_least_descending(key: Scalar, items: list[Scalar]) -> int | None:
    """The place of the last item not below a key among descending items."""
    found: int | None = None
    for place, item in enumerate(items):
        if not _comparable(item, key):
            continue
        order = compare(item, key)
        if order < 0:
            break
        found = place
        if order == 0:
            break
    return found


def find_nearest(
    key: Scalar, items: list[Scalar], *, larger: bool, last: bool = False
) -> int | None:
    """The place of an equal item, else of the next larger or smaller one of any type, unsorted."""
    equal = find_equal(key, items, wildcards=False, last=last)
    if equal is not None:
        return equal
    best: int | None = None
    places = range(len(items) - 1, -1, -1) if last else range(len(items))
    for place in places:
        item = items[place]
        if item is None or isinstance(item, ErrorValue):
            continue
        order = _order(item, key)
        if (order > 0) != larger or order == 0:
            continue
        if best is None or (
            (_order(item, items[best]) < 0) == larger and _order(item, items[best]) != 0
        ):
            best = place
    return best


def find_by_halving(key: Scalar, items: list[Scalar], *, mode: int, descending: bool) -> int | None:
    """The place at which a binary search ends, on items that need not be sorted.

    Args:
        key: What is looked for.
        items: The items.
        mode: 0 for an equal item, -1 or 1 for the next smaller or larger one where none is equal.
        descending: Whether the items count as sorted from the largest.
    """
    low, high = 0, len(items) - 1
    while low <= high:
        middle = (low + high) // 2
        order = _order(items[middle], key)
        if order == 0:
            return middle
        if (order < 0) != descending:
            low = middle + 1
        else:
            high = middle - 1
    if mode == 0:
        return None
    place = low if (mode > 0) != descending else low - 1
    return place if 0 <= place < len(items) else None


_AFTER_ALL = 3


def _order(item: Scalar, key: Scalar) -> int:
    """As `compare`, but blanks and errors come after everything else, as stored values show."""
    ranks = [
        _AFTER_ALL if value is None or isinstance(value, ErrorValue) else type_rank(value)
        for value in (item, key)
    ]
    if ranks[0] != ranks[1]:
        return -1 if ranks[0] < ranks[1] else 1
    return 0 if ranks[0] == _AFTER_ALL else compare(item, key)


def _comparable(item: Scalar, key: Scalar) -> bool:
    return not isinstance(item, ErrorValue) and same_type(item, key)


def line_of(values: Array) -> list[Scalar] | None:
    """The items of a single row or column, None for another shape."""
    return values.items if 1 in (values.rows, values.columns) else None
