"""Sums, products, powers, logarithms, factorials, divisors."""

from __future__ import annotations

import math

import numpy as np

from cellsim.functions.dispatch import values_of
from cellsim.functions.moments import total
from cellsim.functions.operators import power
from cellsim.functions.registry import (
    ArrayValues,
    Context,
    FloatArray,
    Number,
    NumberItems,
    Operand,
    Text,
    Whole,
    over_draws,
    spreadsheet_function,
)
from cellsim.values import Array, ErrorValue, Fault, encode_error

_LARGEST_EXACT = 2.0**53


@spreadsheet_function("SUM", least=1)
def add_up(*numbers: NumberItems) -> float:
    """The sum of numbers, from left to right."""
    total = 0.0
    for items in numbers:
        for number in items:
            total += number
    return total


@spreadsheet_function("PRODUCT", least=1)
def multiply(*numbers: NumberItems) -> float:
    """The product of numbers; 0 if there is none."""
    found = [number for items in numbers for number in items]
    return math.prod(found) if found else 0.0


@spreadsheet_function("SUMSQ", least=1)
def sum_of_squares(*numbers: NumberItems) -> float:
    """The sum of squares."""
    return total(number * number for items in numbers for number in items)


@spreadsheet_function("SUMPRODUCT", least=1)
def sum_of_products(*arrays: ArrayValues) -> float | ErrorValue:
    """The sum of the products of corresponding items; what is no number counts as 0."""
    shape = arrays[0].rows, arrays[0].columns
    if any((array.rows, array.columns) != shape for array in arrays):
        return ErrorValue.VALUE
    for array in arrays:
        for item in array.items:
            if isinstance(item, ErrorValue):
                return item
    total = 0.0
    for items in zip(*(array.items for array in arrays), strict=True):
        product = 1.0
        for item in items:
            product *= item if type(item) is float else 0.0
        total += product
    return total


def _pairs(x: Array, y: Array) -> list[tuple[float, float]]:
    if len(x.items) != len(y.items):
        raise Fault(ErrorValue.NA)
    pairs = []
    for a, b in zip(x.items, y.items, strict=True):
        for item in (a, b):
            if isinstance(item, ErrorValue):
                raise Fault(item)
        if type(a) is float and type(b) is float:
            pairs.append((a, b))
    if not pairs:
        raise Fault(ErrorValue.DIV0)
    return pairs


@spreadsheet_function("SUMX2MY2")
def sum_of_differences_of_squares(x: ArrayValues, y: ArrayValues) -> float:
    """The sum of x squared less y squared."""
    return total(a * a - b * b for a, b in _pairs(x, y))


@spreadsheet_function("SUMX2PY2")
def sum_of_sums_of_squares(x: ArrayValues, y: ArrayValues) -> float:
    """The sum of x squared plus y squared."""
    return total(a * a + b * b for a, b in _pairs(x, y))


@spreadsheet_function("SUMXMY2")
def sum_of_squared_differences(x: ArrayValues, y: ArrayValues) -> float:
    """The sum of squares of x less y."""
    return total((a - b) ** 2 for a, b in _pairs(x, y))


@spreadsheet_function("ABS")
def absolute(number: Number) -> float:
    """A number without its sign."""
    return abs(number)


@spreadsheet_function("SIGN")
def sign(number: Number) -> float:
    """1, 0 or -1."""
    return float((number > 0) - (number < 0))


@over_draws("SIGN")
def sign_over_draws(number: FloatArray) -> FloatArray:
    """SIGN over draws."""
    return np.sign(number)


@spreadsheet_function("SQRT")
def square_root(number: Number) -> float | ErrorValue:
    """The square root."""
    return math.sqrt(number) if number >= 0 else ErrorValue.NUM


@spreadsheet_function("SQRTPI")
def square_root_times_pi(number: Number) -> float | ErrorValue:
    """The square root of a number times pi."""
    return math.sqrt(number * math.pi) if number >= 0 else ErrorValue.NUM


