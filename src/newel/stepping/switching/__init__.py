"""Breaks and events, located."""
