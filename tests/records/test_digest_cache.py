"""Kept digests: the same as read anew, never of a file that changed, and never in the way."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest

from headledger.plant.digest import Digest
from headledger.plant.job import LogSettings
from headledger.readers.logs import read_log
from headledger.records import digest_cache
from headledger.records.digest_cache import FOLDER_VARIABLE, recalled_digest, remember_digest


@pytest.fixture
def kept(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> tuple[Path, Path, Digest]:
    """A log, the folder in which its digest is kept, and that digest."""
    folder = tmp_path / "kept"
    monkeypatch.setenv(FOLDER_VARIABLE, str(folder))
    monkeypatch.setattr(digest_cache, "LEAST_KEPT_BYTES", 1)
    path = tmp_path / "log.csv"
    rows = [f"2026-03-04T10:{n // 60:02d}:{n % 60:02d}Z,{n % 7}.5,{'Bad' if n == 40 else n}" for n in range(900)]
    path.write_text("time,PT-1 [bar],Ümlaut\n" + "\n".join(rows) + "\n", encoding="utf-8")
    digest = read_log(path, name="log.csv", settings=LogSettings(), timezone="UTC")
    remember_digest(path, "said", digest)
    return path, folder, digest


def test_digest_comes_back_as_it_was_kept(kept: tuple[Path, Path, Digest]):
    path, _, digest = kept
    again = recalled_digest(path, "said")
    assert again is not None
    for field in fields(Digest):
        mine, theirs = getattr(digest, field.name), getattr(again, field.name)
        if isinstance(mine, np.ndarray):
            np.testing.assert_array_equal(mine, theirs)
            assert mine.dtype == theirs.dtype
        else:
            assert mine == theirs, field.name


def appended(path: Path) -> None:
    with path.open("a", encoding="utf-8") as file:
        file.write("2026-03-04T11:00:00Z,1,2\n")


def touched(path: Path) -> None:
    facts = path.stat()
    os.utime(path, ns=(facts.st_atime_ns, facts.st_mtime_ns + 1_000_000))


def rewritten_in_place(path: Path) -> None:
    facts = path.stat()
    data = bytearray(path.read_bytes())
    data[200] = ord("9") if data[200] != ord("9") else ord("8")
    path.write_bytes(bytes(data))
    os.utime(path, ns=(facts.st_atime_ns, facts.st_mtime_ns))


@pytest.mark.parametrize("change", [appended, touched, rewritten_in_place])
def test_digest_of_a_changed_file_is_not_trusted(kept: tuple[Path, Path, Digest], change: Callable[[Path], None]):
    path = kept[0]
    change(path)
    assert recalled_digest(path, "said") is None


def test_digest_is_of_its_settings_alone(kept: tuple[Path, Path, Digest]):
    assert recalled_digest(kept[0], "said otherwise") is None


@pytest.mark.parametrize("damage", [b"", b"PK\x03\x04 cut short", None])
def test_damaged_or_deleted_digest_is_read_anew(kept: tuple[Path, Path, Digest], damage: bytes | None):
    path, folder, _ = kept
    (file,) = folder.glob("*.npz")
    if damage is None:
        file.unlink()
    else:
        file.write_bytes(damage)
    assert recalled_digest(path, "said") is None


def test_folder_that_cannot_be_written_is_no_fault(
    kept: tuple[Path, Path, Digest], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
):
    (tmp_path / "a file").write_text("", encoding="utf-8")
    monkeypatch.setenv(FOLDER_VARIABLE, str(tmp_path / "a file"))
    remember_digest(kept[0], "said", kept[2])
    assert recalled_digest(kept[0], "said") is None


def test_nothing_is_kept_where_nothing_is_to_be(kept: tuple[Path, Path, Digest], monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setenv(FOLDER_VARIABLE, "")
    assert recalled_digest(kept[0], "said") is None


def test_only_the_latest_digests_stay(kept: tuple[Path, Path, Digest], monkeypatch: pytest.MonkeyPatch):
    path, folder, digest = kept
    monkeypatch.setattr(digest_cache, "MOST_KEPT", 3)
    for number in range(6):
        remember_digest(path, f"said {number}", digest)
    assert len(list(folder.glob("*.npz"))) == 3
