"""Files that a command is asked to write: refused before the work, not after it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import click

from headledger.cli.streams import result_stream

TO_STDOUT = "-"


def refuse_bad_target(path_text: str | None, option: str) -> None:
    """Say at once that a file cannot be written where it was asked for.

    Raises
    ------
    click.BadParameter
    """
    if path_text is None:
        return
    path = Path(path_text)
    if path.is_dir():
        raise click.BadParameter(f"{path} is a folder, expected a file to write.", param_hint=option)
    if not path.parent.is_dir():
        raise click.BadParameter(f"{path.parent} is no folder, expected one that exists.", param_hint=option)


def refuse_bad_json(json_path: str | None) -> None:
    """The same for ``--json``, whose ``-`` is standard output."""
    refuse_bad_target(None if json_path == TO_STDOUT else json_path, "--json")


def write_json(text_of: Callable[[bool], str], json_path: str) -> None:
    """Write a JSON text to a file, whole or not at all, or to standard output.

    Parameters
    ----------
    text_of : callable
        The text, in plain ASCII where it is asked for.
    json_path : str

    Raises
    ------
    click.FileError
    """
    from headledger.records.files import write_whole

    if json_path == TO_STDOUT:
        with result_stream() as stream:
            speaks_utf_8 = (stream.encoding or "").lower().replace("-", "") == "utf8"
            stream.write(text_of(not speaks_utf_8))
        return
    try:
        # A file name that is no UTF-8 becomes an escape, which JSON knows too.
        write_whole(Path(json_path), text_of(False).encode("utf-8", "backslashreplace"))
    except OSError as error:
        raise click.FileError(json_path, hint=error.strerror or str(error)) from error
