"""Number format codes: passed on when sound, replaced when not, refined when too coarse."""

from __future__ import annotations

import pytest

from cellsim.report.number_formats import (
    finer_code,
    is_date_code,
    safe_code,
    suited_code,
    zero_showing_code,
)
from cellsim.report.scale import scale_of

SOUND = [
    "General", "0", "0.00", "#,##0", "#,##0.00;[Red]-#,##0.00", "0%", "0.0%", "0.00E+00", "# ?/?",
    "yyyy-mm-dd", "d/m/yy h:mm", "[h]:mm:ss", "mm:ss.0", "h:mm AM/PM", "@", '0.0"x"', "0.0\\x", "_-* #,##0_-",
    "[$€-407]#,##0.00", "[>=1000]#,##0,;0", '"low";"high"', "#,##0.0,,\"m\"", "0.00;-0.00;;@", "[Color 5]0",
]  # fmt: skip
UNSOUND = [
    "", '"open', "0.0.0", "[boo]0", "0;0;0;0;0", "0.0E", "E+0", "@0", "\x01", "0\\", "0" * 256, "[", "yyyy0%", "@;0",
]  # fmt: skip


@pytest.mark.parametrize("code", SOUND)
def test_sound_code_is_passed_on(code: str) -> None:
    assert safe_code(code) == code


@pytest.mark.parametrize("code", UNSOUND)
def test_unsound_code_becomes_general(code: str) -> None:
    assert safe_code(code) == "General"


@pytest.mark.parametrize(
    ("code", "value", "expected"),
    [
        ("0.00", 0.0012, "0.0000"),
        ("0.00", 12.0, "0.00"),
        ("#,##0", 0.5, "#,##0.00"),
        ("0%", 0.001, "0.00%"),
        ("#,##0.0,,", 1500.0, "#,##0.0000,,"),
        ('0.0"x";-0.0"x"', 0.05, '0.000"x";-0.000"x"'),
        ("yyyy-mm-dd", 0.5, "yyyy-mm-dd"),
        ("0.00E+00", 1e-9, "0.00E+00"),
    ],
)
def test_decimals_are_added_until_two_digits_show(code: str, value: float, expected: str) -> None:
    assert finer_code(code, value) == expected
    assert safe_code(expected) == expected


@pytest.mark.parametrize(
    ("largest", "spread", "code"),
    [(0, 0, "0"), (5e6, 1e6, "#,##0"), (5, 0.7, "#,##0.000"), (1e15, 1e14, "0.0000E+00"), (1e-12, 1e-13, "0.0000E+00")],
)  # fmt: skip
def test_numbers_without_a_format_get_one_that_suits_them(
    largest: float, spread: float, code: str
) -> None:
    assert suited_code(largest, spread) == code


@pytest.mark.parametrize(
    ("code", "expected"),
    [
        ("#,##0;-#,##0;-", "#,##0;-#,##0;#,##0"),
        ("0.0;-0.0;", "0.0;-0.0;0.0"),
        ('0.0"x";-0.0"x";"none";@', '0.0"x";-0.0"x";0.0"x";@'),
        ("0.0;-0.0;0", "0.0;-0.0;0"),
        ("0.0;-0.0", "0.0;-0.0"),
        ('[>=1000]#,##0,"k";[<0]-0;"-"', '[>=1000]#,##0,"k";[<0]-0;"-"'),
        ("General", "General"),
    ],
)
def test_a_zero_is_written_as_a_number(code: str, expected: str) -> None:
    """Sections are positive; negative; zero; text (ECMA-376 Part 1, 18.8.31)."""
    assert zero_showing_code(code) == expected
    assert safe_code(expected) == expected


def test_spread_of_dates_is_in_days() -> None:
    scale = scale_of("yyyy-mm-dd", "", 46_000, 30)
    assert is_date_code(scale.code)
    assert scale.text(46_203.0) == "2026-06-30"
    assert scale.spread_text(30.25) == "30.3 days"


@pytest.mark.parametrize(
    ("code", "unit", "value", "text"),
    [
        ("0.0%", "%", 0.1234, "12.3%"),
        ("0.00", "EUR", -4.256, "\u22124.26 EUR"),
        ('#,##0.00 "EUR"', "EUR", 1234.5, "1,234.50 EUR"),
        ("#,##0", "t", 1234567.0, "1,234,567 t"),
    ],
)
def test_sentence_shows_number_sign_and_unit_once(
    code: str, unit: str, value: float, text: str
) -> None:
    assert scale_of(code, unit, abs(value), abs(value) / 3).text(value) == text


def test_estimates_are_rounded_to_what_the_spread_makes_sense_of() -> None:
    scale = scale_of("#,##0", "EUR", 8e6, 3.1e6)
    assert scale.estimate_text(-2_695_291.0) == "\u22122,700,000 EUR"
    assert scale.text(-2_695_291.0) == "\u22122,695,291 EUR"


def test_missing_number_is_said_in_words() -> None:
    assert scale_of("0.0", "EUR", 1, 1).text(float("inf")) == "no number"
