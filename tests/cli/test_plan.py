"""``plan``: what it says of a job that has no log yet, what it takes as flow states, and the exit status."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest

from headledger.cli.main import main
from tests.sample_results import FOLDER


@pytest.fixture
def bare_job(tmp_path: Path) -> Path:
    """The riser's job folder before its log exists."""
    folder = tmp_path / "riser"
    shutil.copytree(FOLDER / "riser-drift", folder)
    for log in folder.glob("*log*.csv"):
        log.unlink()
    return folder


def test_plan_of_a_job_without_a_log_tells_what_would_be_seen(bare_job: Path, capsys: pytest.CaptureFixture[str]):
    assert main(["plan", str(bare_job)]) == 0
    out = capsys.readouterr().out
    for words in ("Could pass", "Smallest trouble", "PT-24", "no flow states are planned", "there is no such log yet"):
        assert words in out
    assert max(len(line) for line in out.splitlines()) <= 80


def test_plan_takes_flow_states_in_the_order_given(bare_job: Path, capsys: pytest.CaptureFixture[str]):
    assert main(["plan", str(bare_job), "--state", "still", "--state", "RISER-1 = 9 m3/h", "--json", "-"]) == 0
    sight = json.loads(capsys.readouterr().out)["sight"]
    assert sight["states"] == ["still", "RISER-1 9.00 m3/h"]
    kinds = {trouble["kind"] for trouble in sight["troubles"]}
    assert {"zero-shift", "blockage", "density-error", "flow-meter-error"} <= kinds
    assert all(gauge["verdict"] == "pass" for gauge in sight["gauges"])


def test_plan_at_rest_alone_is_1_where_a_gauge_could_not_pass(bare_job: Path):
    gauges = (bare_job / "gauges.csv").read_text(encoding="utf-8").splitlines()
    (bare_job / "gauges.csv").write_text("\n".join(gauges[:2]) + "\n", encoding="utf-8")
    assert main(["plan", str(bare_job), "--state", "still"]) == 1


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("RISER-9 = 9 m3/h", "names no run of the job, got RISER-9, expected RISER-3"),
        ("RISER-1 = 9 bar", "flow state 'RISER-1 = 9 bar'"),
        ("fast", "is no flow state, got fast, expected"),
    ],
)
def test_plan_refuses_a_state_that_it_cannot_read(
    bare_job: Path, capsys: pytest.CaptureFixture[str], text: str, words: str
):
    assert main(["plan", str(bare_job), "--state", text]) == 2
    assert words in capsys.readouterr().err


def test_check_with_sight_reports_what_the_readings_could_have_shown(capsys: pytest.CaptureFixture[str]):
    assert main(["check", "branched-sound", "--sight"]) == 0
    assert "What these readings cannot do" in capsys.readouterr().out
