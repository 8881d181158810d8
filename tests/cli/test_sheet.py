"""``sheet``: where it writes, what it says, what it refuses."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.cli.main import main
from headledger.cli.sheet import safe_name


def test_sheet_writes_pdf_and_table_and_says_where(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
):
    monkeypatch.chdir(tmp_path)
    assert main(["sheet", "riser-drift", "--csv", "riser.csv"]) == 0
    assert {path.name for path in tmp_path.iterdir()} == {"riser-drift-sheet.pdf", "riser.csv"}
    assert (tmp_path / "riser-drift-sheet.pdf").read_bytes().startswith(b"%PDF-")
    said = capsys.readouterr()
    assert said.out == ""
    assert "riser-drift-sheet.pdf: the summary and 6 gauges." in said.err


def test_sheet_of_the_same_job_is_the_same_file(tmp_path: Path):
    for name in ("one.pdf", "two.pdf"):
        assert main(["sheet", "cooling-strainer", "-q", "-o", str(tmp_path / name), "--paper", "letter"]) == 0
    assert (tmp_path / "one.pdf").read_bytes() == (tmp_path / "two.pdf").read_bytes()


def test_sheet_refuses_a_place_that_cannot_be_written_before_the_work(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
):
    assert main(["sheet", "riser-drift", "-o", str(tmp_path)]) == 2
    assert "is a folder, expected a file to write" in capsys.readouterr().err
    assert main(["sheet", "riser-drift", "-q", "--csv", str(tmp_path / "no" / "x.csv")]) == 2
    assert "is no folder, expected one that exists" in capsys.readouterr().err
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("name", "safe"),
    [("riser-drift", "riser-drift"), ('a: b/c*?"<>|', "a-b-c"), ("..", "job"), ("Стояк 4", "Стояк-4"), ("con.", "con")],
)
def test_safe_name_holds_nothing_that_a_system_refuses(name: str, safe: str):
    assert safe_name(name) == safe
