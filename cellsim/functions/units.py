"""Units of measurement by quantity, each with its exact size in the quantity's coherent SI unit.

Which names there are, and which of them take prefixes: ECMA-376 Part 1 section 18.17.7 (CONVERT) and,
for later additions, OpenFormula 1.2 (CONVERT), both from memory; stored values of spreadsheet programs confirm
every name but GRT and pond, and all prefixes but those of pond and m3 and the binary ones. Sizes, from
memory as well, agree with those stored values within 2e-15 relative:

- SI: BIPM, SI Brochure, 9th edition: hour, litre, hectare, and decimal prefixes (those before 2022).
- NIST: NIST Special Publication 811 (2008), appendix B: inch, pound, gallon, calorie, horsepower and
  others that are defined exactly, or here derived from those that are.
- CODATA 2006: electronvolt and atomic mass unit. Later values are more exact, but stored results of
  spreadsheet programs follow these.
- IEC 80000-13: binary prefixes.
- SV: read off stored values of spreadsheet programs, where these differ from a standard or none has it.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

DECIMAL_PREFIXES: dict[str, int] = {
    "Y": 24, "Z": 21, "E": 18, "P": 15, "T": 12, "G": 9, "M": 6, "k": 3, "h": 2, "da": 1, "e": 1,
    "d": -1, "c": -2, "m": -3, "u": -6, "n": -9, "p": -12, "f": -15, "a": -18, "z": -21, "y": -24,
}  # fmt: skip
"""Powers of ten (SI). That `e` stands beside `da` is the spreadsheet function's own (ECMA-376)."""

