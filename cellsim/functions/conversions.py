"""From one unit of measurement to another."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from cellsim.functions.units import BINARY_PREFIXES, DECIMAL_PREFIXES, UNITS, Unit

_EXACT = 2**53


@dataclass(frozen=True, slots=True)
class Conversion:
    """How a number in one unit becomes the number in another: (x * factor + shift) / divisor.

    Factor and divisor are whole wherever both fit a float exactly, so that 3 feet are exactly 36 inches
    and 212 °F exactly 100 °C.
    """

    factor: float
    shift: float
    divisor: float


@lru_cache(maxsize=4096)
def find_conversion(from_unit: str, to_unit: str) -> Conversion | None:
    """The conversion between two units; None if one is unknown or they measure different things.

    Names are case-sensitive. A name that can be read in two ways (`pc` is a parsec, and a picocalorie)
    is read in the one that fits the other name, whole names before prefixed ones.
    """
    for source in _readings(from_unit):
        for target in _readings(to_unit):
            if source.quantity == target.quantity:
                return _between(source, target)
    return None


def _between(source: Unit, target: Unit) -> Conversion:
    ratio = source.size / target.size
    factor, divisor = Fraction(ratio.numerator), Fraction(ratio.denominator)
    if factor > _EXACT or divisor > _EXACT:
        factor, divisor = ratio, Fraction(1)
    shift = (source.zero - target.zero) / target.size * divisor
    return Conversion(float(factor), float(shift), float(divisor))


def _readings(name: str) -> Iterator[Unit]:
    """The units that a name can stand for."""
    if name in UNITS:
        yield UNITS[name]
    for prefix, exponent in DECIMAL_PREFIXES.items():
        unit = UNITS.get(name.removeprefix(prefix)) if name.startswith(prefix) else None
        if unit is not None and unit.prefix_power:
            power = Fraction(10) ** (exponent * unit.prefix_power)
            yield Unit(unit.quantity, unit.size * power)
    for prefix, exponent in BINARY_PREFIXES.items():
        unit = UNITS.get(name.removeprefix(prefix)) if name.startswith(prefix) else None
        if unit is not None and unit.binary:
            yield Unit(unit.quantity, unit.size * 2**exponent)
