"""README shows what the tool prints: each ``$ headledger`` line is run, and what follows it is compared word for word.

python -m tests.test_readme        writes the present output into README.md
"""

from __future__ import annotations

import contextlib
import io
import re
import shlex
import tempfile
from pathlib import Path

import pytest

from headledger.cli.exit_codes import ExitCode
from headledger.cli.main import main

README = Path(__file__).parent.parent / "README.md"
SHOWN = re.compile(r"```console\n\$ headledger (?P<command>[^\n]*)\n(?P<output>.*?)```", re.DOTALL)


def printed(command: str) -> str:
    """What a command shows in a terminal, run in an empty folder."""
    out = io.StringIO()
    with (
        tempfile.TemporaryDirectory() as folder,
        contextlib.chdir(folder),
        contextlib.redirect_stdout(out),
        contextlib.redirect_stderr(out),
    ):
        code = main(shlex.split(command))
    assert code in (ExitCode.SOUND, ExitCode.TROUBLE)
    return out.getvalue()


@pytest.mark.parametrize(
    "match", list(SHOWN.finditer(README.read_text(encoding="utf-8"))), ids=lambda m: m["command"][:24]
)
def test_readme_output_is_what_the_command_prints(match: re.Match[str]) -> None:
    assert match["output"] == printed(match["command"])


def test_readme_shows_a_check_a_sheet_and_a_hand_calculation() -> None:
    commands = [match["command"].split()[0] for match in SHOWN.finditer(README.read_text(encoding="utf-8"))]
    assert commands == ["check", "sheet", "expect"]


def test_readme_names_every_sample() -> None:
    names = {folder.name for folder in (README.parent / "sample_logs").iterdir() if folder.is_dir()}
    text = README.read_text(encoding="utf-8")
    assert names == {name for name in names if f"`{name}`" in text}


def write() -> None:
    """Put the present output into README.md."""
    text = README.read_text(encoding="utf-8")
    text = SHOWN.sub(lambda m: f"```console\n$ headledger {m['command']}\n{printed(m['command'])}```", text)
    README.write_text(text, encoding="utf-8")


if __name__ == "__main__":
    write()
