"""Distributions: what they are, the families that there are, and how one is built."""
