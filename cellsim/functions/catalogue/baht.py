"""Amounts of baht in Thai words."""

from __future__ import annotations

from cellsim.functions.format_digits import rounded, shown_digits
from cellsim.functions.registry import Number, spreadsheet_function

_MILLION = 1_000_000
_DIGITS = ("ศูนย์", "หนึ่ง", "สอง", "สาม", "สี่", "ห้า", "หก", "เจ็ด", "แปด", "เก้า")
_PLACES = ("", "สิบ", "ร้อย", "พัน", "หมื่น", "แสน")
_IRREGULAR = {(1, 1): "สิบ", (1, 2): "ยี่สิบ"}
"""Words for a place and its digit: ten has no `one` before it, and twenty a `two` of its own."""

_LAST_ONE = "เอ็ด"
"""A final one behind other digits (reading rule of the Royal Society of Thailand, from memory)."""


@spreadsheet_function("BAHTTEXT")
def baht_in_words(number: Number) -> str:
    """An amount of baht and satang in Thai words."""
    satang = int(rounded(shown_digits(number), 2) * 100)
    baht, rest = divmod(satang, 100)
    sign = "ลบ" if number < 0 and satang else ""
    if not rest:
        return f"{sign}{_in_words(baht) or _DIGITS[0]}บาทถ้วน"
    whole = f"{_in_words(baht)}บาท" if baht else ""
    return f"{sign}{whole}{_in_words(rest)}สตางค์"


def _in_words(number: int) -> str:
    """A whole number in words; nothing for 0."""
    millions, rest = divmod(number, _MILLION)
    words = f"{_in_words(millions)}ล้าน" if millions else ""
    digits = str(rest)
    for position, character in enumerate(digits):
        place, digit = len(digits) - 1 - position, int(character)
        if place == 0 and digit == 1 and words:
            words += _LAST_ONE
        elif digit:
            words += _IRREGULAR.get((place, digit), _DIGITS[digit] + _PLACES[place])
    return words
