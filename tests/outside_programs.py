"""Programs that some tests need: where one is missing, its tests are skipped and say so."""

from __future__ import annotations

import shutil

import pytest


def needs(program: str) -> pytest.MarkDecorator:
    """Skip where a program is not installed, with the reason printed."""
    return pytest.mark.skipif(shutil.which(program) is None, reason=f"{program} is not installed on this machine")
