"""The one writer to stdout and the one to stderr, and the line that shows progress."""

from __future__ import annotations

import codecs
import io
import os
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TextIO

# Where an old console cannot print a sign, this stands in; words carry the meaning all the same.
_PLAIN_SIGNS = {
    "✓": "+",
    "▲": "!",
    "–": "-",
    "—": "-",
    "±": "+/-",
    "×": "x",
    "…": "...",
    "→": "->",
    "·": "-",
    "°": " deg ",
}
_PLAIN_HANDLER = "headledger-plain"
_PROGRESS_AFTER_S = 1.0


def _plain_sign(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    text = error.object[error.start : error.end]
    return "".join(_PLAIN_SIGNS.get(sign, "?") for sign in text), error.end


def prepare_streams() -> None:
    """Let stdout and stderr write what their encoding lacks as plain signs, where they would stop with an error."""
    codecs.register_error(_PLAIN_HANDLER, _plain_sign)
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors=_PLAIN_HANDLER)


def say(message: str) -> None:
    """Write one note or error to stderr."""
    print(message, file=sys.stderr, flush=True)  # noqa: T201 - the one writer of talk


@contextmanager
def result_stream() -> Iterator[TextIO]:
    """Standard output for a result; a reader that stops early (``| head``) is no error."""
    try:
        yield sys.stdout
        sys.stdout.flush()
    except BrokenPipeError:
        # What is still buffered must go somewhere when the interpreter shuts down.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


class ProgressLine:
    """Progress as one line on stderr that rewrites itself: on a terminal alone, and only for what takes over a second.

    Parameters
    ----------
    stream : TextIO
    shown : bool
        False keeps it silent.
    now : callable
        Seconds of a clock that never goes back. [s]
    """

    def __init__(self, stream: TextIO, *, shown: bool = True, now: Callable[[], float] = time.monotonic) -> None:
        self._stream = stream
        self._shown = shown and stream.isatty()
        self._now = now
        self._started_s = now()
        self._width = 0

    def __enter__(self) -> ProgressLine:
        return self

    def __exit__(self, *_: object) -> None:
        if self._width:
            self._stream.write("\r" + " " * self._width + "\r")
            self._stream.flush()

    def __call__(self, step: str, fraction: float) -> None:
        """Show a step and how much of the whole is done."""
        if not self._shown or self._now() - self._started_s < _PROGRESS_AFTER_S:
            return
        line = f"{100.0 * fraction:3.0f} %  {step}"[:79]
        self._stream.write("\r" + line.ljust(self._width))
        self._stream.flush()
        self._width = len(line)
