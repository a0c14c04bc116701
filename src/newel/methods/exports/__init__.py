"""Tableaux as text for other languages: one file a language, and the numbers that they share."""
