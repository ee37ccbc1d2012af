"""Linear least squares with one or more variables, for TREND, LINEST and their kin.

Solved by the QR decomposition (Golub 1965) of the columns less their means.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from cellsim.values import Array, ErrorValue, Fault, Scalar

FloatArray = npt.NDArray[np.float64]
_RANK_TOLERANCE = 1e-12


def refuse_errors(*items: Scalar) -> None:
    """Refuse errors among the data of statistics that take pairs or samples.

    Raises:
        Fault: The first error among them; #NUM! in place of #NULL!, as stored values show.
    """
    for item in items:
        if isinstance(item, ErrorValue):
            raise Fault(ErrorValue.NUM if item is ErrorValue.NULL else item)


def paired_numbers(first: Array, second: Array) -> tuple[list[float], list[float]]:
    """The pairs of which both are numbers.

    Raises:
        Fault: Different lengths (#N/A), or an error among them.
    """
    if len(first.items) != len(second.items):
        raise Fault(ErrorValue.NA)
    x: list[float] = []
    y: list[float] = []
    for a, b in zip(first.items, second.items, strict=True):
        refuse_errors(a, b)
        if type(a) is float and type(b) is float:
            x.append(a)
            y.append(b)
    return x, y


def _numbers(values: Array) -> list[float]:
    for item in values.items:
        if type(item) is not float:  # an error among the data too, as stored values show
            raise Fault(ErrorValue.VALUE)
    return [item for item in values.items if type(item) is float]


@dataclass(frozen=True, slots=True)
class Fit:
    """A fitted line.

    Attributes:
        variables: Number of variables.
        by_row: Whether each row of the known x is a variable and not each column.
        coefficients: One a variable.
        constant: The value at zero.
        has_constant: Whether the constant was fitted.
        errors: Standard errors of the coefficients and, last, of the constant; NaN if there is none.
        freedom: Degrees of freedom.
        explained: Sum of squares explained.
        left: Sum of squares left.
    """

    variables: int
    by_row: bool
    coefficients: FloatArray
    constant: float
    has_constant: bool
    errors: FloatArray
    freedom: int
    explained: float
    left: float

    def rows_of(self, values: Array) -> list[list[float]]:
        """New places, one list of variables each.

        Raises:
            Fault: The shape does not fit (#REF!), or an item is no number.
        """
        numbers = _numbers(values)
        if self.variables == 1:
            return [[number] for number in numbers]
        table = np.array(numbers).reshape(values.rows, values.columns)
        rows = table.T if self.by_row else table
        if rows.shape[1] != self.variables:
            raise Fault(ErrorValue.REF)
        return [[float(x) for x in row] for row in rows]

    def at(self, rows: list[list[float]]) -> list[float]:
        """The line's values at places."""
        return [
            self.constant
            + math.fsum(c * x for c, x in zip(self.coefficients.tolist(), row, strict=True))
            for row in rows
        ]

    def table(self, *, more: bool) -> Array:
        """The coefficients, last variable first, then the constant; with more, four rows of statistics."""
        top: list[Scalar] = [*self.coefficients[::-1].tolist(), self.constant]
        if not more:
            return Array(1, len(top), top)
        total = self.explained + self.left
        spread: list[Scalar] = [
            *(_number(error) for error in self.errors[-2::-1].tolist()),
            _number(float(self.errors[-1])) if self.has_constant else ErrorValue.NA,
        ]
        ratio: Scalar = ErrorValue.NUM
        if self.freedom > 0 and self.left > 0:
            ratio = self.explained / self.variables / (self.left / self.freedom)
        about = math.sqrt(self.left / self.freedom) if self.freedom > 0 else 0.0
        rest: list[Scalar] = [ErrorValue.NA] * (len(top) - 2)
        rows: list[list[Scalar]] = [
            top,
            spread,
            [self.explained / total if total else 1.0, about, *rest],
            [ratio, float(self.freedom), *rest],
            [self.explained, self.left, *rest],
        ]
        return Array.from_rows(rows)


def _number(value: float) -> Scalar:
    return value if math.isfinite(value) else ErrorValue.NUM


def fit_line(known_y: Array, known_x: Array | None, *, constant: bool) -> Fit:
    """Fit a line by least squares.

    Args:
        known_y: The values.
        known_x: Their places: of the same shape, or a table with one column (or row) a variable; 1, 2,
            3, ... if None.
        constant: Whether the value at zero is fitted or held at zero.

    Raises:
        Fault: Shapes that do not fit (#REF!), items that are no numbers.
    """
    y = np.array(_numbers(known_y))
    by_row = known_y.rows == 1 and known_y.columns > 1
    if known_x is None:
        x = np.arange(1.0, len(y) + 1)[:, None]
    else:
        x = np.array(_numbers(known_x)).reshape(known_x.rows, known_x.columns)
        if x.size == len(y):
            x = x.reshape(-1, 1)
        elif by_row:
            x = x.T
        if x.shape[0] != len(y):
            raise Fault(ErrorValue.REF)
    centre = x.mean(axis=0) if constant else np.zeros(x.shape[1])
    middle = float(y.mean()) if constant else 0.0
    return _solve(x - centre, y - middle, centre, middle, constant=constant, by_row=by_row)


def _solve(
    x: FloatArray, y: FloatArray, centre: FloatArray, middle: float, *, constant: bool, by_row: bool
) -> Fit:
    variables = x.shape[1]
    kept = _independent(x)
    coefficients = np.zeros(variables)
    errors = np.zeros(variables + 1)
    freedom = len(y) - len(kept) - int(constant)
    spread = np.zeros((0, 0))
    if kept:
        q, r = np.linalg.qr(x[:, kept])
        coefficients[kept] = np.linalg.solve(r, q.T @ y)
        inverse = np.linalg.inv(r)
        spread = inverse @ inverse.T
    left = float(((y - x @ coefficients) ** 2).sum())
    explained = max(0.0, float((y**2).sum()) - left)
    variance = left / freedom if freedom > 0 else 0.0
    if kept:
        errors[kept] = np.sqrt(variance * np.diag(spread))
    at_zero = float(centre[kept] @ spread @ centre[kept]) if kept else 0.0
    errors[-1] = math.sqrt(variance * (1 / len(y) + at_zero)) if constant else math.nan
    start = middle - float(centre @ coefficients) if constant else 0.0
    return Fit(variables, by_row, coefficients, start, constant, errors, freedom, explained, left)


def _independent(x: FloatArray) -> list[int]:
    """Variables that are no combination of those before them; the others get the coefficient 0."""
    kept: list[int] = []
    for column in range(x.shape[1]):
        rest = x[:, column].copy()
        size = float(np.linalg.norm(rest))
        if kept:
            q, _ = np.linalg.qr(x[:, kept])
            rest -= q @ (q.T @ rest)
        if size > 0 and float(np.linalg.norm(rest)) > size * _RANK_TOLERANCE:
            kept.append(column)
    return kept
