"""Uncertainty in ordinary workbooks: recalculated exactly, drawn, evaluated, reported."""
