"""Checks of the sample jobs, each made once in a test run."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CheckResult

FOLDER = Path(__file__).parents[1] / "sample_logs"
SAMPLES = tuple(sorted(path.parent.name for path in FOLDER.glob("*/job.toml")))


@cache
def sample_result(name: str) -> CheckResult:
    """The check of one sample job."""
    return check_folder(FOLDER / name)
