"""Complex numbers as spreadsheets keep them: text such as `3-4i`, with i or j as imaginary unit."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from cellsim.functions.coercion import general_text
from cellsim.values import ErrorValue, Fault, Scalar

_DECIMAL = r"(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?"
_REAL = re.compile(rf"(?P<real>[-+]?{_DECIMAL})\Z")
_IMAGINARY = re.compile(rf"(?P<imaginary>[-+]?(?:{_DECIMAL})?)(?P<unit>[ij])\Z")
_BOTH = re.compile(rf"(?P<real>[-+]?{_DECIMAL})(?P<imaginary>[-+](?:{_DECIMAL})?)(?P<unit>[ij])\Z")


@dataclass(frozen=True, slots=True)
class Complex:
    """A complex number.

    Attributes:
        value: The number.
        unit: The letter of its imaginary unit, empty where it has no imaginary part.
    """

    value: complex
    unit: str


def to_complex(value: Scalar) -> Complex:
    """A scalar in a place for a complex number: numbers and blanks are real.

    Raises:
        Fault: It is an error, a logical (#VALUE!), or text that is no complex number (#NUM!).
    """
    if value is None:
        return Complex(0j, "")
    if isinstance(value, bool):
        raise Fault(ErrorValue.VALUE)
    if isinstance(value, float):
        return Complex(complex(value), "")
    if isinstance(value, ErrorValue):
        raise Fault(value)
    return _read(value)


def _read(text: str) -> Complex:
    match = _REAL.match(text)
    if match is not None:
        return Complex(complex(_finite(match["real"])), "")
    match = _IMAGINARY.match(text)
    if match is not None:
        return Complex(complex(0.0, _finite(match["imaginary"])), match["unit"])
    match = _BOTH.match(text)
    if match is None:
        raise Fault(ErrorValue.NUM)
    return Complex(complex(_finite(match["real"]), _finite(match["imaginary"])), match["unit"])


def _finite(text: str) -> float:
    number = float(text + "1" if text in {"", "+", "-"} else text)
    if not math.isfinite(number):
        raise Fault(ErrorValue.NUM)
    return number


def complex_text(value: complex, unit: str) -> str:
    """A complex number as text, each part with up to 15 significant digits.

    A part that is 0 is left out, and so is the 1 before the unit.

    Raises:
        Fault: A part is not finite (#NUM!).
    """
    if not (math.isfinite(value.real) and math.isfinite(value.imag)):
        raise Fault(ErrorValue.NUM)
    if value.imag == 0:
        return general_text(value.real)
    factor = general_text(value.imag)
    if factor in {"1", "-1"}:
        factor = factor[:-1]
    imaginary = factor + (unit or "i")
    if value.real == 0:
        return imaginary
    sign = "" if value.imag < 0 else "+"
    return general_text(value.real) + sign + imaginary


def common_unit(numbers: list[Complex], mixed: ErrorValue) -> str:
    """The imaginary unit that numbers share, empty if all are real.

    Raises:
        Fault: Some are written with i and some with j (the error that is to stand for it).
    """
    units = {number.unit for number in numbers} - {""}
    if len(units) > 1:
        raise Fault(mixed)
    return units.pop() if units else ""
