"""The findings screen as a picture, small and large: what asserts on words cannot see."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from textual.pilot import Pilot

from headledger.diagnosis.result import CheckResult
from headledger.tui.app import HeadledgerApp


async def finish(pilot: Pilot[None]) -> None:
    await pilot.app.workers.wait_for_complete()
    await pilot.pause()


@pytest.mark.parametrize("size", [(80, 24), (160, 48)], ids=["80x24", "160x48"])
def test_findings_screen_looks_as_it_did(
    troubled_result: CheckResult, snap_compare: Callable[..., bool], size: tuple[int, int]
):
    def check(folder: Path, **_: Any) -> CheckResult:
        return troubled_result

    assert snap_compare(HeadledgerApp(Path("riser"), check=check), run_before=finish, terminal_size=size)
