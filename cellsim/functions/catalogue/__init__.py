"""The families of spreadsheet functions."""
