"""Text."""

from __future__ import annotations

import re
import unicodedata
import urllib.parse

from cellsim.functions.coercion import to_number, to_text
from cellsim.functions.dispatch import values_of
from cellsim.functions.number_format import format_value
from cellsim.functions.number_text import number_from_text
from cellsim.functions.registry import (
    AnyScalar,
    Context,
    Logical,
    Number,
    Operand,
    ScalarValue,
    Text,
    Whole,
    spreadsheet_function,
)
from cellsim.functions.rounding_rules import round_half_away
from cellsim.functions.wildcards import wildcard_regex
from cellsim.values import Array, ErrorValue, Fault, Reference, Scalar, Value

LONGEST = 32_767


def _bounded(text: str) -> str:
    if len(text) > LONGEST:
        raise Fault(ErrorValue.VALUE)
    return text


@spreadsheet_function("CONCATENATE", least=1)
def join_texts(*texts: Text) -> str:
    """Texts one after the other."""
    return _bounded("".join(texts))


def _texts(context: Context, arguments: tuple[Value, ...]) -> list[str]:
    found: list[str] = []
    for argument in arguments:
        areas = argument.areas if isinstance(argument, Reference) else ()
        arrays = [context.area_values(area) for area in areas] or [values_of(argument, context)]
        found += [to_text(item) for array in arrays for item in array.items]
    return found


@spreadsheet_function("CONCAT", least=1)
def join_all_texts(context: Context, *texts: Operand) -> str:
    """All texts of ranges and arguments one after the other."""
    return _bounded("".join(_texts(context, texts)))


@spreadsheet_function("TEXTJOIN", least=3)
def join_with_separator(
    context: Context, separator: Operand, skip_empty: Logical, *texts: Operand
) -> str:
    """Texts with a separator between them."""
    separators = _texts(context, (separator,)) or [""]
    parts = [part for part in _texts(context, texts) if part or not skip_empty]
    joined = ""
    for place, part in enumerate(parts):
        joined += (separators[(place - 1) % len(separators)] if place else "") + part
    return _bounded(joined)


@spreadsheet_function("LEFT", "LEFTB")
def first_characters(text: Text, count: Whole = 1) -> str | ErrorValue:
    """The first characters."""
    return text[:count] if count >= 0 else ErrorValue.VALUE


@spreadsheet_function("RIGHT", "RIGHTB")
def last_characters(text: Text, count: Whole = 1) -> str | ErrorValue:
    """The last characters."""
    if count < 0:
        return ErrorValue.VALUE
    return text[max(0, len(text) - count) :]


@spreadsheet_function("MID", "MIDB")
def middle_characters(text: Text, start: Whole, count: Whole) -> str | ErrorValue:
    """Characters from a place on."""
    if start < 1 or count < 0:
        return ErrorValue.VALUE
    return text[start - 1 : start - 1 + count]


