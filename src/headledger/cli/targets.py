"""Files that a command is asked to write: refused before the work, not after it."""

from __future__ import annotations

from pathlib import Path

import click


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
