"""The list of functions that are taken draw by draw is what compiling them shows."""

from __future__ import annotations

from draw_by_draw_list import DOCUMENT, document


def test_the_list_of_functions_taken_draw_by_draw_is_true() -> None:
    assert DOCUMENT.read_text(encoding="utf-8") == document(), (
        "run `PYTHONPATH=.:tests python tests/draw_by_draw_list.py`"
    )
