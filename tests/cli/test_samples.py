"""Jobs by path and by the name of a sample."""

from __future__ import annotations

from pathlib import Path

import pytest

from headledger.cli import samples
from headledger.errors import JobError


@pytest.fixture
def two_samples(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    root = tmp_path / "samples"
    for name in ("booster", "riser"):
        (root / name).mkdir(parents=True)
        (root / name / "job.toml").touch()
    (root / "notes").mkdir()
    monkeypatch.setattr(samples, "samples_root", lambda: root)
    return root


def test_sample_names_are_the_folders_that_hold_a_job(two_samples: Path):
    assert samples.sample_names() == ("booster", "riser")


def test_sample_by_name_is_its_folder(two_samples: Path):
    assert samples.sample_folder("riser") == two_samples / "riser"
    assert samples.job_folder("riser") == two_samples / "riser"


def test_folder_of_the_same_name_comes_before_a_sample(
    two_samples: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
):
    (tmp_path / "riser").mkdir()
    monkeypatch.chdir(tmp_path)
    assert samples.job_folder("riser") == Path("riser")


@pytest.mark.parametrize("find", [samples.sample_folder, samples.job_folder])
def test_misspelt_sample_is_answered_with_the_nearest(two_samples: Path, find):
    with pytest.raises(JobError, match=r"the sample riser"):
        find("rizer")


def test_unlike_name_is_answered_with_all_samples(two_samples: Path):
    with pytest.raises(JobError, match=r"one of the samples booster, riser"):
        samples.job_folder("zzz")


def test_log_file_in_place_of_a_job_says_what_it_is(two_samples: Path, tmp_path: Path):
    log = tmp_path / "log.csv"
    log.touch()
    with pytest.raises(JobError, match=r"log\.csv: is a file, not a job folder"):
        samples.job_folder(str(log))


def test_samples_of_this_checkout_are_found():
    """Whatever the installation, the samples that come with it are where the code looks."""
    assert samples.sample_names()
    assert all((samples.sample_folder(name) / "gauges.csv").is_file() for name in samples.sample_names())
