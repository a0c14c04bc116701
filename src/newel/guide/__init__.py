"""The guides: Markdown as package data, shown by `newel guide`."""
