"""One module a widget."""
