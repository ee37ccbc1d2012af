"""Which cell depends on which, and in what order they are calculated."""
