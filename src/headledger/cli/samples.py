"""Job folders by path or by the name of a sample that comes with headledger."""

from __future__ import annotations

from pathlib import Path

import headledger
from headledger.errors import JobError, Problem

JOB_FILE = "job.toml"


def samples_root() -> Path:
    """The folder of the samples: inside the installed package, or at the top of a source checkout."""
    package = Path(headledger.__file__).parent
    packed = package / "sample_logs"
    return packed if packed.is_dir() else package.parents[1] / "sample_logs"


def sample_names() -> tuple[str, ...]:
    """Names of the samples, in alphabetical order."""
    root = samples_root()
    return tuple(sorted(path.parent.name for path in root.glob(f"*/{JOB_FILE}")))


def sample_folder(name: str) -> Path:
    """The job folder of a sample.

    Raises
    ------
    JobError
        Where there is no sample of that name; names the nearest.
    """
    if name in sample_names():
        return samples_root() / name
    raise JobError([Problem("sample", "there is no sample of this name", name, f"a job{_or_a_sample(name)}")])


def job_folder(text: str) -> Path:
    """The job folder that a user means: a folder, the job.toml in it, or the name of a sample; a path comes first.

    Raises
    ------
    JobError
        Where there is neither.
    """
    path = Path(text)
    if path.is_dir():
        return path
    if path.name == JOB_FILE and path.is_file():
        return path.parent
    if text in sample_names():
        return samples_root() / text
    fault = "is a file, not a job folder" if path.exists() else "there is no such job folder"
    raise JobError([Problem(text, fault, "", f"a folder that holds {JOB_FILE}{_or_a_sample(text)}")])


def _or_a_sample(text: str) -> str:
    """The sample that a user may have meant, or all of them, as the end of a sentence."""
    import difflib

    names = sample_names()
    near = difflib.get_close_matches(text, names, n=1)
    if near:
        return f", or the sample {near[0]}"
    return f", or one of the samples {', '.join(names)}" if names else ""
