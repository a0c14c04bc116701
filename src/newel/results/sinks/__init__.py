"""The sinks that ship with newel, one file a kind."""

from newel.results.sinks.call import Call
from newel.results.sinks.csv_file import Csv
from newel.results.sinks.json_lines import JsonLines
from newel.results.sinks.memory import Memory

__all__ = ["Call", "Csv", "JsonLines", "Memory"]
