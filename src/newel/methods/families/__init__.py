"""Rules that produce tableaux, one file a rule."""
