"""Cell styles, each made once a workbook."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TypeAlias

from xlsxwriter import Workbook
from xlsxwriter.format import Format

from cellsim.report.palette import CLAY, INK, MIST, PAPER, SAND, TEAL

Properties: TypeAlias = Mapping[str, object]

FONT = {"font_name": "Arial", "font_size": 10}
_RULE = {"bottom": 1, "bottom_color": MIST}
# Numbers have no indent: LibreOffice draws some cells with it and some without.
KINDS: Mapping[str, Properties] = {
    "title": {"bold": True, "font_size": 16, "font_color": INK},
    "heading": {"bold": True, "font_size": 12, "font_color": TEAL, "bottom": 2, "bottom_color": TEAL},
    "lead": {"font_color": INK, "text_wrap": True, "valign": "top"},
    "caution": {"font_color": INK, "text_wrap": True, "valign": "top", "left": 5, "left_color": CLAY, "align": "left", "indent": 1},
    "header": {"bold": True, "font_color": PAPER, "bg_color": INK, "text_wrap": True, "valign": "vcenter"},
    "header_in": {"bold": True, "font_color": PAPER, "bg_color": INK, "align": "left", "indent": 1, "text_wrap": True, "valign": "vcenter"},
    "header_right": {
        "bold": True, "font_color": PAPER, "bg_color": INK, "text_wrap": True, "valign": "vcenter", "align": "right",
    },
    "text": {"font_color": INK, "valign": "top", **_RULE},
    "wrapped": {"font_color": INK, "text_wrap": True, "valign": "top", **_RULE},
    "wrapped_in": {"font_color": INK, "align": "left", "indent": 1, "text_wrap": True, "valign": "top", **_RULE},
    "wrapped_right": {
        "font_color": INK, "align": "right", "text_wrap": True, "valign": "top", **_RULE,
    },
    "strong_right": {
        "font_color": INK, "bold": True, "align": "right", "text_wrap": True, "valign": "top", **_RULE,
    },
    "strong": {"font_color": INK, "bold": True, "text_wrap": True, "valign": "top", **_RULE},
    "number": {"font_color": INK, "align": "right", "shrink": True, "valign": "top", **_RULE},
    "ask": {"font_color": INK, "align": "right", "shrink": True, "bg_color": MIST, "border": 1, "border_color": SAND},
    "answer": {"font_color": INK, "bold": True, "align": "right", "shrink": True, **_RULE},
    "code": {"font_color": INK, "font_name": "Courier New", "font_size": 9},
    "link": {"font_color": TEAL, "underline": 1, "valign": "top", "text_wrap": True},
    "plain": {"font_color": INK},
}  # fmt: skip


class Styles:
    """Hands out formats by kind and number format code.

    Args:
        workbook: The workbook that they belong to.
    """

    def __init__(self, workbook: Workbook) -> None:
        self._workbook = workbook
        self._made: dict[tuple[str, str], Format] = {}

    def get(self, kind: str, code: str = "") -> Format:
        """The format of a kind, with a number format code if it is given."""
        key = (kind, code)
        if key not in self._made:
            number_format = {"num_format": code} if code else {}
            self._made[key] = self._workbook.add_format({**FONT, **KINDS[kind], **number_format})
        return self._made[key]
