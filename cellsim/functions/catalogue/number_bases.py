"""Numbers written in other bases: two's complement of ten digits, and any base up to 36."""

from __future__ import annotations

import string

from cellsim.functions.registry import Number, Text, spreadsheet_function
from cellsim.values import ErrorValue, Fault

_NUM = ErrorValue.NUM
_DIGITS = string.digits + string.ascii_uppercase
_WIDTH = 10
"""Digits of a two's complement number in any of the three bases (ECMA-376 Part 1, BIN2DEC and others, from memory)."""

_LARGEST_EXACT = 2**53
_LONGEST = 255
_ADORNMENTS = {16: (("0x", "x"), "h"), 2: ((), "b")}
"""Marks that DECIMAL passes over before and behind the digits (OpenFormula 1.2, DECIMAL, from memory)."""


def _digits(value: int, base: int) -> str:
    """A number of at least 0 in a base of 2 to 36."""
    text = ""
    while value:
        value, digit = divmod(value, base)
        text = _DIGITS[digit] + text
    return text or "0"


def _value(text: str, base: int) -> int:
    """The number that digits stand for; 0 for none.

    Raises:
        Fault: A character is no digit of the base (#NUM!).
    """
    value = 0
    for character in text.upper():
        digit = _DIGITS.find(character)
        if not 0 <= digit < base:
            raise Fault(_NUM)
        value = value * base + digit
    return value


def _read(text: str, base: int) -> int:
    """The number that at most ten digits stand for, the highest half being negative."""
    if len(text) > _WIDTH:
        raise Fault(_NUM)
    value, period = _value(text, base), base**_WIDTH
    return value - period if value >= period // 2 else value


def _write(value: int, base: int, places: float | None) -> str:
    """A number as at most ten digits, filled up with zeros to so many places unless it is negative."""
    period = base**_WIDTH
    if places is not None and not 1 <= int(places) <= _WIDTH:
        raise Fault(_NUM)
    if not -period // 2 <= value < period // 2:
        raise Fault(_NUM)
    if value < 0:
        return _digits(value + period, base)
    text = _digits(value, base)
    if places is None:
        return text
    if len(text) > int(places):
        raise Fault(_NUM)
    return text.zfill(int(places))


@spreadsheet_function("BIN2DEC", strict=True)
def binary_to_decimal(number: Text) -> float:
    """The number that binary digits stand for."""
    return float(_read(number, 2))


@spreadsheet_function("BIN2OCT", strict=True)
def binary_to_octal(number: Text, places: Number | None = None) -> str:
    """A binary number in octal digits."""
    return _write(_read(number, 2), 8, places)


@spreadsheet_function("BIN2HEX", strict=True)
def binary_to_hexadecimal(number: Text, places: Number | None = None) -> str:
    """A binary number in hexadecimal digits."""
    return _write(_read(number, 2), 16, places)


@spreadsheet_function("OCT2DEC", strict=True)
def octal_to_decimal(number: Text) -> float:
    """The number that octal digits stand for."""
    return float(_read(number, 8))


@spreadsheet_function("OCT2BIN", strict=True)
def octal_to_binary(number: Text, places: Number | None = None) -> str:
    """An octal number in binary digits."""
    return _write(_read(number, 8), 2, places)


@spreadsheet_function("OCT2HEX", strict=True)
def octal_to_hexadecimal(number: Text, places: Number | None = None) -> str:
    """An octal number in hexadecimal digits."""
    return _write(_read(number, 8), 16, places)


@spreadsheet_function("HEX2DEC", strict=True)
def hexadecimal_to_decimal(number: Text) -> float:
    """The number that hexadecimal digits stand for."""
    return float(_read(number, 16))


@spreadsheet_function("HEX2BIN", strict=True)
def hexadecimal_to_binary(number: Text, places: Number | None = None) -> str:
    """A hexadecimal number in binary digits."""
    return _write(_read(number, 16), 2, places)


@spreadsheet_function("HEX2OCT", strict=True)
def hexadecimal_to_octal(number: Text, places: Number | None = None) -> str:
    """A hexadecimal number in octal digits."""
    return _write(_read(number, 16), 8, places)


@spreadsheet_function("DEC2BIN", strict=True)
def decimal_to_binary(number: Number, places: Number | None = None) -> str:
    """A whole number in binary digits."""
    return _write(int(number), 2, places)


@spreadsheet_function("DEC2OCT", strict=True)
def decimal_to_octal(number: Number, places: Number | None = None) -> str:
    """A whole number in octal digits."""
    return _write(int(number), 8, places)


@spreadsheet_function("DEC2HEX", strict=True)
def decimal_to_hexadecimal(number: Number, places: Number | None = None) -> str:
    """A whole number in hexadecimal digits."""
    return _write(int(number), 16, places)


@spreadsheet_function("BASE")
def in_base(number: Number, radix: Number, length: Number = 0.0) -> str:
    """A whole number in the digits of a base from 2 to 36, with at least so many of them."""
    if not 0 <= int(number) < _LARGEST_EXACT or not 0 <= int(length) <= _LONGEST:
        raise Fault(_NUM)
    return _digits(int(number), _radix(radix)).zfill(int(length))


@spreadsheet_function("DECIMAL")
def from_base(text: Text, radix: Number) -> float:
    """The number that digits of a base from 2 to 36 stand for."""
    base = _radix(radix)
    if len(text) > _LONGEST:
        raise Fault(ErrorValue.VALUE)
    digits = text.strip(" \t").lower()
    prefixes, suffix = _ADORNMENTS.get(base, ((), ""))
    for prefix in prefixes:
        if digits.startswith(prefix):
            digits = digits.removeprefix(prefix)
            break
    else:
        digits = digits.removesuffix(suffix) if suffix else digits
    return float(_value(digits, base))


def _radix(radix: float) -> int:
    if not 2 <= int(radix) <= len(_DIGITS):
        raise Fault(_NUM)
    return int(radix)