@spreadsheet_function("EXP")
def exponential(number: Number) -> float:
    """E to a power."""
    return math.exp(number)


@spreadsheet_function("LN")
def natural_logarithm(number: Number) -> float | ErrorValue:
    """The natural logarithm."""
    return math.log(number) if number > 0 else ErrorValue.NUM


@spreadsheet_function("LOG10")
def decimal_logarithm(number: Number) -> float | ErrorValue:
    """The logarithm to base 10."""
    return math.log10(number) if number > 0 else ErrorValue.NUM


@over_draws("LOG10")
def decimal_logarithm_over_draws(number: FloatArray) -> FloatArray:
    """LOG10 over draws."""
    return np.where(np.asarray(number) > 0, np.log10(number), encode_error(ErrorValue.NUM))


@spreadsheet_function("LOG")
def logarithm(number: Number, base: Number = 10.0) -> float | ErrorValue:
    """The logarithm to a base."""
    if number <= 0 or base <= 0:
        return ErrorValue.NUM
    if base == 1:
        return ErrorValue.DIV0
    if base == 10:
        return math.log10(number)
    return math.log2(number) if base == 2 else math.log(number) / math.log(base)


@over_draws("LOG")
def logarithm_over_draws(number: FloatArray, base: FloatArray | float = 10.0) -> FloatArray:
    """LOG over draws."""
    numbers, bases = np.asarray(number, dtype=np.float64), np.asarray(base, dtype=np.float64)
    result = np.where(
        bases == 10,
        np.log10(numbers),
        np.where(bases == 2, np.log2(numbers), np.log(numbers) / np.log(bases)),
    )
    result = np.where(bases == 1, encode_error(ErrorValue.DIV0), result)
    return np.where((numbers <= 0) | (bases <= 0), encode_error(ErrorValue.NUM), result)


@spreadsheet_function("POWER")
def raise_to_power(base: Number, exponent: Number) -> float:
    """A number to a power."""
    return power(base, exponent)


@spreadsheet_function("PI")
def pi() -> float:
    """The ratio of a circle's circumference to its diameter."""
    return math.pi


def _whole_items(numbers: tuple[list[float], ...]) -> list[int]:
    whole = [int(number) for items in numbers for number in items]
    if not whole:
        raise Fault(ErrorValue.VALUE)
    if any(number < 0 or number >= _LARGEST_EXACT for number in whole):
        raise Fault(ErrorValue.NUM)
    return whole


@spreadsheet_function("GCD", least=1)
def greatest_common_divisor(*numbers: NumberItems) -> float:
    """The greatest common divisor."""
    return float(math.gcd(*_whole_items(numbers)))


@spreadsheet_function("LCM", least=1)
def least_common_multiple(*numbers: NumberItems) -> float | ErrorValue:
    """The least common multiple."""
    result = math.lcm(*_whole_items(numbers))
    return float(result) if result < _LARGEST_EXACT else ErrorValue.NUM


@spreadsheet_function("FACT")
def factorial(number: Whole) -> float | ErrorValue:
    """The factorial of a number cut to a whole one."""
    return float(math.factorial(number)) if 0 <= number <= 170 else ErrorValue.NUM


@spreadsheet_function("FACTDOUBLE")
def double_factorial(number: Whole) -> float | ErrorValue:
    """The product of every second whole number down from a number."""
    if number < -1 or number > 300:
        return ErrorValue.NUM
    return float(math.prod(range(number, 0, -2)))


def _choose(n: int, k: int) -> float:
    k = min(k, n - k)
    if n < 0 or k < 0 or k > _MOST_CHOSEN:
        raise Fault(ErrorValue.NUM)
    return float(math.comb(n, k))


_MOST_CHOSEN = 600
"""To choose more of as many or more is beyond the largest double, and would take for ever to find out."""


