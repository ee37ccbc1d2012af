"""The formula language: from text to a syntax tree and back."""
