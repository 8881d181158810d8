"""Digests kept from one opening to the next, in the user's own cache folder.

A digest is found again by the file's size, times, inode and blocks sampled from it, and by what the job says of its logs: a file that
changed in any of these is read anew. Everything kept may be deleted at any time; nothing of it lies in a job folder.
"""

from __future__ import annotations

import hashlib
import io
import json
import os
import sys
from dataclasses import fields
from pathlib import Path
from zipfile import BadZipFile

import numpy as np

from headledger.plant.digest import Digest, Reject
from headledger.records.files import write_whole

FOLDER_VARIABLE = "HEADLEDGER_CACHE"
"""Names the folder for what is kept; empty keeps nothing."""

KEPT_FORMAT = 1
"""To be raised when logs are read otherwise than before, or a digest holds something else."""

SAMPLES, SAMPLE_BYTES = 32, 16 * 1024
LEAST_KEPT_BYTES = 2 * 1024 * 1024
"""A smaller log is read anew as quickly. [B]"""

MOST_KEPT = 64
"""As many digests are kept; the ones not used for longest go first."""

_TEXTS = "texts"


def cache_folder() -> Path | None:
    """Where digests are kept; None where nothing is to be kept."""
    stated = os.environ.get(FOLDER_VARIABLE)
    if stated is not None:
        return Path(stated) if stated else None
    try:
        home = Path("~").expanduser()
    except RuntimeError:
        return None
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or home / "AppData" / "Local") / "headledger" / "cache"
    if sys.platform == "darwin":
        return home / "Library" / "Caches" / "headledger"
    return Path(os.environ.get("XDG_CACHE_HOME") or home / ".cache") / "headledger"


def file_key(path: Path, said: str) -> str:
    """What a log is known by.

    Parameters
    ----------
    path : Path
    said : str
        Everything besides the file's bytes on which its digest depends.

    Returns
    -------
    str
        Another for another file or a changed one.

    Raises
    ------
    OSError
    """
    known = hashlib.sha256()
    facts = path.stat()
    known.update(
        f"{KEPT_FORMAT}\n{said}\n{facts.st_size} {facts.st_mtime_ns} {facts.st_ctime_ns} {facts.st_ino}\n".encode()
    )
    with path.open("rb") as file:
        for number in range(SAMPLES):
            file.seek(max(facts.st_size - SAMPLE_BYTES, 0) * number // (SAMPLES - 1))
            known.update(file.read(SAMPLE_BYTES))
    return known.hexdigest()


def recalled_digest(path: Path, said: str) -> Digest | None:
    """The digest kept of an unchanged log; None where there is none.

    Parameters
    ----------
    path : Path
    said : str
        As for `file_key`.
    """
    try:
        return _kept(file_key(path, said)) if _is_worth_keeping(path) else None
    except OSError:
        return None


def remember_digest(path: Path, said: str, digest: Digest) -> None:
    """Keep the digest of a log that took time to read; where it cannot be kept, nothing happens."""
    try:
        if _is_worth_keeping(path):
            _keep(file_key(path, said), digest)
    except OSError:
        return


def _is_worth_keeping(path: Path) -> bool:
    return path.stat().st_size >= LEAST_KEPT_BYTES


def _kept(key: str) -> Digest | None:
    """The digest kept under a key; None where there is none that can be read."""
    folder = cache_folder()
    path = None if folder is None else folder / f"{key}.npz"
    try:
        if path is None or not path.is_file():
            return None
        with path.open("rb") as file, np.load(file, allow_pickle=False) as held:
            texts = json.loads(held[_TEXTS].tobytes())
            arrays = {name: held[name] for name in held.files if name != _TEXTS}
        path.touch()
    except (OSError, ValueError, KeyError, BadZipFile, EOFError):
        return None
    texts["rejects"] = tuple(Reject(**reject) for reject in texts["rejects"])
    for name in ("columns", "units"):
        texts[name] = tuple(texts[name])
    texts["reject_reasons"] = tuple((why, number) for why, number in texts["reject_reasons"])
    return Digest(**texts, **arrays)


def _keep(key: str, digest: Digest) -> None:
    """Keep a digest under a key."""
    folder = cache_folder()
    if folder is None:
        return
    values = {field.name: getattr(digest, field.name) for field in fields(Digest)}
    arrays = {name: value for name, value in values.items() if isinstance(value, np.ndarray)}
    texts = {name: value for name, value in values.items() if name not in arrays}
    texts["rejects"] = [
        {field.name: getattr(reject, field.name) for field in fields(Reject)} for reject in digest.rejects
    ]
    arrays[_TEXTS] = np.frombuffer(json.dumps(texts).encode("utf-8", "surrogatepass"), dtype=np.uint8)
    packed = io.BytesIO()
    np.savez(packed, **arrays)  # type: ignore[arg-type]
    folder.mkdir(parents=True, exist_ok=True)
    write_whole(folder / f"{key}.npz", packed.getvalue())
    _drop_oldest(folder)


def _drop_oldest(folder: Path) -> None:
    """Delete what was not used for longest beyond what is kept."""
    held = sorted(folder.glob("*.npz"), key=lambda path: path.stat().st_mtime, reverse=True)
    for path in held[MOST_KEPT:]:
        path.unlink(missing_ok=True)
