"""Many jobs over a standard executor. Empty as yet."""
