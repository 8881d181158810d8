"""Small logs for the tests of their readers."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from headledger.errors import JobError, Problem
from headledger.plant.digest import Digest
from headledger.plant.job import LogSettings
from headledger.readers.logs import read_log

PLAIN = """time,PT-1,PT-2
2026-03-04T10:00:00Z,1.5,20
2026-03-04T10:00:01Z,1.6,21
2026-03-04T10:00:02Z,1.7,22
"""


def read(folder: Path, content: str | bytes, *, name: str = "log.csv", timezone: str = "UTC", **stated: Any) -> Digest:
    """The digest of a log with this content."""
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_log(path, name=name, settings=LogSettings(**stated), timezone=timezone)


def problem(error: JobError) -> Problem:
    """The one problem of an error."""
    (only,) = error.problems
    return only


def at(stamp: str) -> float:
    """Seconds since 1970-01-01 UTC of a stamp in UTC. [s]"""
    return datetime.fromisoformat(stamp).replace(tzinfo=UTC).timestamp()


def columns(digest: Digest) -> dict[str, list[float]]:
    """Block means by column, without the empty ones; of a log with one row a block, its values."""
    return {
        name: [float(mean) for mean, count in zip(digest.mean[:, at], digest.count[:, at], strict=True) if count]
        for at, name in enumerate(digest.columns)
    }


def rejects(digest: Digest) -> list[tuple[int, str, str, str]]:
    """Line, column, text and cause of each reject."""
    return [(reject.line, reject.column, reject.text, reject.why) for reject in digest.rejects]
