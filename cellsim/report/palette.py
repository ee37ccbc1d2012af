"""Colours and line styles; every pair differs in lightness or dash, so that a grey print reads too."""

from __future__ import annotations

INK = "#22313F"
TEAL = "#1B7F79"
SAND = "#D9A441"
CLAY = "#B5533C"
MIST = "#E7ECEF"
PAPER = "#FFFFFF"

CURVE = {"color": TEAL, "width": 2.25}
BASE_LINE = {"color": CLAY, "width": 1.75, "dash_type": "dash"}
CUMULATIVE_LINE = {"color": INK, "width": 1.5}
THRESHOLD_LINES = tuple(
    {"color": SAND, "width": 1.75, "dash_type": dash}
    for dash in ("round_dot", "dash_dot", "long_dash_dot_dot", "square_dot")
)
GRID_LINE = {"color": MIST, "width": 0.75}
AXIS_LINE = {"color": INK, "width": 0.75}
