"""Files written whole or not at all: beside the target first, then moved into its place."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path


def write_whole(path: Path, data: bytes) -> None:
    """Put data into a file so that a reader, at any moment, finds the old file or the new one.

    Parameters
    ----------
    path : Path
        Its folder exists; what stands there already is replaced.
    data : bytes

    Raises
    ------
    OSError
        It could not be written; the old file is as it was.

    Notes
    -----
    A link keeps pointing to its file, which is the one replaced. What is no file (a pipe, a device) is written to as it stands.
    """
    path = path.resolve()
    if path.exists() and not path.is_file():
        path.write_bytes(data)
        return
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
    try:
        with os.fdopen(handle, "wb") as target:
            target.write(data)
            target.flush()
            os.fsync(target.fileno())
        Path(name).chmod(_mode_for(path))
        Path(name).replace(path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def _mode_for(path: Path) -> int:
    """Permissions of the file that is replaced; those that a new file would have, where there is none."""
    if path.exists():
        return path.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask
