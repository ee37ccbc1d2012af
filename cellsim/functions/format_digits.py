"""Numbers as digit codes show them: plain, in exponent form, and as fractions.

Where ECMA-376 Part 1, 18.8.31 leaves a case open, the rules are those that values stored by spreadsheet
programs show.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import ROUND_HALF_UP, Context, Decimal
from fractions import Fraction

from cellsim.functions.format_codes import Kind, Token
from cellsim.values import ErrorValue, Fault

_EXACT = Context(prec=800, rounding=ROUND_HALF_UP)
_MOST_DECIMALS = 400


def shown_digits(number: float) -> Decimal:
    """The size of a number by the 15 significant digits that are shown of it."""
    return Decimal(f"{abs(number):.14e}")


def rounded(value: Decimal, decimals: int) -> Decimal:
    """A value to some decimals, ties upward."""
    return _EXACT.quantize(value, Decimal(1).scaleb(-decimals))


def general_text_of_width(number: float) -> str:
    """A number as a cell of General format shows it: in at most 11 characters besides the sign.

    Common practice of spreadsheet programs, checked against values that they stored.
    """
    if number == 0:
        return "0"
    value = shown_digits(number)
    power = value.adjusted()
    plain = _stripped(rounded(value, min(9, max(0, 9 - power))) if power >= -4 else value)
    scientific = power >= 11 or power < -9 or (power < -4 and len(plain) > 11)
    text = _scientific_text(value) if scientific else plain
    return f"-{text}" if number < 0 else text


def _stripped(value: Decimal) -> str:
    text = f"{value:f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def _scientific_text(value: Decimal) -> str:
    power = value.adjusted()
    mantissa = rounded(value.scaleb(-power, _EXACT), 5)
    if mantissa >= 10:
        mantissa, power = mantissa / 10, power + 1
    return f"{_stripped(mantissa)}E{'-' if power < 0 else '+'}{abs(power):02d}"


@dataclass(frozen=True, slots=True)
class _Layout:
    """The digit codes of a number, and what its commas mean.

    Attributes:
        whole: Places of the codes before the point.
        decimals: Places of the codes after it.
        dropped: Places of commas that are not shown.
        grouped: Whether thousands are separated.
        thousands: How many commas scale the number down.
    """

    whole: tuple[int, ...]
    decimals: tuple[int, ...]
    dropped: frozenset[int]
    grouped: bool
    thousands: int


def _layout(tokens: Sequence[Token]) -> _Layout:
    point = next((k for k, token in enumerate(tokens) if token.kind is Kind.POINT), len(tokens))
    digits = [k for k, token in enumerate(tokens) if token.kind is Kind.DIGIT]
    whole = tuple(k for k in digits if k < point)
    decimals = tuple(k for k in digits if k > point)
    dropped: set[int] = set()
    grouped, thousands = False, 0
    for k, token in enumerate(tokens):
        follows = k > 0 and (tokens[k - 1].kind is Kind.DIGIT or k - 1 in dropped)
        if token.kind is not Kind.COMMA or not follows:
            continue
        dropped.add(k)
        same_side = whole if k < point else decimals
        if same_side and k > same_side[-1]:
            thousands += 1
        elif k < point:
            grouped = grouped or (k + 1 in whole and k - 1 in whole)
    return _Layout(whole, decimals, frozenset(dropped), grouped, thousands)


def format_plain(number: float, tokens: Sequence[Token]) -> str:
    """A number by digit codes, percent signs and commas."""
    layout = _layout(tokens)
    percents = sum(token.kind is Kind.PERCENT for token in tokens)
    value = shown_digits(number).scaleb(2 * percents - 3 * layout.thousands, _EXACT)
    value = rounded(value, min(len(layout.decimals), _MOST_DECIMALS))
    text = _filled(value, tokens, layout)
    return f"-{text}" if number < 0 and value else text


def _filled(
    value: Decimal, tokens: Sequence[Token], layout: _Layout, *, all_places: bool = False
) -> str:
    """The tokens with a value's digits in the places of the digit codes.

    Args:
        value: A value with as many decimals as there are codes.
        tokens: The tokens.
        layout: Their layout.
        all_places: Whether codes before the point that would show nothing or a space show 0.
    """
    digits, _, fraction = f"{value:f}".partition(".")
    digits = "" if digits == "0" else digits
    marks = [tokens[k].text if not all_places else "0" for k in layout.whole]
    shown = dict(zip(layout.whole, _whole_digits(digits, marks, layout.grouped), strict=True))
    decimal_marks = [tokens[k].text for k in layout.decimals]
    shown |= zip(layout.decimals, _decimal_digits(fraction, decimal_marks), strict=True)
    if not layout.whole and digits:  # a code such as .00 still shows what is before the point
        point = next(k for k, token in enumerate(tokens) if token.kind is Kind.POINT)
        shown[point] = f"{digits}."
    shown |= dict.fromkeys(layout.dropped, "")
    return "".join(shown.get(k, token.text) for k, token in enumerate(tokens))


def _whole_digits(digits: str, marks: Sequence[str], grouped: bool) -> list[str]:
    """What each digit code before the point shows; the first takes all digits left over."""
    count = len(marks)

    def at(place: int) -> str:
        if place <= len(digits):
            return digits[-place]
        return {"0": "0", "?": " ", "#": ""}[marks[count - place]]

    shown = []
    for index in range(count):
        last = count - index
        first = max(last, len(digits)) if index == 0 else last
        text = ""
        for place in range(first, last - 1, -1):
            character = at(place)
            text += character
            if grouped and character and place > 1 and place % 3 == 1 and at(place - 1):
                text += " " if character == " " else ","
        shown.append(text)
    return shown


def _decimal_digits(fraction: str, marks: Sequence[str]) -> list[str]:
    shown = []
    for index, mark in enumerate(marks):
        empty = not fraction[index:].strip("0")
        shown.append({"0": "0", "?": " ", "#": ""}[mark] if empty else fraction[index : index + 1])
    return shown


def format_scientific(number: float, tokens: Sequence[Token]) -> str:
    """A number in exponent form; several codes before the point keep the exponent a multiple.

    Raises:
        Fault: The exponent is not written with digit codes (#VALUE!).
    """
    place = next(k for k, token in enumerate(tokens) if token.kind is Kind.EXPONENT)
    head, tail = tokens[:place], tokens[place + 1 :]
    layout, tail_layout = _layout(head), _layout(tail)
    if any(token.kind is Kind.LITERAL and token.text.isdigit() for token in tail):
        raise Fault(ErrorValue.VALUE)
    value = shown_digits(number)
    step = max(len(layout.whole), 1)
    power = 0
    if value:
        power = value.adjusted() + (0 if layout.whole else 1)
        power = power // step * step
    mantissa = rounded(value.scaleb(-power, _EXACT), len(layout.decimals))
    if mantissa >= Decimal(10) ** (step if layout.whole else 0):
        power += step
        mantissa = rounded(value.scaleb(-power, _EXACT), len(layout.decimals))
    first = _filled(mantissa, head, layout, all_places=not value)
    letter, plus = tokens[place].text[0], tokens[place].text[1]
    sign = "-" if power < 0 else plus.replace("-", "")
    last = _exponent(abs(power), sign, tail, tail_layout)
    return f"{'-' if number < 0 else ''}{first}{letter}{last}"


def _exponent(power: int, sign: str, tokens: Sequence[Token], layout: _Layout) -> str:
    places = layout.whole
    shown: dict[int, str] = dict.fromkeys(layout.dropped, "")
    shown |= zip(places, _counted(power, [tokens[k].text for k in places]), strict=True)
    if places:
        shown[places[0]] = sign + shown[places[0]]
    return "".join(shown.get(k, token.text) for k, token in enumerate(tokens))


def _counted(count: int, marks: Sequence[str]) -> list[str]:
    """A whole number in digit codes, of which the last shows even 0."""
    return _whole_digits(str(count), marks, grouped=False) if marks else []


@dataclass(frozen=True, slots=True)
class _FractionLayout:
    """Places of the codes of a fraction: before it, its top, its bottom."""

    whole: tuple[int, ...]
    top: tuple[int, ...]
    bottom: tuple[int, ...]
    slash: int


def fraction_layout(tokens: Sequence[Token]) -> _FractionLayout | None:
    """Where a format's fraction stands; None if it shows none."""
    slash = next((k for k, token in enumerate(tokens) if token.kind is Kind.SLASH), None)
    if slash is None:
        return None
    before = [k for k in range(slash) if tokens[k].kind is Kind.DIGIT]
    after = [k for k in range(slash + 1, len(tokens)) if _is_digit_like(tokens[k])]
    if not before or not after:
        return None
    top = [before.pop()]
    while before and before[-1] == top[0] - 1:
        top.insert(0, before.pop())
    bottom = [after[0]]
    for k in after[1:]:
        if k != bottom[-1] + 1:
            break
        bottom.append(k)
    return _FractionLayout(tuple(before), tuple(top), tuple(bottom), slash)


def _is_digit_like(token: Token) -> bool:
    return token.kind is Kind.DIGIT or (token.kind is Kind.LITERAL and token.text.isdigit())


def format_fraction(number: float, tokens: Sequence[Token], layout: _FractionLayout) -> str:
    """A number as a fraction, with its whole part before it where there are codes for one."""
    value = Fraction(shown_digits(number))
    bottom_text = "".join(tokens[k].text for k in layout.bottom)
    fixed = int(bottom_text) if bottom_text.isdigit() and bottom_text.strip("0") else None
    whole = math.floor(value) if layout.whole else 0
    top, bottom = _nearest(value - whole, fixed, len(bottom_text))
    if layout.whole and top == bottom:
        whole, top = whole + 1, 0
    pieces = [token.text for token in tokens]
    _put(pieces, layout.whole, _counted(whole, [tokens[k].text for k in layout.whole]))
    _put(pieces, layout.top, _counted(top, [tokens[k].text for k in layout.top]))
    if fixed is None:
        _put(pieces, layout.bottom, _bottom(bottom, bottom_text))
    _hide(pieces, tokens, layout, whole=whole, top=top)
    return f"{'-' if number < 0 else ''}{''.join(pieces)}"


def _put(pieces: list[str], places: Sequence[int], texts: Sequence[str]) -> None:
    for place, text in zip(places, texts, strict=True):
        pieces[place] = text


def _bottom(number: int, marks: str) -> list[str]:
    """The bottom of a fraction; blanks stand after it, so that slashes align."""
    if set(marks) == {"?"}:
        return list(str(number).ljust(len(marks)))
    return _counted(number, marks)


def _nearest(value: Fraction, fixed: int | None, digits: int) -> tuple[int, int]:
    """Top and bottom of the nearest fraction."""
    if fixed is not None:
        return math.floor(value * fixed + Fraction(1, 2)), fixed
    found = value.limit_denominator(10 ** min(digits, 9) - 1)
    return found.numerator, found.denominator


def _hide(
    pieces: list[str], tokens: Sequence[Token], layout: _FractionLayout, *, whole: int, top: int
) -> None:
    """Take out a fraction of 0, or a whole part of 0 beside a fraction; blank it where codes are `?`."""
    if not layout.whole:
        return
    marks = {
        "whole": {tokens[k].text for k in layout.whole},
        "top": {tokens[k].text for k in layout.top},
        "bottom": {tokens[k].text for k in layout.bottom},
    }
    if top == 0 and "0" not in marks["top"]:
        hidden = range(layout.whole[-1] + 1, layout.bottom[-1] + 1)
        blank = "?" in marks["whole"] | marks["top"] | marks["bottom"]
    elif whole == 0 and (
        "0" not in marks["whole"] if top else len(layout.whole) == 1 and "#" in marks["whole"]
    ):
        for k in layout.whole:
            pieces[k] = " " if tokens[k].text == "?" else ""
        hidden = range(layout.whole[-1], layout.top[0])
        blank = "?" in marks["whole"] | marks["top"]
    else:
        return
    for k in hidden:
        pieces[k] = " " * len(pieces[k]) if blank else ""
