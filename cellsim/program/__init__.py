"""The evaluators: the reference that walks trees, and the compiled program over draws."""
