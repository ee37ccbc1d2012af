"""Cells with the same reason told as ranges."""

from __future__ import annotations

from cellsim.report.cell_groups import grouped


def test_neighbours_become_one_range_and_count_once() -> None:
    cells = [(f"Market!{column}10", "slow") for column in ("F", "D", "E", "D", "E")]
    assert grouped(cells) == [("Market!D10:F10", "slow", 3)]


def test_equal_rows_that_follow_each_other_become_a_rectangle() -> None:
    cells = [(f"'Two words'!{column}{row}", "slow") for row in (4, 5, 7) for column in "AB"]
    assert grouped(cells) == [("'Two words'!A4:B5", "slow", 4), ("'Two words'!A7:B7", "slow", 2)]


def test_other_reasons_and_other_sheets_stay_apart() -> None:
    cells = [("A!B2", "one"), ("A!C2", "two"), ("B!C2", "one"), ("A!B4", "one")]
    assert grouped(cells) == [
        ("A!B2", "one", 1), ("A!B4", "one", 1), ("B!C2", "one", 1), ("A!C2", "two", 1),
    ]  # fmt: skip


def test_a_place_that_is_no_cell_stands_alone() -> None:
    cells = [("=Valuation!D30/2", "slow"), ("upside", "slow"), ("It's!A1", "slow")]
    found = grouped(cells)
    assert ("=Valuation!D30/2", "slow", 1) in found
    assert ("upside", "slow", 1) in found
    assert ("'It''s'!A1", "slow", 1) in found
