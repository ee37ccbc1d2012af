"""Functions that the registry does not hold, borrowed one call at a time from the `formulas` library.

Only what depends on an uncertain input is evaluated so; other cells keep their stored value. The library
takes seconds to load, so it is imported when the first such function is met.
"""

from __future__ import annotations

import functools
import importlib
import warnings
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from cellsim.functions.text_limits import bounded
from cellsim.values import ERROR_BY_SPELLING, Array, ErrorValue, Scalar

BorrowedFunction = Callable[[Sequence[Scalar | Array]], Scalar | Array]
"""Takes the evaluated arguments, references replaced by their values."""

_NOT_FUNCTIONS = frozenset({"ARRAY", "ARRAYROW", "DUMMYFUNCTION", "SINGLE"})
"""Names under which the library keeps machinery of its own."""


@functools.lru_cache(maxsize=256)
def find_borrowed(name: str) -> BorrowedFunction | None:
    """The library's function of a name in upper case, without `_xlfn.`; None if it has none."""
    if name in _NOT_FUNCTIONS or name.startswith("_"):
        return None
    library = importlib.import_module("formulas")
    function = library.get_functions().get(name)
    return None if function is None else functools.partial(_call, function)


def _call(function: Callable[..., Any], arguments: Sequence[Scalar | Array]) -> Scalar | Array:
    """Call it; an argument that it cannot take gives #VALUE!, as it does in the library itself."""
    try:
        with warnings.catch_warnings(), np.errstate(all="ignore"):
            warnings.simplefilter("ignore")
            result = function(*(_lend(argument) for argument in arguments))
    except (ArithmeticError, AttributeError, LookupError, TypeError, ValueError):
        return ErrorValue.VALUE
    return _take_back(result)


def _lend(value: Scalar | Array) -> object:
    if isinstance(value, Array):
        rows = np.empty((value.rows, value.columns), dtype=object)
        rows[:] = [[_lend_scalar(item) for item in row] for row in value.to_rows()]
        return rows
    return _lend_scalar(value)


def _lend_scalar(value: Scalar) -> object:
    if isinstance(value, ErrorValue):
        errors = importlib.import_module("formulas.tokens.operand").Error.errors
        return errors.get(str(value), errors["#VALUE!"])
    if value is None:
        return importlib.import_module("schedula").EMPTY
    return value


def _take_back(result: object) -> Scalar | Array:
    grid = np.atleast_1d(np.asarray(result, dtype=object))
    if grid.ndim > 2 or grid.size == 0:
        return ErrorValue.VALUE
    rows = np.atleast_2d(grid)
    items = [_scalar(item) for item in rows.ravel()]
    return items[0] if len(items) == 1 else Array(rows.shape[0], rows.shape[1], items)


def _scalar(item: object) -> Scalar:
    if isinstance(item, (bool, np.bool_)):
        return bool(item)
    if isinstance(item, (int, float, np.number)):
        number = float(item)
        return number if np.isfinite(number) else ErrorValue.NUM
    error = ERROR_BY_SPELLING.get(str(item))
    if error is not None:
        return error
    if isinstance(item, str):
        return bounded(item)
    return None
