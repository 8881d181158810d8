"""Files are written whole or not at all."""

from __future__ import annotations

import os
import stat
from pathlib import Path

import pytest

from headledger.records.files import write_whole


def test_write_whole_replaces_the_file_and_leaves_nothing_beside_it(tmp_path: Path):
    path = tmp_path / "sheet.pdf"
    path.write_bytes(b"old")
    path.chmod(0o640)
    write_whole(path, b"new")
    assert path.read_bytes() == b"new"
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert list(tmp_path.iterdir()) == [path]


def test_write_whole_that_fails_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    path = tmp_path / "sheet.pdf"
    path.write_bytes(b"old")

    def full(_handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OSError, match="No space left"):
        write_whole(path, b"new")
    assert path.read_bytes() == b"old"
    assert list(tmp_path.iterdir()) == [path]


def test_write_whole_follows_a_link(tmp_path: Path):
    target, link = tmp_path / "real.json", tmp_path / "link.json"
    target.write_bytes(b"old")
    link.symlink_to(target)
    write_whole(link, b"new")
    assert link.is_symlink()
    assert target.read_bytes() == b"new"


def test_write_whole_writes_into_what_is_no_file(tmp_path: Path):
    write_whole(Path(os.devnull), b"gone")
    assert not Path(os.devnull).is_file()
