"""Complex numbers kept as text."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Iterator

from cellsim.functions.complex_text import Complex, common_unit, complex_text, to_complex
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    ComplexNumber,
    Context,
    Number,
    Operand,
    Text,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, Reference, Value

_NUM = ErrorValue.NUM
_VALUE = ErrorValue.VALUE
_FAR = 300.0
"""Imaginary parts beyond this: the hyperbolic functions of their doubles near overflow."""


@spreadsheet_function("COMPLEX", strict=True)
def complex_number(real: Number, imaginary: Number, unit: Text = "i") -> str:
    """The complex number of a real and an imaginary part, with the unit i or j."""
    if unit not in {"", "i", "j"}:
        raise Fault(_VALUE)
    return complex_text(complex(real, imaginary), unit)


@spreadsheet_function("IMREAL", strict=True)
def real_part(number: ComplexNumber) -> float:
    """The real part of a complex number."""
    return number.value.real


@spreadsheet_function("IMAGINARY", strict=True)
def imaginary_part(number: ComplexNumber) -> float:
    """The imaginary part of a complex number."""
    return number.value.imag


@spreadsheet_function("IMABS", strict=True)
def modulus(number: ComplexNumber) -> float:
    """The absolute value of a complex number."""
    return abs(number.value)


@spreadsheet_function("IMARGUMENT", strict=True)
def argument(number: ComplexNumber) -> float:
    """The angle of a complex number in radians."""
    if number.value == 0:
        raise Fault(ErrorValue.DIV0)
    return cmath.phase(number.value)


@spreadsheet_function("IMCONJUGATE", strict=True)
def conjugate(number: ComplexNumber) -> str:
    """The conjugate of a complex number."""
    return complex_text(number.value.conjugate(), number.unit)


def _mapped(number: Complex, mapping: Callable[[complex], complex]) -> str:
    """A function of a complex number as text; where it has a pole or no finite value, #NUM!."""
    try:
        return complex_text(mapping(number.value), number.unit)
    except (OverflowError, ValueError, ZeroDivisionError):
        raise Fault(_NUM) from None


def _logarithm(value: complex) -> complex:
    if value == 0:
        raise Fault(_NUM)
    return cmath.log(value)


def _power(value: complex, exponent: float) -> complex:
    """A power in polar form, as spreadsheet programs take it: i to the 2nd keeps its tiny imaginary part."""
    if value == 0:
        if exponent > 0:
            return 0j
        raise Fault(_NUM)
    return cmath.rect(math.pow(abs(value), exponent), cmath.phase(value) * exponent)


def _squared_sine(z: complex) -> float:
    """The square of the modulus of sin z (DLMF section 4.21, from memory)."""
    if abs(z.imag) > 1:
        return (math.cosh(2 * z.imag) - math.cos(2 * z.real)) / 2
    return math.sin(z.real) ** 2 + math.sinh(z.imag) ** 2  # where the difference would cancel


def _squared_cosine(z: complex) -> float:
    """The square of the modulus of cos z (DLMF section 4.21, from memory)."""
    if abs(z.imag) > 1:
        return (math.cosh(2 * z.imag) + math.cos(2 * z.real)) / 2
    return math.cos(z.real) ** 2 + math.sinh(z.imag) ** 2


# In these forms real and imaginary part keep all their digits; far from the real axis, where their
# squares overflow, quotients take their place.


def _tangent(z: complex) -> complex:
    if abs(z.imag) > _FAR:
        return cmath.tan(z)
    size = 2 * _squared_cosine(z)
    return complex(math.sin(2 * z.real) / size, math.sinh(2 * z.imag) / size)


def _cotangent(z: complex) -> complex:
    if abs(z.imag) > _FAR:
        return 1 / cmath.tan(z)
    size = 2 * _squared_sine(z)
    return complex(math.sin(2 * z.real) / size, -math.sinh(2 * z.imag) / size)


def _secant(z: complex) -> complex:
    if abs(z.imag) > _FAR:
        return 1 / cmath.cos(z)
    size = _squared_cosine(z)
    x, y = z.real, z.imag
    return complex(math.cos(x) * math.cosh(y) / size, math.sin(x) * math.sinh(y) / size)


def _cosecant(z: complex) -> complex:
    if abs(z.imag) > _FAR:
        return 1 / cmath.sin(z)
    size = _squared_sine(z)
    x, y = z.real, z.imag
    return complex(math.sin(x) * math.cosh(y) / size, -math.cos(x) * math.sinh(y) / size)


@spreadsheet_function("IMSQRT", strict=True)
def square_root(number: ComplexNumber) -> str:
    """The square root of a complex number."""
    return _mapped(number, lambda z: _power(z, 0.5))


