"""Output between the ends of a step."""
