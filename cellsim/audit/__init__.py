"""Looking at a model before it is simulated."""
