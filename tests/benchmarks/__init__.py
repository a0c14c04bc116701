"""Speed, measured as ratios in one process; never asserted. `python -m tests.benchmarks` prints a table."""