BINARY_PREFIXES: dict[str, int] = {
    "Yi": 80, "Zi": 70, "Ei": 60, "Pi": 50, "Ti": 40, "Gi": 30, "Mi": 20, "ki": 10,
}  # fmt: skip
"""Powers of two (IEC 80000-13), for information only."""


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit of measurement.

    Attributes:
        quantity: What it measures; only units of one quantity convert into each other.
        size: How many of the quantity's SI unit it is.
        zero: Where its zero stands in the SI unit: not at 0 for temperatures.
        prefix_power: To which power a decimal prefix is taken (2 for `km2`); 0 if it takes none.
        binary: Whether it takes binary prefixes.
    """

    quantity: str
    size: Fraction
    zero: Fraction = Fraction(0)
    prefix_power: int = 0
    binary: bool = False


UNITS: dict[str, Unit] = {}
"""Every unit by its name, without prefix."""


def _exact(size: Fraction | str | int) -> Fraction:
    return Fraction(size)


def _add(
    quantity: str,
    names: str,
    size: Fraction | str | int,
    *,
    zero: Fraction | str = "0",
    prefix: int = 0,
    binary: bool = False,
) -> None:
    for name in names.split():
        if name in UNITS:
            raise ValueError(f"the unit {name} is there twice")
        UNITS[name] = Unit(quantity, _exact(size), _exact(zero), prefix, binary)


def _add_powers(quantity: str, power: int) -> None:
    """The powers of lengths: `ft2`, `ft^2`. Only metre and ångström take prefixes there (SV)."""
    for name in ("m", "ang", "in", "ft", "yd", "mi", "Nmi", "ly", "Pica", "Picapt"):
        prefix = power if name in {"m", "ang"} else 0
        names = f"{name}{power} {name}^{power}"
        _add(quantity, names, UNITS[name].size ** power, prefix=prefix)


_GRAVITY = _exact("9.80665")  # standard acceleration, SI
_FOOT = _exact("0.3048")  # NIST
_INCH = _FOOT / 12
_POUND = _exact("0.45359237")  # NIST
_POUND_FORCE = _POUND * _GRAVITY
_SURVEY_FOOT = Fraction(1200, 3937)  # NIST
_LITRE = Fraction(1, 1000)
_GALLON = 231 * _INCH**3  # NIST
_IMPERIAL_GALLON = _exact("4.54609") * _LITRE  # NIST
_HORSEPOWER = 550 * _FOOT * _POUND_FORCE  # NIST
_HOUR = Fraction(3600)

# Mass, in kilograms.
_add("mass", "g", "0.001", prefix=1)
_add("mass", "sg", _POUND_FORCE / _FOOT)  # slug
_add("mass", "lbm", _POUND)
_add("mass", "u", "1.660538782e-27", prefix=1)  # CODATA 2006
_add("mass", "ozm", _POUND / 16)
_add("mass", "grain", _POUND / 7000)
_add("mass", "stone", 14 * _POUND)
_add("mass", "cwt shweight", 100 * _POUND)
_add("mass", "uk_cwt lcwt hweight", 112 * _POUND)
_add("mass", "ton", 2000 * _POUND)
_add("mass", "uk_ton LTON brton", 2240 * _POUND)

# Length, in metres.
_add("length", "m", 1, prefix=1)
_add("length", "in", _INCH)
_add("length", "ft", _FOOT)
_add("length", "yd", 3 * _FOOT)
_add("length", "mi", 5280 * _FOOT)
_add("length", "survey_mi", 5280 * _SURVEY_FOOT)
_add("length", "Nmi", 1852)  # SI
_add("length", "ang", "1e-10", prefix=1)  # SI Brochure, 8th edition
_add("length", "ell", 45 * _INCH)
_add("length", "ly", 299_792_458 * 31_557_600, prefix=1)  # speed of light in a Julian year
# SV: about 3e-11 off the present definition, which rests on the astronomical unit of 2012.
_add("length", "parsec pc", "3.08567758128155e16", prefix=1)
_add("length", "Pica Picapt", _INCH / 72)  # point, OpenFormula
_add("length", "pica", _INCH / 6)

# Time, in seconds.
_add("time", "s sec", 1, prefix=1)
_add("time", "mn min", 60)
_add("time", "hr", _HOUR)
_add("time", "d day", 86_400)
_add("time", "yr", 31_557_600)  # Julian year of 365.25 days

# Pressure, in pascals.
_add("pressure", "Pa p", 1, prefix=1)
_add("pressure", "atm at", 101_325, prefix=1)  # NIST
_add("pressure", "mmHg", "133.322", prefix=1)  # SV; NIST has 133.3224
_add("pressure", "psi", _POUND_FORCE / _INCH**2)
_add("pressure", "Torr", Fraction(101_325, 760))  # NIST

# Force, in newtons.
_add("force", "N", 1, prefix=1)
_add("force", "dyn dy", "1e-5", prefix=1)
_add("force", "lbf", _POUND_FORCE)
_add("force", "pond", _GRAVITY / 1000, prefix=1)  # gram-force, OpenFormula

# Energy, in joules.
_add("energy", "J", 1, prefix=1)
_add("energy", "e", "1e-7", prefix=1)  # erg
_add("energy", "c", "4.184", prefix=1)  # thermochemical calorie, NIST
_add("energy", "cal", "4.1868", prefix=1)  # International Table calorie, NIST
_add("energy", "eV ev", "1.602176487e-19", prefix=1)  # CODATA 2006
_add("energy", "HPh hh", _HORSEPOWER * _HOUR)
_add("energy", "Wh wh", _HOUR, prefix=1)
_add("energy", "flb", _FOOT * _POUND_FORCE)
_add("energy", "BTU btu", "1055.05585262")  # International Table, NIST

# Power, in watts.
_add("power", "W w", 1, prefix=1)
_add("power", "HP h", _HORSEPOWER)
_add("power", "PS", 75 * _GRAVITY)  # metric horsepower, NIST

# Magnetic flux density, in teslas.
_add("magnetism", "T", 1, prefix=1)
_add("magnetism", "ga", "1e-4", prefix=1)

# Temperature, in kelvins.
_add("temperature", "K kel", 1, prefix=1)
_add("temperature", "C cel", 1, zero="273.15")
_add("temperature", "F fah", Fraction(5, 9), zero=_exact("459.67") * Fraction(5, 9))
_add("temperature", "Rank", Fraction(5, 9))
_add("temperature", "Reau", Fraction(5, 4), zero="273.15")

# Volume, in cubic metres.
_add("volume", "l L lt", _LITRE, prefix=1)
_add("volume", "tsp", _GALLON / 768)
_add("volume", "tspm", 5 * _LITRE / 1000)
_add("volume", "tbs", _GALLON / 256)
_add("volume", "oz", _GALLON / 128)
_add("volume", "cup", _GALLON / 16)
_add("volume", "pt us_pt", _GALLON / 8)
_add("volume", "qt", _GALLON / 4)
_add("volume", "gal", _GALLON)
_add("volume", "uk_pt", _IMPERIAL_GALLON / 8, prefix=1)  # that it takes prefixes: SV
_add("volume", "uk_qt", _IMPERIAL_GALLON / 4)
_add("volume", "uk_gal", _IMPERIAL_GALLON)
_add("volume", "barrel", 42 * _GALLON)
_add("volume", "bushel", _exact("2150.42") * _INCH**3)  # NIST
_add("volume", "GRT regton", 100 * _FOOT**3)
_add("volume", "MTON", 40 * _FOOT**3)  # measurement ton
_add_powers("volume", 3)

# Area, in square metres.
_add("area", "uk_acre", 43_560 * _FOOT**2)
_add("area", "us_acre", 43_560 * _SURVEY_FOOT**2)
_add("area", "ar", 100, prefix=1)
_add("area", "ha", 10_000)
_add("area", "Morgen", 2500)  # OpenFormula
_add_powers("area", 2)

# Information, in bits.
_add("information", "bit", 1, prefix=1, binary=True)
_add("information", "byte", 8, prefix=1, binary=True)

# Speed, in metres a second.
_add("speed", "m/s m/sec", 1, prefix=1)
_add("speed", "m/h m/hr", 1 / _HOUR, prefix=1)
_add("speed", "mph", 5280 * _FOOT / _HOUR, prefix=1)  # that it takes prefixes: SV
_add("speed", "kn", 1852 / _HOUR)
_add("speed", "admkn", 6080 * _FOOT / _HOUR)  # admiralty knot
