"""The program in a real terminal: started, steered by keys, and left."""

from __future__ import annotations

import os
import subprocess
import sys
import time
import uuid
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from tests.outside_programs import needs

SAMPLE = Path(__file__).parents[2] / "sample_logs" / "cooling-strainer"
_PATIENCE_S = 60.0


class Terminal:
    """A terminal of its own that tmux keeps."""

    def __init__(self, socket: str) -> None:
        self._socket = socket

    def run(self, *words: str) -> str:
        command = ["tmux", "-L", self._socket, *words]
        return subprocess.run(command, capture_output=True, text=True, check=True).stdout

    def screen(self) -> str:
        return self.run("capture-pane", "-p", "-t", "job")

    def press(self, *keys: str) -> None:
        self.run("send-keys", "-t", "job", *keys)

    def wait_for(self, holds: Callable[[str], bool]) -> str:
        """The screen once it is as wanted; fails with what it shows instead."""
        end = time.monotonic() + _PATIENCE_S
        while time.monotonic() < end:
            text = self.screen()
            if holds(text):
                return text
            time.sleep(0.05)
        raise AssertionError(f"the screen never came to what was waited for:\n{self.screen()}")


@contextmanager
def terminal(width: int, height: int, command: str) -> Iterator[Terminal]:
    socket = f"headledger-test-{uuid.uuid4().hex[:8]}"
    env = {name: value for name, value in os.environ.items() if name != "TMUX"} | {
        "TERM": "xterm-256color",
        "LC_ALL": "C.UTF-8",
    }
    start = [
        "tmux",
        "-u",
        "-L",
        socket,
        "-f",
        os.devnull,
        "new-session",
        "-d",
        "-s",
        "job",
        "-x",
        str(width),
        "-y",
        str(height),
    ]
    subprocess.run([*start, command], check=True, env=env)
    held = Terminal(socket)
    try:
        yield held
    finally:
        subprocess.run(["tmux", "-L", socket, "kill-server"], capture_output=True, check=False)


@needs("tmux")
def test_open_in_a_real_terminal_draws_steps_opens_a_gauge_and_leaves():
    python = f"{sys.executable} -m headledger open {SAMPLE}; echo left with $?; sleep 60"
    with terminal(80, 24, python) as held:
        first = held.wait_for(lambda text: "What next?" in text and "blockage" in text and "Quit" in text)
        lines = first.splitlines()
        assert len(lines) <= 24
        assert max(map(len, lines)) <= 80
        assert lines[0].startswith(" headledger   Cooling water to hall 2")
        assert "Spell 4 of 4, flowing, 215.0 ± 2.7 m3/h" in first
        assert "blockage 1.88 m" in first
        held.press("Right")
        held.wait_for(lambda text: "Spell 1 of 4, still" in text and "blockage 1.88 m" not in text)
        held.press("Enter")
        page = held.wait_for(lambda text: "reading and expected" in text)
        assert "off by" in page
        held.press("Escape")
        held.wait_for(lambda text: "Spell 1 of 4, still" in text)
        held.press("q")
        assert "left with 0" in held.wait_for(lambda text: "left with" in text)
