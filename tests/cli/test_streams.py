"""Progress: only on a terminal, only after a second, and gone when the work is done."""

from __future__ import annotations

import io

from headledger.cli.streams import ProgressLine


class Terminal(io.StringIO):
    """A stream that takes itself for a terminal."""

    def isatty(self) -> bool:
        return True


class Clock:
    """A clock that stands where it is put."""

    def __init__(self) -> None:
        self.time_s = 0.0

    def __call__(self) -> float:
        return self.time_s


def test_progress_within_the_first_second_shows_nothing():
    stream, clock = Terminal(), Clock()
    with ProgressLine(stream, now=clock) as progress:
        clock.time_s = 0.9
        progress("reading the log", 0.4)
    assert stream.getvalue() == ""


def test_progress_after_a_second_is_one_line_that_goes_away():
    stream, clock = Terminal(), Clock()
    with ProgressLine(stream, now=clock) as progress:
        clock.time_s = 1.1
        progress("reading the log", 0.4)
        progress("done", 1.0)
    written = stream.getvalue()
    assert "\n" not in written
    assert "\r 40 %  reading the log" in written
    assert written.endswith("\r" + " " * len("100 %  done") + "\r")


def test_progress_into_a_pipe_shows_nothing():
    stream, clock = io.StringIO(), Clock()
    with ProgressLine(stream, now=clock) as progress:
        clock.time_s = 5.0
        progress("reading the log", 0.4)
    assert stream.getvalue() == ""


def test_progress_silenced_shows_nothing():
    stream, clock = Terminal(), Clock()
    with ProgressLine(stream, shown=False, now=clock) as progress:
        clock.time_s = 5.0
        progress("reading the log", 0.4)
    assert stream.getvalue() == ""
