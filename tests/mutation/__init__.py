"""Every coefficient of every built-in method changed on purpose; `python -m tests.mutation` runs all."""
