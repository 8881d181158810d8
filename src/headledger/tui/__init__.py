"""The screen of the terminal: composes, turns keys into calls and messages into what is shown; computes nothing."""
