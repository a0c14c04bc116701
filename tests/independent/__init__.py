"""Checks written a second time from the textbook formulas, sharing no code with newel itself."""
