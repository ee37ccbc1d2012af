"""How the numbers of one quantity are written, in cells and in sentences."""

from __future__ import annotations

import math
from dataclasses import dataclass

from cellsim.functions.number_format import format_value
from cellsim.report.number_formats import (
    COUNT,
    GENERAL,
    SCIENTIFIC,
    finer_code,
    is_date_code,
    is_number_code,
    safe_code,
    suited_code,
    zero_showing_code,
)
from cellsim.report.plain_text import one_line

_DAYS = "#,##0.0"
_LONGEST = 14
_MINUS = "\u2212"
"""A minus that no line breaks after, as it may after a hyphen."""


@dataclass(frozen=True, slots=True)
class Scale:
    """How the numbers of one quantity are written.

    Attributes:
        code: Number format code of its values.
        mean_code: Code of means: whole numbers can have a mean between them.
        spread_code: Code of differences between values: days for dates.
        unit: Its unit, or "".
        digits: Decimals, perhaps negative, to which estimates are rounded in sentences, or None.
    """

    code: str
    mean_code: str
    spread_code: str
    unit: str
    digits: int | None = None

    def text(self, value: float | None) -> str:
        """A value as it is, with its unit, for a sentence."""
        return self._worded(value, self.code, self.unit)

    def bare_text(self, value: float) -> str:
        """A value without its unit, for a label."""
        return self._worded(value, self.code, "")

    def estimate_text(self, value: float | None, code: str = "") -> str:
        """An estimate, rounded to what the spread makes sense of, with its unit, for a sentence."""
        if value is not None and self.digits is not None and math.isfinite(value):
            value = round(value, self.digits)
        return self._worded(value, code or self.code, self.unit)

    def spread_text(self, value: float | None) -> str:
        """A difference between values with its unit, for a sentence."""
        code = self.spread_code if value is None else finer_code(self.spread_code, value)
        return self._worded(value, code, "days" if self.is_date else self.unit)

    @property
    def is_date(self) -> bool:
        """Whether the values are dates or times."""
        return is_date_code(self.code)

    @property
    def axis_code(self) -> str:
        """The code of an axis, whose labels are round: a scientific one with few digits."""
        return "0.0#E+00" if self.code == SCIENTIFIC else self.code

    @property
    def title(self) -> str:
        """The unit as an axis title shows it: `, EUR`, or ""."""
        unit = one_line(self.unit, 24)
        return f", {unit}" if unit else ""

    def _worded(self, value: float | None, code: str, unit: str) -> str:
        if value is None or not math.isfinite(value):
            return "no number"
        shown = format_value(value, code)
        text = shown.strip() if isinstance(shown, str) and shown.strip() else f"{value:.6g}"
        if text.startswith("-"):
            text = f"{_MINUS}{text[1:]}"
        unit = one_line(unit, 24)
        return text if not unit or unit in text else f"{text} {unit}"


def scale_of(
    number_format: str,
    unit: str,
    largest: float,
    spread: float,
    *,
    separate: bool = False,
    whole: bool = False,
) -> Scale:
    """The scale of a quantity.

    Args:
        number_format: The model's code for its cell.
        unit: Its unit, or "".
        largest: Largest usual size of its values.
        spread: Its standard deviation, or 0.
        separate: Whether it takes a few separate values only.
        whole: Whether these are whole numbers.

    Returns:
        The model's own code where it can be stored and shows numbers, with decimals added where it
        would hide the spread; else one that suits the values.
    """
    code = safe_code(number_format)
    if is_date_code(code):
        return Scale(code, code, _DAYS, unit)
    finer = ""
    if code == GENERAL or not is_number_code(code) or _is_long(code, largest):
        code = finer = suited_code(largest, spread)
        if separate and whole and code != SCIENTIFIC:
            code = COUNT
    code = zero_showing_code(code)
    finer = finer_code(finer or code, spread)
    digits = 2 - math.floor(math.log10(spread)) if spread > 0 else None
    return Scale(code if separate else finer, finer, finer, unit, digits)


def _is_long(code: str, largest: float) -> bool:
    """Whether the largest value would not fit into a column."""
    shown = format_value(-largest, code)
    return isinstance(shown, str) and len(shown.strip()) > _LONGEST
