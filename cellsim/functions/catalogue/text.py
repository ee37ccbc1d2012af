"""Text: joining, cutting, searching, characters."""

from __future__ import annotations

import unicodedata
import urllib.parse

from cellsim.functions.coercion import to_text
from cellsim.functions.dispatch import values_of
from cellsim.functions.registry import (
    MAC_ROMAN,
    AnyScalar,
    Context,
    Logical,
    Operand,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.functions.text_limits import LONGEST, bounded, from_units, to_units
from cellsim.functions.wildcards import wildcard_regex
from cellsim.values import ErrorValue, Reference, Scalar, Value


@spreadsheet_function("CONCATENATE", least=1)
def join_texts(*texts: Text) -> str:
    """Texts one after the other."""
    return bounded("".join(texts))


def _texts(context: Context, arguments: tuple[Value, ...]) -> list[str]:
    """The items of ranges and arguments as texts, in order."""
    found: list[str] = []
    for argument in arguments:
        areas = argument.areas if isinstance(argument, Reference) else ()
        arrays = [context.area_values(area) for area in areas] or [values_of(argument, context)]
        found += [to_text(item) for array in arrays for item in array.items]
    return found


@spreadsheet_function("CONCAT", least=1)
def join_all_texts(context: Context, *texts: Operand) -> str:
    """All texts of ranges and arguments one after the other."""
    return bounded("".join(_texts(context, texts)))


@spreadsheet_function("TEXTJOIN", least=3)
def join_with_separator(
    context: Context, separator: Operand, skip_empty: Logical, *texts: Operand
) -> str:
    """Texts with a separator between them; of several separators each in turn."""
    separators = _texts(context, (separator,)) or [""]
    parts = [part for part in _texts(context, texts) if part or not skip_empty]
    joined: list[str] = []
    for place, part in enumerate(parts):
        if place:
            joined.append(separators[(place - 1) % len(separators)])
        joined.append(part)
    return bounded("".join(joined))


@spreadsheet_function("LEFT", "LEFTB")
def first_characters(text: Text, count: Whole = 1) -> str | ErrorValue:
    """The first characters."""
    return from_units(to_units(text)[:count]) if count >= 0 else ErrorValue.VALUE


@spreadsheet_function("RIGHT", "RIGHTB")
def last_characters(text: Text, count: Whole = 1) -> str | ErrorValue:
    """The last characters."""
    units = to_units(text)
    return from_units(units[max(0, len(units) - count) :]) if count >= 0 else ErrorValue.VALUE


@spreadsheet_function("MID", "MIDB")
def middle_characters(text: Text, start: Whole, count: Whole) -> str | ErrorValue:
    """Characters from a place on."""
    if start < 1 or count < 0:
        return ErrorValue.VALUE
    return from_units(to_units(text)[start - 1 : start - 1 + count])


@spreadsheet_function("LEN", "LENB")
def length(text: Text) -> float:
    """The number of characters, as UTF-16 counts them."""
    return float(len(to_units(text)))


@spreadsheet_function("TRIM")
def trim(text: Text) -> str:
    """Text without spaces at its ends and with single ones inside."""
    return " ".join(part for part in text.split(" ") if part)


@spreadsheet_function("CLEAN")
def remove_control_characters(text: Text) -> str:
    """Text without the control characters 0 to 31."""
    return "".join(character for character in text if ord(character) >= 32)


def _upper(character: str) -> str:
    capital = character.upper()
    return capital if len(capital) == 1 else character


@spreadsheet_function("UPPER")
def upper_case(text: Text) -> str:
    """Text in capitals."""
    return "".join(_upper(character) for character in text)


@spreadsheet_function("LOWER")
def lower_case(text: Text) -> str:
    """Text in small letters."""
    return text.lower()


@spreadsheet_function("PROPER")
def title_case(text: Text) -> str:
    """Text with the first letter of each word as a capital, the others small."""
    result, after_letter = [], False
    for character in text:
        result.append(character.lower() if after_letter else _upper(character))
        after_letter = character.isalpha()
    return "".join(result)


@spreadsheet_function("FIND", "FINDB")
def find_exactly(wanted: Text, text: Text, start: Whole = 1) -> float | ErrorValue:
    """The place of a text inside another, case counting."""
    units = to_units(text)
    if not 1 <= start <= len(units) + 1:
        return ErrorValue.VALUE
    place = units.find(to_units(wanted), start - 1)
    return float(place + 1) if place >= 0 else ErrorValue.VALUE


@spreadsheet_function("SEARCH", "SEARCHB")
def find_by_pattern(wanted: Text, text: Text, start: Whole = 1) -> float | ErrorValue:
    """The place of a text inside another, with wildcards, case not counting."""
    units = to_units(text)
    if not 1 <= start <= len(units) + 1:
        return ErrorValue.VALUE
    match = wildcard_regex(to_units(wanted), anchored=False).search(units, start - 1)
    return float(match.start() + 1) if match else ErrorValue.VALUE


@spreadsheet_function("SUBSTITUTE")
def substitute(text: Text, old: Text, new: Text, which: Whole | None = None) -> str | ErrorValue:
    """Text with another put in for a part, everywhere or at one place."""
    if which is not None and which < 1:
        return ErrorValue.VALUE
    if not old:
        return text
    if which is None:
        return bounded(text.replace(old, new))
    spot = -len(old)
    for _ in range(which):
        spot = text.find(old, spot + len(old))
        if spot < 0:
            return text
    return bounded(text[:spot] + new + text[spot + len(old) :])


@spreadsheet_function("REPLACE", "REPLACEB")
def replace_at(text: Text, start: Whole, count: Whole, new: Text) -> str | ErrorValue:
    """Text with characters at a place replaced."""
    if start < 1 or count < 0:
        return ErrorValue.VALUE
    units = to_units(text)
    kept = units[: start - 1], units[start - 1 + count :]
    return bounded(from_units(kept[0] + to_units(new) + kept[1]))


@spreadsheet_function("REPT")
def repeat(text: Text, times: Whole) -> str | ErrorValue:
    """Text repeated."""
    if times < 0 or len(text) * times > LONGEST:
        return ErrorValue.VALUE
    return text * times if text else ""


@spreadsheet_function("EXACT")
def is_same_text(left: Text, right: Text) -> bool:
    """Whether two texts are the same, case counting."""
    return left == right


@spreadsheet_function("CHAR")
def character(context: Context, code: Whole) -> str | ErrorValue:
    """The character of a code of the system's set: Windows-1252, or Mac Roman in files written there."""
    if not 1 <= code <= 255:
        return ErrorValue.VALUE
    try:
        return bytes([code]).decode(context.character_set)
    except UnicodeDecodeError:  # five codes stand for no character and are kept as they are
        return chr(code)


@spreadsheet_function("CODE")
def character_code(context: Context, text: Text) -> float | ErrorValue:
    """The code of the first character in the set of CHAR; one that is not in it has that of `?` or `_`."""
    if not text:
        return ErrorValue.VALUE
    if context.character_set == MAC_ROMAN:
        try:
            return float(text[0].encode(MAC_ROMAN)[0])
        except UnicodeEncodeError:
            return 95.0
    if 0x80 <= ord(text[0]) <= 0x9F:
        return float(ord(text[0]))
    return float(text[0].encode("cp1252", errors="replace")[0])


@spreadsheet_function("UNICHAR")
def unicode_character(code: Whole) -> str | ErrorValue:
    """The character of a Unicode code point."""
    if 0xD800 <= code <= 0xDFFF:
        return ErrorValue.NA
    return chr(code) if 1 <= code <= 0x10FFFF else ErrorValue.VALUE


@spreadsheet_function("UNICODE")
def unicode_code(text: Text) -> float | ErrorValue:
    """The code point of the first character."""
    return float(ord(text[0])) if text else ErrorValue.VALUE


@spreadsheet_function("T")
def text_only(value: AnyScalar) -> Scalar:
    """A text as it is, nothing for anything else."""
    return value if isinstance(value, (str, ErrorValue)) else ""


@spreadsheet_function("ASC")
def narrow(text: Text) -> str:
    """Full-width letters as half-width ones."""
    return "".join(
        unicodedata.normalize("NFKC", c) if "\uff01" <= c <= "\uff5e" or c == "\u3000" else c
        for c in text
    )


@spreadsheet_function("DBCS", "JIS")
def widen(text: Text) -> str:
    """Half-width letters as full-width ones."""
    return "".join(
        "\u3000" if c == " " else chr(ord(c) + 0xFEE0) if "!" <= c <= "~" else c for c in text
    )


@spreadsheet_function("PHONETIC")
def reading(text: Text) -> str:
    """The text itself: readings are not kept."""
    return text


@spreadsheet_function("ENCODEURL")
def encode_address(text: Text) -> str:
    """Text as part of a web address."""
    return bounded(urllib.parse.quote(text, safe="-_.~"))