@spreadsheet_function("COMBIN")
def combinations(number: Whole, chosen: Whole) -> float:
    """The ways to choose some of a number of things."""
    return _choose(number, chosen)


@spreadsheet_function("COMBINA")
def combinations_with_repetition(number: Whole, chosen: Whole) -> float:
    """The ways to choose with repetition."""
    return 1.0 if number == chosen == 0 else _choose(number + chosen - 1, chosen)


@spreadsheet_function("PERMUT")
def permutations(number: Whole, chosen: Whole) -> float | ErrorValue:
    """The ways to choose some of a number of things in order."""
    if number < 0 or chosen < 0 or chosen > number or chosen > _MOST_CHOSEN:
        return ErrorValue.NUM
    return float(math.perm(number, chosen))


@spreadsheet_function("PERMUTATIONA")
def permutations_with_repetition(number: Whole, chosen: Whole) -> float | ErrorValue:
    """The ways to choose in order with repetition."""
    if number < 0 or chosen < 0:
        return ErrorValue.NUM
    if number > 1 and chosen * math.log2(number) > 1100:
        return ErrorValue.NUM  # beyond the largest double
    return float(number**chosen) if number != 1 else 1.0


@spreadsheet_function("MULTINOMIAL", least=1)
def multinomial(*numbers: NumberItems) -> float:
    """The factorial of a sum over the product of the factorials."""
    whole = _whole_items(numbers)
    result = 1
    for place, number in enumerate(whole):
        together = sum(whole[: place + 1])
        if min(number, together - number) > _MOST_CHOSEN:
            raise Fault(ErrorValue.NUM)
        result *= math.comb(together, number)
    return float(result)


@spreadsheet_function("SERIESSUM")
def power_series(
    context: Context, x: Number, first: Number, step: Number, coefficients: Operand
) -> float:
    """The sum of coefficients times rising powers of x."""
    total = 0.0
    for place, item in enumerate(values_of(coefficients, context).items):
        if isinstance(item, ErrorValue):
            raise Fault(item)
        if type(item) is not float:
            raise Fault(ErrorValue.VALUE)
        total += item * power(x, first + place * step)
    return total


_ROMAN = (
    (1000, "M"), (900, "CM"), (500, "D"), (400, "CD"), (100, "C"), (90, "XC"),
    (50, "L"), (40, "XL"), (10, "X"), (9, "IX"), (5, "V"), (4, "IV"), (1, "I"),
)  # fmt: skip
_CONCISE = (
    (((45, "VL"), (95, "VC"), (450, "LD"), (950, "LM"))),
    (((49, "IL"), (99, "IC"), (490, "XD"), (990, "XM"))),
    (((495, "VD"), (995, "VM"))),
    (((499, "ID"), (999, "IM"))),
)


@spreadsheet_function("ROMAN")
def roman_numeral(number: Whole, form: Whole = 0) -> str | ErrorValue:
    """A number in Roman numerals, more concise with a higher form."""
    if not 0 <= number <= 3999 or not 0 <= form <= 4:
        return ErrorValue.VALUE
    steps = sorted([*_ROMAN, *(step for steps in _CONCISE[:form] for step in steps)], reverse=True)
    text = ""
    for value, letters in steps:
        while number >= value:
            text += letters
            number -= value
    return text


@spreadsheet_function("ARABIC")
def arabic_number(text: Text) -> float | ErrorValue:
    """The number that Roman numerals stand for."""
    values = {"I": 1, "V": 5, "X": 10, "L": 50, "C": 100, "D": 500, "M": 1000}
    body = text.strip().upper()
    negative = body.startswith("-")
    digits = [values.get(letter) for letter in body.removeprefix("-")]
    if None in digits or len(text) > 255:
        return ErrorValue.VALUE
    known = [digit for digit in digits if digit is not None]
    total = 0
    for place, digit in enumerate(known):
        follows = known[place + 1] if place + 1 < len(known) else 0
        total += -digit if digit < follows else digit
    return float(-total if negative else total)
