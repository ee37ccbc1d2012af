"""Running a compiled program over blocks of draws."""
