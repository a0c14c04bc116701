"""Misprints planted over the whole catalogue, drawn by digest; `python -m tests.misprints` tries them all."""
