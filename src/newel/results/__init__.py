"""Where a march goes: the run, sinks, progress."""
