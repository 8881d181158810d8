"""The heart: digest and plant to result."""
