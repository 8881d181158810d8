"""``open`` where no screen can be had."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.cli.exit_codes import ExitCode
from headledger.cli.main import main
from headledger.cli.open import status_of
from headledger.tui.ending import Ending


def test_open_without_a_terminal_points_to_check(tmp_path: Path, capsys: pytest.CaptureFixture[str]):
    assert main(["open", str(tmp_path)]) == 2
    assert "headledger check JOB" in capsys.readouterr().err


def test_open_without_a_job_in_a_folder_that_holds_none_says_so(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    monkeypatch.chdir(tmp_path)
    assert main(["open"]) == 2
    assert "no job.toml in this folder" in capsys.readouterr().err


def test_every_ending_of_the_screen_has_its_exit_status():
    assert {ending: status_of(ending) for ending in Ending} == {
        Ending.FOUND: ExitCode.SOUND,
        Ending.STOPPED: ExitCode.INTERRUPTED,
        Ending.REFUSED: ExitCode.UNUSABLE,
        Ending.NOTHING_TO_CHECK: ExitCode.NOTHING_CHECKED,
        Ending.FAULT: ExitCode.FAULT,
    }
