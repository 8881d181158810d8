"""The sample jobs: made by a script whose physics is not the product's, and judged as they were made."""

from __future__ import annotations

import subprocess
import sys
from functools import lru_cache
from pathlib import Path

import pytest

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CauseKind, CheckResult, Place, Verdict

ROOT = Path(__file__).parent.parent
SAMPLES = ("riser-drift", "cooling-strainer", "hill-main-air", "fire-main-units", "branched-sound")


@lru_cache(maxsize=5)
def checked(name: str) -> CheckResult:
    """The result of one sample."""
    return check_folder(ROOT / "sample_logs" / name)


def test_make_samples_reproduces_the_committed_folders_byte_for_byte(tmp_path: Path) -> None:
    subprocess.run([sys.executable, str(ROOT / "tests" / "make_samples.py"), str(tmp_path)], check=True)
    made = {p.relative_to(tmp_path): p.read_bytes() for p in tmp_path.rglob("*") if p.is_file()}
    kept = {
        p.relative_to(ROOT / "sample_logs"): p.read_bytes() for p in (ROOT / "sample_logs").rglob("*") if p.is_file()
    }
    assert made.keys() == kept.keys()
    assert [name for name in made if made[name] != kept[name]] == []


def test_check_riser_fails_the_drifted_gauge_alone() -> None:
    """PT-28 was made to read 0.16 bar high; a wrong elevation of its own column would look the same."""
    result = checked("riser-drift")
    assert {g.tag for g in result.gauges if g.verdict is not Verdict.PASS} == {"PT-28"}
    assert next(g for g in result.gauges if g.tag == "PT-28").verdict is Verdict.FAIL
    pair = {c.kind: c for c in result.causes if c.place == Place(gauge="PT-28")}
    shift = pair[CauseKind.ZERO_SHIFT]
    assert shift.size == pytest.approx(0.16e5, abs=shift.u95)
    assert shift.probability + pair[CauseKind.WRONG_ELEVATION].probability > 0.9
    assert CauseKind.WRONG_ELEVATION in {rival.kind for rival in shift.rivals}


def test_check_cooling_line_names_the_blocked_strainer() -> None:
    """A loss coefficient of 11 was added in STR-1."""
    result = checked("cooling-strainer")
    first = result.causes[0]
    assert (first.kind, first.place, first.accepted) == (CauseKind.BLOCKAGE, Place(run="STR-1"), True)
    assert first.size == pytest.approx(11.0, abs=first.u95)
    assert all(g.verdict is Verdict.PASS for g in result.gauges)


def test_check_hill_main_names_the_run_that_holds_air() -> None:
    """A pocket of 3.8 m was put into M3 while it flows."""
    result = checked("hill-main-air")
    first = result.causes[0]
    assert (first.kind, first.place, first.accepted) == (CauseKind.AIR_POCKET, Place(run="M3"), True)
    assert first.size == pytest.approx(3.8, abs=first.u95)
    assert all(g.verdict is Verdict.PASS for g in result.gauges)


def test_check_fire_main_names_the_transmitter_logged_in_bar() -> None:
    result = checked("fire-main-units")
    first = result.causes[0]
    assert (first.kind, first.place, first.accepted) == (CauseKind.WRONG_UNIT, Place(gauge="PIT-903"), True)
    assert first.size == pytest.approx(6894.757 / 1e5, rel=1e-6)
    assert {g.tag for g in result.gauges if g.verdict is Verdict.FAIL} == {"PIT-903"}


def test_check_sound_branches_passes_every_gauge_and_accepts_nothing() -> None:
    result = checked("branched-sound")
    assert all(g.verdict is Verdict.PASS for g in result.gauges)
    assert not any(c.accepted for c in result.causes)
    assert result.clean_probability > 0.8


@pytest.mark.parametrize("name", SAMPLES)
def test_check_sample_counts_its_bad_cells(name: str) -> None:
    """Each log was given the words Bad and --- in one cell each."""
    assert checked(name).reject_count == 2
    assert {r.text for r in checked(name).rejects} == {"Bad", "---"}
