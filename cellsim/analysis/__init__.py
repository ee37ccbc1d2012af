"""Statistics of draws, on plain arrays."""
