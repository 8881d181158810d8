"""``check``: what goes to stdout, to stderr and to the result file, and the exit status."""

from __future__ import annotations

import io
import json
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from types import ModuleType

import pytest

from headledger.cli.check import exit_code_of
from headledger.cli.main import main
from headledger.diagnosis.result import CheckResult, Verdict
from tests.made_results import found_gauge

Answer = Callable[[CheckResult], list[tuple[Path, object]]]


@pytest.fixture
def answer(monkeypatch: pytest.MonkeyPatch) -> Answer:
    """Put a check in the place of the real one that answers with a result; hands back the calls it got."""

    def put(result: CheckResult) -> list[tuple[Path, object]]:
        calls: list[tuple[Path, object]] = []

        def check_folder(folder: Path, *, on_progress: object = None, **_more: object) -> CheckResult:
            calls.append((folder, on_progress))
            return result

        module = ModuleType("headledger.diagnosis.check")
        module.check_folder = check_folder  # type: ignore[attr-defined]
        monkeypatch.setitem(sys.modules, "headledger.diagnosis.check", module)
        return calls

    return put


def test_check_of_trouble_prints_the_report_and_is_1(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    calls = answer(troubled_result)
    assert main(["check", str(tmp_path)]) == 1
    captured = capsys.readouterr()
    assert "PT-3 reads 0.21 bar high at every flow." in captured.out
    assert captured.err == "Not checked, for want of a reading or of anything else that determines it: PT-5.\n"
    assert calls[0][0] == tmp_path


def test_check_asked_why_prints_the_numbers_behind_the_findings(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    answer(troubled_result)
    assert main(["check", str(tmp_path), "--why"]) == 1
    assert "Behind 96 %  zero-shift at PT-3 (accepted)" in capsys.readouterr().out
    assert main(["check", str(tmp_path)]) == 1
    assert "Behind" not in capsys.readouterr().out


def test_check_of_a_sound_job_is_0_and_silent_on_stderr(
    answer: Answer, sound_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    answer(sound_result)
    assert main(["check", str(tmp_path)]) == 0
    assert capsys.readouterr().err == ""


def test_check_names_unchecked_gauges_though_nothing_is_wrong(
    answer: Answer, sound_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    gauges = (*sound_result.gauges, found_gauge("PT-9", "S1", Verdict.UNCHECKED))
    answer(replace(sound_result, gauges=gauges))
    assert main(["check", str(tmp_path), "--quiet"]) == 0
    captured = capsys.readouterr()
    assert "PT-9" in captured.err
    assert captured.out == ""


def test_check_with_nothing_checked_is_3(sound_result: CheckResult):
    assert exit_code_of(replace(sound_result, gauges=(found_gauge("A", "S1", Verdict.UNCHECKED),))) == 3


def test_json_to_stdout_is_the_result_alone(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    answer(troubled_result)
    assert main(["check", str(tmp_path), "--json", "-"]) == 1
    assert json.loads(capsys.readouterr().out)["gauges"][2]["verdict"] == "fail"


def test_json_to_a_file_leaves_the_report_on_stdout(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    answer(troubled_result)
    target = tmp_path / "result.json"
    main(["check", str(tmp_path), "--json", str(target)])
    assert json.loads(target.read_text(encoding="utf-8"))["format"] == 1
    assert "Anything wrong?" in capsys.readouterr().out


@pytest.mark.parametrize("target", ["no-such-folder/result.json", "."])
def test_json_that_cannot_be_written_is_refused_before_the_check(
    answer: Answer,
    troubled_result: CheckResult,
    tmp_path: Path,
    capsys: pytest.CaptureFixture[str],
    target: str,
):
    calls = answer(troubled_result)
    assert main(["check", str(tmp_path), "--json", str(tmp_path / target)]) == 2
    assert calls == []
    assert "--json" in capsys.readouterr().err


def test_quiet_says_nothing_but_the_exit_status(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    answer(replace(troubled_result, gauges=troubled_result.gauges[:4]))
    assert main(["check", str(tmp_path), "-q"]) == 1
    captured = capsys.readouterr()
    assert (captured.out, captured.err) == ("", "")


def test_job_file_stands_for_its_folder(answer: Answer, sound_result: CheckResult, tmp_path: Path):
    calls = answer(sound_result)
    (tmp_path / "job.toml").touch()
    main(["check", str(tmp_path / "job.toml"), "-q"])
    assert calls[0][0] == tmp_path


def test_old_console_gets_plain_signs_and_words(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
):
    answer(troubled_result)
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii", write_through=True))
    assert main(["check", str(tmp_path)]) == 1
    report = raw.getvalue().decode("ascii")
    assert "! fail" in report
    assert "+ pass" in report
    assert "36.00 +/- 0.72 m3/h" in report


def test_json_on_an_old_console_is_whole(
    answer: Answer, troubled_result: CheckResult, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
):
    job = replace(troubled_result.job, title="Größe ✓")
    answer(replace(troubled_result, job=job))
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii", write_through=True))
    main(["check", str(tmp_path), "--json", "-"])
    assert json.loads(raw.getvalue())["job"]["title"] == "Größe ✓"


def test_reader_that_stops_early_is_no_fault(tmp_path: Path):
    """The pipe's reader is gone before the report comes."""
    script = (
        "import sys, types; from tests.made_results import troubled_result\n"
        "module = types.ModuleType('headledger.diagnosis.check')\n"
        "module.check_folder = lambda *a, **k: troubled_result()\n"
        "sys.modules['headledger.diagnosis.check'] = module\n"
        "from headledger.cli.main import main\n"
        "sys.stdin.read()\n"
        f"sys.exit(main(['check', {str(tmp_path)!r}]))\n"
    )
    root = Path(__file__).parents[2]
    with subprocess.Popen(
        [sys.executable, "-c", script],
        cwd=root,
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    ) as process:
        assert process.stdin
        assert process.stdout
        assert process.stderr
        process.stdout.close()
        process.stdin.close()
        said = process.stderr.read().decode()
    assert process.returncode == 1
    assert "Broken pipe" not in said
    assert "fault" not in said