@spreadsheet_function("LEN", "LENB")
def length(text: Text) -> float:
    """The number of characters, as UTF-16 counts them."""
    return float(len(text.encode("utf-16-le")) // 2)


@spreadsheet_function("TRIM")
def trim(text: Text) -> str:
    """Text without spaces at its ends and with single ones inside."""
    return " ".join(part for part in text.split(" ") if part)


@spreadsheet_function("CLEAN")
def remove_control_characters(text: Text) -> str:
    """Text without control characters."""
    return "".join(character for character in text if ord(character) >= 32)


@spreadsheet_function("UPPER")
def upper_case(text: Text) -> str:
    """Text in capitals."""
    return text.upper()


@spreadsheet_function("LOWER")
def lower_case(text: Text) -> str:
    """Text in small letters."""
    return text.lower()


@spreadsheet_function("PROPER")
def title_case(text: Text) -> str:
    """Text with each word capitalised."""
    result, after_letter = [], False
    for character in text:
        result.append(character.lower() if after_letter else character.upper())
        after_letter = character.isalpha()
    return "".join(result)


@spreadsheet_function("VALUE")
def number_of_text(context: Context, text: ScalarValue) -> float | ErrorValue:
    """The number that a text stands for."""
    if isinstance(text, bool):
        return ErrorValue.VALUE
    return to_number(text, date_1904=context.date_1904)


@spreadsheet_function("NUMBERVALUE")
def number_of_text_with_separators(
    text: Text, decimal: Text = ".", group: Text = ","
) -> float | ErrorValue:
    """The number that a text stands for, with separators of one's own."""
    if not decimal or not group:
        return ErrorValue.VALUE
    body = "".join(text.split()).replace(group[0], "").replace(decimal[0], ".")
    percents = len(body) - len(body.rstrip("%"))
    body = body.rstrip("%")
    if not body:
        return 0.0
    number = number_from_text(body)
    return ErrorValue.VALUE if number is None else number / 100**percents


@spreadsheet_function("TEXT")
def formatted(context: Context, value: ScalarValue, number_format: Text) -> str | ErrorValue:
    """A value as a number format shows it."""
    shown = value
    if isinstance(value, str):
        number = number_from_text(value, date_1904=context.date_1904)
        shown = value if number is None else number
    return format_value(shown, number_format, date_1904=context.date_1904)


@spreadsheet_function("FIXED")
def fixed_decimals(number: Number, decimals: Whole = 2, no_commas: Logical = False) -> str:
    """A number as text with a fixed number of decimals."""
    rounded = round_half_away(number, decimals)
    return f"{rounded:{'' if no_commas else ','}.{max(0, decimals)}f}"


@spreadsheet_function("DOLLAR")
def as_amount(number: Number, decimals: Whole = 2) -> str:
    """A number as an amount of dollars."""
    text = f"${abs(round_half_away(number, decimals)):,.{max(0, decimals)}f}"
    return f"({text})" if number < 0 else text


@spreadsheet_function("FIND", "FINDB")
def find_exactly(wanted: Text, text: Text, start: Whole = 1) -> float | ErrorValue:
    """The place of a text inside another, case counting."""
    if start < 1:
        return ErrorValue.VALUE
    place = text.find(wanted, start - 1)
    return float(place + 1) if place >= 0 and start <= len(text) + 1 else ErrorValue.VALUE


@spreadsheet_function("SEARCH", "SEARCHB")
def find_by_pattern(wanted: Text, text: Text, start: Whole = 1) -> float | ErrorValue:
    """The place of a text inside another, with wildcards, case not counting."""
    if start < 1 or start > len(text) + 1:
        return ErrorValue.VALUE
    match = wildcard_regex(wanted, anchored=False).search(text, start - 1)
    return float(match.start() + 1) if match else ErrorValue.VALUE


@spreadsheet_function("SUBSTITUTE")
def substitute(text: Text, old: Text, new: Text, which: Whole | None = None) -> str | ErrorValue:
    """Text with another put in for a part, everywhere or at one place."""
    if not old:
        return text
    if which is None:
        return _bounded(text.replace(old, new))
    if which < 1:
        return ErrorValue.VALUE
    spot = -1
    for _ in range(which):
        spot = text.find(old, spot + 1)
        if spot < 0:
            return text
    return _bounded(text[:spot] + new + text[spot + len(old) :])


@spreadsheet_function("REPLACE", "REPLACEB")
def replace_at(text: Text, start: Whole, count: Whole, new: Text) -> str | ErrorValue:
    """Text with characters at a place replaced."""
    if start < 1 or count < 0:
        return ErrorValue.VALUE
    return _bounded(text[: start - 1] + new + text[start - 1 + count :])


@spreadsheet_function("REPT")
def repeat(text: Text, times: Whole) -> str | ErrorValue:
    """Text repeated."""
    if times < 0 or len(text) * times > LONGEST:
        return ErrorValue.VALUE
    return text * times


@spreadsheet_function("EXACT")
def is_same_text(left: Text, right: Text) -> bool:
    """Whether two texts are the same, case counting."""
    return left == right


@spreadsheet_function("CHAR")
def character(code: Whole) -> str | ErrorValue:
    """The character of a code of the Windows-1252 set."""
    if not 1 <= code <= 255:
        return ErrorValue.VALUE
    return bytes([code]).decode("cp1252", errors="replace")


@spreadsheet_function("CODE")
def character_code(text: Text) -> float | ErrorValue:
    """The code of the first character in the Windows-1252 set."""
    if not text:
        return ErrorValue.VALUE
    encoded = text[0].encode("cp1252", errors="replace")
    return float(encoded[0])


@spreadsheet_function("UNICHAR")
def unicode_character(code: Whole) -> str | ErrorValue:
    """The character of a Unicode code point."""
    if not 1 <= code <= 0x10FFFF or 0xD800 <= code <= 0xDFFF:
        return ErrorValue.VALUE
    return chr(code)


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
    return urllib.parse.quote(text, safe="-_.~")


def _cut(
    text: str, separators: list[str], which: int, *, ignore_case: bool, to_end: bool
) -> tuple[int, int] | None:
    """Where a separator stands, counted from the start or, if negative, from the end."""
    flags = re.IGNORECASE if ignore_case else 0
    pattern = re.compile(
        "|".join(re.escape(s) for s in sorted(separators, key=len, reverse=True)), flags
    )
    spots = [match.span() for match in pattern.finditer(text)]
    if to_end:
        spots = [(0, 0), *spots] if which < 0 else [*spots, (len(text), len(text))]
    place = which - 1 if which > 0 else which
    return spots[place] if -len(spots) <= place < len(spots) else None


@spreadsheet_function("TEXTBEFORE")
def text_before(
    context: Context,
    text: Text,
    separator: Operand,
    which: Whole = 1,
    ignore_case: Logical = False,
    to_end: Logical = False,
    missing: AnyScalar = ErrorValue.NA,
) -> Scalar:
    """The text before a separator."""
    if which == 0:
        return ErrorValue.VALUE
    spot = _cut(text, _texts(context, (separator,)), which, ignore_case=ignore_case, to_end=to_end)
    return text[: spot[0]] if spot is not None else missing


@spreadsheet_function("TEXTAFTER")
def text_after(
    context: Context,
    text: Text,
    separator: Operand,
    which: Whole = 1,
    ignore_case: Logical = False,
    to_end: Logical = False,
    missing: AnyScalar = ErrorValue.NA,
) -> Scalar:
    """The text after a separator."""
    if which == 0:
        return ErrorValue.VALUE
    spot = _cut(text, _texts(context, (separator,)), which, ignore_case=ignore_case, to_end=to_end)
    return text[spot[1] :] if spot is not None else missing


@spreadsheet_function("TEXTSPLIT")
def split_text(
    context: Context,
    text: Text,
    columns: Operand,
    rows: Operand | None = None,
    skip_empty: Logical = False,
    ignore_case: Logical = False,
    padding: AnyScalar = ErrorValue.NA,
) -> Array:
    """Text split into columns and rows."""
    lines = _split(text, [] if rows is None else _texts(context, (rows,)), ignore_case=ignore_case)
    separators = [] if columns is None else _texts(context, (columns,))
    table = [_split(line, separators, ignore_case=ignore_case) for line in lines]
    if skip_empty:
        table = [[part for part in line if part] for line in table]
        table = [line for line in table if line] or [[""]]
    width = max(len(line) for line in table)
    return Array.from_rows([[*line, *[padding] * (width - len(line))] for line in table])


def _split(text: str, separators: list[str], *, ignore_case: bool) -> list[str]:
    wanted = [separator for separator in separators if separator]
    if not wanted:
        return [text]
    pattern = "|".join(re.escape(s) for s in sorted(wanted, key=len, reverse=True))
    return re.split(pattern, text, flags=re.IGNORECASE if ignore_case else 0)


def _as_written(value: Scalar, *, strict: bool) -> str:
    if isinstance(value, ErrorValue):
        return str(value)
    if strict and isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    return to_text(value)


@spreadsheet_function("VALUETOTEXT")
def value_as_text(value: AnyScalar, strict: Logical = False) -> str:
    """Any value as text; strictly, as it would be typed."""
    return _as_written(value, strict=strict)


@spreadsheet_function("ARRAYTOTEXT")
def array_as_text(context: Context, values: Operand, strict: Logical = False) -> str:
    """An array as text; strictly, as it would be typed."""
    array = values_of(values, context)
    rows = [[_as_written(item, strict=strict) for item in row] for row in array.to_rows()]
    if strict:
        return "{" + ";".join(",".join(row) for row in rows) + "}"
    return ", ".join(item for row in rows for item in row)


def _regex(pattern: str, *, ignore_case: bool) -> re.Pattern[str]:
    try:
        return re.compile(pattern, re.IGNORECASE if ignore_case else 0)
    except re.error:
        raise Fault(ErrorValue.VALUE) from None


@spreadsheet_function("REGEXTEST")
def matches_pattern(text: Text, pattern: Text, ignore_case: Logical = False) -> bool:
    """Whether a regular expression matches a part of a text."""
    return _regex(pattern, ignore_case=ignore_case).search(text) is not None


@spreadsheet_function("REGEXEXTRACT")
def extract_by_pattern(
    text: Text, pattern: Text, mode: Whole = 0, ignore_case: Logical = False
) -> Value:
    """What a regular expression matches: 0 the first match, 1 all, 2 the groups of the first."""
    regex = _regex(pattern, ignore_case=ignore_case)
    matches = list(regex.finditer(text))
    if not matches:
        return ErrorValue.NA
    if mode == 1:
        return Array(len(matches), 1, [match[0] for match in matches])
    if mode == 2 and matches[0].groups():
        groups = [group or "" for group in matches[0].groups()]
        return Array(1, len(groups), list(groups))
    return matches[0][0]


@spreadsheet_function("REGEXREPLACE")
def replace_by_pattern(
    text: Text, pattern: Text, new: Text, which: Whole = 0, ignore_case: Logical = False
) -> str:
    """Text with what a regular expression matches replaced, everywhere or at one place."""
    regex = _regex(pattern, ignore_case=ignore_case)
    template = re.sub(r"\$(\d+)", r"\\g<\1>", new)
    if which == 0:
        return _bounded(regex.sub(template, text))
    matches = list(regex.finditer(text))
    place = which - 1 if which > 0 else which
    if not -len(matches) <= place < len(matches):
        return text
    match = matches[place]
    return _bounded(text[: match.start()] + match.expand(template) + text[match.end() :])