@spreadsheet_function("IMPOWER", strict=True)
def power(number: ComplexNumber, exponent: Number) -> str:
    """A complex number raised to a real power."""
    return _mapped(number, lambda z: _power(z, exponent))


@spreadsheet_function("IMEXP", strict=True)
def exponential(number: ComplexNumber) -> str:
    """The exponential of a complex number."""
    return _mapped(number, cmath.exp)


@spreadsheet_function("IMLN", strict=True)
def natural_logarithm(number: ComplexNumber) -> str:
    """The natural logarithm of a complex number."""
    return _mapped(number, _logarithm)


@spreadsheet_function("IMLOG10", strict=True)
def decimal_logarithm(number: ComplexNumber) -> str:
    """The logarithm of a complex number to the base 10."""
    return _mapped(number, lambda z: _logarithm(z) / math.log(10))


@spreadsheet_function("IMLOG2", strict=True)
def binary_logarithm(number: ComplexNumber) -> str:
    """The logarithm of a complex number to the base 2."""
    return _mapped(number, lambda z: _logarithm(z) / math.log(2))


@spreadsheet_function("IMSIN", strict=True)
def sine(number: ComplexNumber) -> str:
    """The sine of a complex number."""
    return _mapped(number, cmath.sin)


@spreadsheet_function("IMCOS", strict=True)
def cosine(number: ComplexNumber) -> str:
    """The cosine of a complex number."""
    return _mapped(number, cmath.cos)


@spreadsheet_function("IMTAN", strict=True)
def tangent(number: ComplexNumber) -> str:
    """The tangent of a complex number."""
    return _mapped(number, _tangent)


@spreadsheet_function("IMCOT", strict=True)
def cotangent(number: ComplexNumber) -> str:
    """The cotangent of a complex number."""
    return _mapped(number, _cotangent)


@spreadsheet_function("IMSEC", strict=True)
def secant(number: ComplexNumber) -> str:
    """The secant of a complex number."""
    return _mapped(number, _secant)


@spreadsheet_function("IMCSC", strict=True)
def cosecant(number: ComplexNumber) -> str:
    """The cosecant of a complex number."""
    return _mapped(number, _cosecant)


@spreadsheet_function("IMSINH", strict=True)
def hyperbolic_sine(number: ComplexNumber) -> str:
    """The hyperbolic sine of a complex number."""
    return _mapped(number, cmath.sinh)


@spreadsheet_function("IMCOSH", strict=True)
def hyperbolic_cosine(number: ComplexNumber) -> str:
    """The hyperbolic cosine of a complex number."""
    return _mapped(number, cmath.cosh)


@spreadsheet_function("IMSECH", strict=True)
def hyperbolic_secant(number: ComplexNumber) -> str:
    """The hyperbolic secant of a complex number."""
    return _mapped(number, lambda z: 1 / cmath.cosh(z))


@spreadsheet_function("IMCSCH", strict=True)
def hyperbolic_cosecant(number: ComplexNumber) -> str:
    """The hyperbolic cosecant of a complex number."""
    return _mapped(number, lambda z: 1 / cmath.sinh(z))


@spreadsheet_function("IMSUB", strict=True)
def difference(first: ComplexNumber, second: ComplexNumber) -> str:
    """The difference of two complex numbers."""
    return complex_text(first.value - second.value, common_unit([first, second], _NUM))


@spreadsheet_function("IMDIV", strict=True)
def quotient(dividend: ComplexNumber, divisor: ComplexNumber) -> str:
    """The quotient of two complex numbers."""
    unit = common_unit([dividend, divisor], _NUM)
    return _mapped(Complex(dividend.value, unit), lambda z: z / divisor.value)


@spreadsheet_function("IMSUM", least=1)
def total(context: Context, *numbers: Operand) -> str:
    """The sum of complex numbers."""
    items = list(_items(context, numbers))
    return complex_text(sum((item.value for item in items), 0j), common_unit(items, _VALUE))


@spreadsheet_function("IMPRODUCT", least=1)
def product(context: Context, *numbers: Operand) -> str:
    """The product of complex numbers."""
    items = list(_items(context, numbers))
    unit = common_unit(items, _VALUE)
    found = items[0].value if items else 0j
    for item in items[1:]:
        found *= item.value
    return complex_text(found, unit)


def _items(context: Context, numbers: tuple[Value, ...]) -> Iterator[Complex]:
    """The complex numbers of all arguments; blanks count as 0, but in ranges of several cells not."""
    for number in numbers:
        if isinstance(number, (Array, Reference)):
            items = values_of(number, context).items
            for item in items:
                if item is not None or len(items) == 1:
                    yield to_complex(item)
        else:
            yield to_complex(values_of(number, context).items[0])
