"""A result turned into something to read: text report, result file, and what both say in common."""
