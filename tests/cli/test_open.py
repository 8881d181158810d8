"""``open`` where no screen can be had."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.cli.main import main


def test_open_without_a_terminal_points_to_check(tmp_path: Path, capsys: pytest.CaptureFixture[str]):
    assert main(["open", str(tmp_path)]) == 2
    assert "headledger check JOB" in capsys.readouterr().err


def test_open_without_a_job_in_a_folder_that_holds_none_says_so(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    monkeypatch.chdir(tmp_path)
    assert main(["open"]) == 2
    assert "no job.toml in this folder" in capsys.readouterr().err
