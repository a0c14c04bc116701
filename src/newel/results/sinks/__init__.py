"""The sinks that ship with newel, one file a kind."""
