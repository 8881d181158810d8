"""The entry point: help, version, and what becomes of every kind of error."""

from __future__ import annotations

import sys
from types import ModuleType

import pytest

from headledger import __version__
from headledger.cli.exit_codes import ExitCode
from headledger.cli.main import main
from headledger.errors import JobError, NetworkError, NothingToCheckError, Problem


def stub_check(monkeypatch: pytest.MonkeyPatch, error: BaseException) -> None:
    """Put a check in the place of the real one that raises."""

    def check_folder(*_: object, **__: object) -> None:
        raise error

    module = ModuleType("headledger.diagnosis.check")
    module.check_folder = check_folder  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "headledger.diagnosis.check", module)


def test_version_prints_name_and_number(capsys: pytest.CaptureFixture[str]):
    assert main(["--version"]) == 0
    assert capsys.readouterr().out == f"headledger {__version__}\n"


@pytest.mark.parametrize("option", ["--help", "-h"])
def test_help_lists_every_command(capsys: pytest.CaptureFixture[str], option: str):
    assert main([option]) == 0
    out = capsys.readouterr().out
    for command in ("check", "open", "expect"):
        assert f"\n  {command} " in out


@pytest.mark.parametrize(
    ("arguments", "said"),
    [(["chekc"], "No such command"), (["check"], "Missing argument 'JOB'"), (["check", "x", "--jsn"], "--json")],
)
def test_wrong_command_line_is_2_and_says_what(capsys: pytest.CaptureFixture[str], arguments: list[str], said: str):
    assert main(arguments) == ExitCode.UNUSABLE
    captured = capsys.readouterr()
    assert said in captured.err
    assert captured.out == ""


def test_job_error_prints_every_problem_on_a_line_of_stderr(
    tmp_path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    problems = [
        Problem("gauges.csv, row 4, unit", "is no unit of pressure", "brag", "a unit such as barg"),
        Problem("runs.csv, row 2, bore [mm]", "is blank"),
    ]
    stub_check(monkeypatch, JobError(problems))
    assert main(["check", str(tmp_path)]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.splitlines() == [
        "gauges.csv, row 4, unit: is no unit of pressure, got brag, expected a unit such as barg.",
        "runs.csv, row 2, bore [mm]: is blank.",
    ]


@pytest.mark.parametrize(
    ("error", "status"),
    [
        (NothingToCheckError("no spell holds a reading"), 3),
        (NetworkError("run R1 has no solution"), 2),
        (KeyboardInterrupt(), 130),
        (ZeroDivisionError("division by zero"), 70),
    ],
)
def test_exit_status_follows_the_kind_of_error(
    tmp_path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    error: BaseException,
    status: int,
):
    stub_check(monkeypatch, error)
    assert main(["check", str(tmp_path)]) == status
    captured = capsys.readouterr()
    assert captured.out == ""
    assert "Traceback" not in captured.err
    assert str(error) in captured.err


def test_own_fault_says_where_and_how_to_report(
    tmp_path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    stub_check(monkeypatch, ZeroDivisionError("division by zero"))
    main(["check", str(tmp_path)])
    said = capsys.readouterr().err
    assert "ZeroDivisionError: division by zero (test_main.py, line " in said
    assert "report" in said
    assert "HEADLEDGER_TRACEBACK=1" in said


def test_own_fault_shows_the_trace_on_demand(
    tmp_path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    monkeypatch.setenv("HEADLEDGER_TRACEBACK", "1")
    stub_check(monkeypatch, ZeroDivisionError("division by zero"))
    assert main(["check", str(tmp_path)]) == 70
    assert "Traceback (most recent call last)" in capsys.readouterr().err


def test_exit_statuses_are_the_promised_numbers():
    assert {code.name: code.value for code in ExitCode} == {
        "SOUND": 0,
        "TROUBLE": 1,
        "UNUSABLE": 2,
        "NOTHING_CHECKED": 3,
        "FAULT": 70,
        "INTERRUPTED": 130,
    }
