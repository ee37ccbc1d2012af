"""Finding a key among values: first equal, binary search, next smaller or larger.

Approximate matching is a binary search even on unsorted data, as spreadsheet programs do it: values of
another type than the key's are passed over, and of equal values the last is taken (ECMA-376 Part 1,
MATCH, for sorted data; the rest common practice, no source). That is so in MATCH and its like; the newer
XMATCH and XLOOKUP order values of all types, as stored values show.
"""

from __future__ import annotations

from cellsim.functions.comparison import compare, same_type
from cellsim.functions.value_order import value_key
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
        order = compare(items[probe], key)
        if order == 0:
            return _last_equal(key, items, probe)
        if order < 0:
            found = probe
            low = probe + 1
        else:
            high = middle - 1
    return found


def _last_equal(key: Scalar, items: list[Scalar], place: int) -> int:
    """The last of the equal items that stand in a row from a place on."""
    while (
        place + 1 < len(items)
        and _comparable(items[place + 1], key)
        and compare(items[place + 1], key) == 0
    ):
        place += 1
    return place


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
    """The place of an equal item, else of the next larger or smaller one, on unsorted items.

    Items of another type count by the order of types; a blank key comes after all.
    """
    equal = find_equal(key, items, wildcards=False, last=last) if key is not None else None
    if equal is not None:
        return equal
    wanted = value_key(key)
    best: int | None = None
    best_key = wanted
    places = range(len(items) - 1, -1, -1) if last else range(len(items))
    for place in places:
        if items[place] is None or isinstance(items[place], ErrorValue):
            continue
        found = value_key(items[place])
        if found == wanted or (found > wanted) != larger:
            continue
        if best is None or (found < best_key if larger else found > best_key):
            best, best_key = place, found
    return best


def find_by_halves(key: Scalar, items: list[Scalar], mode: int, *, descending: bool) -> int | None:
    """The place of an item by binary search, which trusts that the items are in order.

    Args:
        key: What to find.
        items: The items; on others than ordered ones the result is what the halving meets.
        mode: 0 for an equal item only, -1 or 1 for the next smaller or larger one otherwise.
        descending: Whether the items descend.
    """
    wanted = value_key(key)
    low, high = 0, len(items) - 1
    while low <= high:
        middle = (low + high) // 2
        found = value_key(items[middle])
        if found == wanted or (found[0] == wanted[0] and compare(items[middle], key) == 0):
            return middle
        if (found < wanted) != descending:
            low = middle + 1
        else:
            high = middle - 1
    if mode == 0:
        return None
    place = low if (mode > 0) != descending else high
    return place if 0 <= place < len(items) else None


def _comparable(item: Scalar, key: Scalar) -> bool:
    return not isinstance(item, ErrorValue) and same_type(item, key)


def line_of(values: Array) -> list[Scalar] | None:
    """The items of a single row or column, None for another shape."""
    return values.items if 1 in (values.rows, values.columns) else None
