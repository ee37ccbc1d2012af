"""Lines of keys: every path that tomllib finds has one, and it is the right one."""

from __future__ import annotations

import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from cellsim.uncertainty.toml_lines import KeyPath, locate_lines


def paths_of(value: Any, path: KeyPath = ()) -> set[KeyPath]:
    """Every path to a value, table or list element of a parsed document."""
    found = {path} if path else set()
    items = value if isinstance(value, dict) else {}
    if isinstance(value, list):
        items = dict(enumerate(value))
    for key, item in items.items():
        found |= paths_of(item, (*path, key))
    return found


CASES: dict[str, tuple[str, dict[KeyPath, int]]] = {
    "plain keys": ("a = 1\nb = 2\n", {("a",): 1, ("b",): 2}),
    "comments and blank lines": ("# x = 1\n\n  # y\na = 1 # b = 2\nc = 3", {("a",): 4, ("c",): 5}),
    "a section": ("\n[run]\ndraws = 5\n", {("run",): 2, ("run", "draws"): 3}),
    "a dotted section": ("[inputs.x]\nlow = 1\n", {("inputs",): 1, ("inputs", "x", "low"): 2}),
    "spaces in a section's head": ("[ a . 'b c' ]\nd=1", {("a", "b c"): 1, ("a", "b c", "d"): 2}),
    "dotted keys": ("x.y.z = 1\nx.w = 2\n", {("x",): 1, ("x", "y", "z"): 1, ("x", "w"): 2}),
    "quoted keys": ('"a.b" = 1\n\'c\' = 2\n"\\u00e9" = 3', {("a.b",): 1, ("c",): 2, ("é",): 3}),
    "a quoted key with an escaped quote": ('"a\\"b" = 1\nc = 2', {('a"b',): 1, ("c",): 2}),
    "arrays of tables": (
        "[[rules]]\na = 1\n\n[[rules]]\na = 2\n",
        {("rules",): 1, ("rules", 0): 1, ("rules", 0, "a"): 2, ("rules", 1, "a"): 5},
    ),
    "a table inside an array of tables": (
        "[[r]]\n[r.s]\na = 1\n[[r]]\n[r.s]\na = 2\n[[r.t]]\nb = 3\n",
        {("r", 0, "s", "a"): 3, ("r", 1, "s", "a"): 6, ("r", 1, "t", 0, "b"): 8},
    ),
    "a list over lines": (
        "a = [\n  1, # one ] , \n  [2,\n 3],\n]\nb = 1\n",
        {("a", 0): 2, ("a", 1): 3, ("a", 1, 0): 3, ("a", 1, 1): 4, ("b",): 6},
    ),
    "strings with brackets and hashes": (
        'a = [\'],#\', "]\\"#", 3]\nb = 1',
        {("a", 0): 1, ("a", 2): 1, ("b",): 2},
    ),
    "text over lines": (
        'a = """\n[x]\nb = 1 "quoted" \\\n"""\nc = 2\n',
        {("a",): 1, ("c",): 5},
    ),
    "literal text over lines that ends in quotes": (
        "a = '''\n'' '''''\nc = 2\n",
        {("a",): 1, ("c",): 3},
    ),
    "text over lines that ends in quotes": ('a = """x""""\nc = 2\n', {("a",): 1, ("c",): 2}),
    "an empty text over lines": ('a = """"""\nc = 2\n', {("a",): 1, ("c",): 2}),
    "inline tables": (
        "a = { b = 1, 'c d' = [1, 2], e.f = {} }\ng = 1\n",
        {("a", "b"): 1, ("a", "c d", 1): 1, ("a", "e", "f"): 1, ("g",): 2},
    ),
    "inline tables in a list": (
        "a = [\n {b = 1},\n {b = 2}\n]\n",
        {("a", 0, "b"): 2, ("a", 1, "b"): 3},
    ),
    "dates with a space": (
        "a = 2026-06-30 12:00:00 # c\nb = [2026-06-30 12:00:00, 2026-07-01]\n",
        {("a",): 1, ("b", 1): 2},
    ),
    "a section after its subsection": ("[a.b]\nc = 1\n[a]\nd = 2\n", {("a",): 1, ("a", "d"): 4}),
}


@pytest.mark.parametrize(("text", "expected"), CASES.values(), ids=list(CASES))
def test_line_of_each_key(text: str, expected: dict[KeyPath, int]) -> None:
    lines = locate_lines(text)

    assert {path: lines.get(path) for path in expected} == expected


@pytest.mark.parametrize("text", [text for text, _ in CASES.values()], ids=list(CASES))
def test_paths_are_those_of_the_parsed_document(text: str) -> None:
    assert set(locate_lines(text)) == paths_of(tomllib.loads(text))


def test_windows_line_ends_count_once() -> None:
    assert locate_lines("a = 1\r\n\r\n[b]\r\nc = 2\r\n")["b", "c"] == 4


SCALARS = st.sampled_from(["1", '"]#"', "'=['", '"""\n[x]\n"""', "'''\n#'''", "2026-06-30", "true"])


@given(st.lists(st.lists(SCALARS, max_size=4), min_size=1, max_size=6), st.booleans())
def test_each_line_holds_its_key(rows: list[list[str]], wide: bool) -> None:
    gap = "\n  " if wide else " "
    text = "".join(
        f"# note\n[inputs.x{place}]\nkey{place} = [{gap}{f',{gap}'.join(row)} ]\n"
        for place, row in enumerate(rows)
    )
    written = text.split("\n")

    lines = locate_lines(text)

    assert set(lines) == paths_of(tomllib.loads(text))
    for place in range(len(rows)):
        line = lines["inputs", f"x{place}", f"key{place}"]
        assert written[line - 1].startswith(f"key{place} =")
