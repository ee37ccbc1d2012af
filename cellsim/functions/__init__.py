"""The spreadsheet functions: one registry, one module a family."""
